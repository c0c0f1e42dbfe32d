"""A year cut into a few hundred classes of like power and current, with the error under control.

What an inverter takes from the year is nearly linear in power and voltage, but for two kinks: where the
power limit cuts in, and where a tracker's current limit does. A class that carries the sums of hours and
energy and the mean voltage of its entries is exact for all that is linear, so only the classes that a kink
cuts through err, and always to the same side (Jensen's inequality): a limit at power t takes
``sum(h max(0, p - t))`` from the entries, never less than from their class means, and the difference of
one class is at most half of ``sum(h |p - mean|)``. So the class where that is largest is cut in two, again
and again; then the t with the largest difference over the whole year is sought, and the classes that make
it are cut, until it is below the bound for every t. For current limits in the same way with
``sum(h v max(0, i - c))``. Where both limits act, power at the current limit follows the voltage and the
power limit cuts through that, so the classes are cut by voltage too.
"""

from __future__ import annotations

import heapq

import numpy as np

#: Limits below this share of the year's highest power or current do not occur: it is a DC/AC ratio of 3.3.
_LOWEST_LIMIT = 0.3
#: Weight of the errors below that share, where only the curvature of the efficiency is left.
_LOW_WEIGHT = 0.1
#: Classes before the bound is looked at, for power limits only and for both.
_FIRST_CLASSES = (120, 450)


def class_labels(
    power: np.ndarray, vmp: np.ndarray, hours: np.ndarray, bound_pct: float, current_limits: bool
) -> np.ndarray:
    """Number of the class of each entry.

    Parameters
    ----------
    power, vmp, hours
        Power [W], voltage [V] and hours [h] of the entries, all above 0, shape (n,).
    bound_pct
        Largest error of the clipped energy, in percent of the year's energy.
    current_limits
        Whether the bound must hold for each of the two limits; takes two to three times as many classes.

    Returns
    -------
    ndarray of int, shape (n,)
    """
    current = power / vmp
    classes = _first_classes(power, vmp, current, hours, _FIRST_CLASSES[current_limits], current_limits)
    kinks = [(power, hours)] + [(current, hours * vmp)] * current_limits
    bound = bound_pct / 100 * (hours @ power)
    while True:
        label = np.empty(power.size, dtype=int)
        for number, members in enumerate(classes):
            label[members] = number
        gaps = []
        for x, weight in kinks:
            total = np.bincount(label, weight)
            mean = np.bincount(label, weight * x) / total
            gaps.append((*_largest_gap(x, weight, mean, total), x, weight, mean, total))
        gap, limit, x, weight, mean, total = max(gaps, key=lambda found: found[0])
        if gap <= bound:
            return label
        # Halving a class takes about three quarters of its error at a limit in its middle.
        share = np.bincount(label, weight * np.maximum(x - limit, 0)) - total * np.maximum(mean - limit, 0)
        worst = np.argsort(-share)
        enough = int(np.searchsorted(np.cumsum(share[worst]) * 0.75, gap - 0.9 * bound)) + 1
        for number in worst[:enough]:
            members = classes[number]
            upper = x[members] > mean[number]
            if upper.any() and not upper.all():
                classes[number] = members[upper]
                classes.append(members[~upper])


def _first_classes(
    power: np.ndarray,
    vmp: np.ndarray,
    current: np.ndarray,
    hours: np.ndarray,
    count: int,
    current_limits: bool,
) -> list[np.ndarray]:
    """Members of each class, after cutting the class of the largest error ``count`` times."""
    low = _LOWEST_LIMIT * power.max()

    def weighed(members: np.ndarray) -> tuple[float, int, np.ndarray, np.ndarray]:
        """Heap entry of a class: its error (negative: least first), a tie breaker, members, upper half."""
        h, p, v = hours[members], power[members], vmp[members]
        total = h.sum()
        mean = h @ p / total
        error, upper = h @ np.abs(p - mean), p > mean
        if current_limits:
            mean_v = h @ v / total
            ratio = mean / mean_v
            by_current = h @ np.abs(p - ratio * v)
            if by_current > error:
                error, upper = by_current, current[members] > ratio
            by_voltage = ratio * (h @ np.abs(v - mean_v))
            if by_voltage > error:
                error, upper = by_voltage, v > mean_v
        return -float(error) * (_LOW_WEIGHT if mean < low else 1.0), int(members[0]), members, upper

    heap = [weighed(np.arange(power.size))]
    done: list[np.ndarray] = []  # classes of entries that are equal but for rounding
    while heap and len(heap) + len(done) < count:
        _, _, members, upper = heapq.heappop(heap)
        if upper.all() or not upper.any():
            done.append(members)
        else:
            heapq.heappush(heap, weighed(members[upper]))
            heapq.heappush(heap, weighed(members[~upper]))
    return [entry[2] for entry in heap] + done


def _largest_gap(
    x: np.ndarray, weight: np.ndarray, x_class: np.ndarray, weight_class: np.ndarray
) -> tuple[float, float]:
    """Largest over t of ``sum(w max(0, x - t))`` of the entries less that of the classes, and that t."""
    at = x_class[x_class > _LOWEST_LIMIT * x.max()]
    gaps = _above(x, weight, at) - _above(x_class, weight_class, at)
    worst = int(np.argmax(gaps))
    return float(gaps[worst]), float(at[worst])


def _above(x: np.ndarray, weight: np.ndarray, at: np.ndarray) -> np.ndarray:
    """``sum(weight max(0, x - t))`` for each t of ``at``."""
    order = np.argsort(x)
    x, weight = x[order], weight[order]
    first = np.searchsorted(x, at)
    sums = np.concatenate([[0.0], np.cumsum(weight)])
    moments = np.concatenate([[0.0], np.cumsum(weight * x)])
    return (moments[-1] - moments[first]) - at * (sums[-1] - sums[first])
