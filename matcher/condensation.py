"""A year cut into a few hundred classes of like power and current, with the error under control.

What an inverter takes from the year is nearly linear in power and voltage, but for two kinks: where the
power limit cuts in, and where a tracker's current limit does. A class that carries the sums of hours and
energy and the mean voltage of its entries is exact for all that is linear, so only the classes that a kink
cuts through err, and always to the same side (Jensen's inequality): a limit at power t takes
``sum(h max(0, p - t))`` from the entries, never less than from their class means, and the difference of
one class is at most half of ``sum(h |p - mean|)``. So the class where that is largest is cut in two, until
the difference over the whole year is below the bound for every t; for current limits in the same way with
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
_FIRST_CLASSES = 120


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
    energy = hours @ power
    low = _LOWEST_LIMIT * power.max()

    def weighed(members: np.ndarray) -> tuple[float, int, np.ndarray, np.ndarray]:
        """Heap entry of a class: its error (negative, the heap's least first), a tie breaker, members, upper half."""
        h, p, v = hours[members], power[members], vmp[members]
        total = h.sum()
        mean = h @ p / total
        weight = _LOW_WEIGHT if mean < low else 1.0
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
        return -float(error) * weight, int(members[0]), members, upper

    heap = [weighed(np.arange(power.size))]
    done: list[np.ndarray] = []  # classes of equal entries

    def cut(classes: int) -> np.ndarray:
        while len(heap) and len(heap) + len(done) < classes:
            error, _, members, upper = heapq.heappop(heap)
            if error > -1e-12 * energy or upper.all() or not upper.any():
                done.append(members)
                continue
            heapq.heappush(heap, weighed(members[upper]))
            heapq.heappush(heap, weighed(members[~upper]))
        label = np.empty(power.size, dtype=int)
        for number, members in enumerate([entry[2] for entry in heap] + done):
            label[members] = number
        return label

    classes = _FIRST_CLASSES
    while True:
        label = cut(classes)
        total = np.bincount(label, hours)
        p = np.bincount(label, hours * power) / total
        worst = _largest_gap(power, hours, p, total)
        if current_limits:
            v = np.bincount(label, hours * vmp) / total
            worst = max(worst, _largest_gap(current, hours * vmp, p / v, total * v))
        if worst * 100 <= bound_pct * energy or not heap:
            return label
        # The error falls with the number of classes, or its square; a step that seldom has to be repeated.
        more = worst * 100 / (bound_pct * energy)
        classes = int(len(total) * min(1.4, max(1.1, more ** (0.9 if current_limits else 0.5)))) + 1


def _largest_gap(x: np.ndarray, weight: np.ndarray, x_class: np.ndarray, weight_class: np.ndarray) -> float:
    """Largest over t of ``sum(w max(0, x - t))`` of the entries less that of the classes."""
    at = x_class[x_class > _LOWEST_LIMIT * x.max()]
    return float(np.max(_above(x, weight, at) - _above(x_class, weight_class, at), initial=0.0))


def _above(x: np.ndarray, weight: np.ndarray, at: np.ndarray) -> np.ndarray:
    """``sum(weight max(0, x - t))`` for each t of ``at``."""
    order = np.argsort(x)
    x, weight = x[order], weight[order]
    first = np.searchsorted(x, at)
    sums = np.concatenate([[0.0], np.cumsum(weight)])
    moments = np.concatenate([[0.0], np.cumsum(weight * x)])
    return (moments[-1] - moments[first]) - at * (sums[-1] - sums[first])
