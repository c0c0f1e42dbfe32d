"""Why an inverter takes no arrangement at all, and what would change that."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from matcher.arrangements import Space
from matcher.checks import Pair
from matcher.climate import ClimateWindow
from matcher.limits import TOLERANCE, voltage_cap


@dataclass(frozen=True, slots=True)
class Rejection:
    """One inverter without option: the checks that stop it, and the nearest thing that would not.

    ``distance`` is how far the nearest is from fitting, as a share of the limit that is missed; it ranks
    the near misses.
    """

    failed: tuple[str, ...]
    nearest: str
    distance: float


def voltage_maxima(pair: Pair) -> dict[str, float]:
    """Limits [V] on the cold Voc of a string that are stated, by check."""
    cap = voltage_cap(pair.site, pair.rules)
    stated = {
        "max-dc-voltage": pair.inverter.max_dc_voltage_v,
        "system-voltage": pair.module.max_system_voltage_v,
        "voltage-cap": None if cap != cap else cap,
    }
    return {check: limit for check, limit in stated.items() if limit is not None}


def rejection(pair: Pair, space: Space, window: ClimateWindow, ratio: tuple[float, float]) -> Rejection:
    """Why a pair has no option, by the first of: string length, strings, module count."""
    if space.shortest > space.longest:
        return _no_length(pair, space, window)
    if all(g.max_strings < 1 for g in space.groups):
        return _no_string(pair)
    return _no_count(pair, space, ratio)


def _no_length(pair: Pair, space: Space, window: ClimateWindow) -> Rejection:
    p, inverter = pair.points, pair.inverter
    n = space.shortest
    low, low_limit, each = "mppt-low", inverter.mppt_low_v, p.vmp_hot_v
    if inverter.start_voltage_v is not None and p.voc_hot_v:
        if inverter.start_voltage_v / p.voc_hot_v > inverter.mppt_low_v / p.vmp_hot_v:
            low, low_limit, each = "start", inverter.start_voltage_v, p.voc_hot_v
    maxima = voltage_maxima(pair)
    over = [
        (n * p.voc_cold_v / limit - 1.0, check, n * p.voc_cold_v, limit)
        for check, limit in maxima.items()
        if n * p.voc_cold_v > limit * (1.0 + TOLERANCE)
    ]
    if n * p.vmp_25_v > inverter.mppt_high_v * (1.0 + TOLERANCE):
        over.append((n * p.vmp_25_v / inverter.mppt_high_v - 1.0, "mppt-high", n * p.vmp_25_v, inverter.mppt_high_v))
    over.sort(reverse=True)
    excess, check, value, limit = over[0]
    fewer = n - 1
    words = [
        f"{_in_series(n)} would be needed to reach {low_limit:g} V in the heat, and"
        f" {'make' if n > 1 else 'makes'} {value:.1f} V of {limit:g} V {_when(check)}"
    ]
    ways = list(_ways_out_of_length(pair, window, n, fewer, [o[1] for o in over], low, low_limit, each))
    if ways:
        words.append("it would take " + " or ".join(ways))
    short = (low_limit - fewer * each) / low_limit if fewer else np.inf
    return Rejection((low, *(o[1] for o in over)), "; ".join(words), float(min(excess, short)))


def _ways_out_of_length(
    pair: Pair, window: ClimateWindow, n: int, fewer: int, over: list[str], low: str, low_limit: float, each: float
) -> Iterator[str]:
    """What would let a string of n, or one module fewer, pass."""
    if set(over) <= {"max-dc-voltage", "system-voltage", "voltage-cap"}:
        coldest = window.coldest(pair.inverter, n)
        if coldest is not None and coldest <= pair.site.design_low_c + 15.0:
            yield f"a design low {coldest - pair.site.design_low_c:.1f} K milder"
    if fewer:
        hottest = window.hottest(pair.inverter, fewer)
        if hottest is not None and pair.site.design_high_c - 20.0 <= hottest < pair.site.design_high_c:
            yield f"a design high {pair.site.design_high_c - hottest:.1f} K cooler with {_in_series(fewer)}"
        word = "a window from" if low == "mppt-low" else "a start voltage of"
        yield f"{word} {np.floor(fewer * each):.0f} V for {_in_series(fewer)} (it has {low_limit:g} V)"


def _no_string(pair: Pair) -> Rejection:
    best = max(g.max_isc_a or 0.0 for g in pair.inverter.inputs)
    need = pair.points.isc_design_a
    return Rejection(
        ("short-circuit",),
        f"one string has {need:.1f} A of design short-circuit current, a tracker takes {best:g} A:"
        f" it would take a tracker with {need - best:.1f} A more",
        need / best - 1.0,
    )


def _no_count(pair: Pair, space: Space, ratio: tuple[float, float]) -> Rejection:
    """The lengths and strings are there, but no module count that is asked for can be made of them."""
    pmax, ac = pair.points.pmax_w, pair.inverter.ac_power_w
    least = space.shortest
    most = sum(g.trackers * g.max_strings for g in space.groups) * space.longest
    array = pair.inverter.max_array_power_w
    if array is not None and least * pmax > array * (1.0 + TOLERANCE):
        return Rejection(
            ("array-power",),
            f"the shortest string of {least} modules has {least * pmax:,.0f} W, the inverter takes {array:,.0f} W",
            least * pmax / array - 1.0,
        )
    if least * pmax > ratio[1] * ac * (1.0 + TOLERANCE):
        over = least * pmax / ac
        words = f"the shortest string of {least} gives DC/AC {over:.3f}: it would take a larger inverter"
        return Rejection(("ratio-window",), words, over / ratio[1] - 1.0)
    if most * pmax < ratio[0] * ac * (1.0 - TOLERANCE):
        under = most * pmax / ac
        words = f"its trackers take {most} modules, DC/AC {under:.3f}: it would take a smaller inverter"
        return Rejection(("ratio-window",), words, 1.0 - under / ratio[0])
    nearest = _nearest_counts(space)
    bounds = (max(space.fewest, 1), max(space.most, 1))
    distance = min((abs(c - b) / b for c in nearest for b in bounds), default=1.0)
    counts = " or ".join(f"{c} (DC/AC {c * pmax / ac:.3f})" for c in nearest)
    return Rejection(
        ("module-count",) if space.fewest <= space.most else ("ratio-window",),
        f"no arrangement has {_range(space.fewest, space.most)} modules; the nearest have {counts}"
        if space.fewest <= space.most
        else f"no module count is inside the window; the nearest are {counts}",
        distance,
    )


def _nearest_counts(space: Space) -> list[int]:
    """Reachable module counts next to the window, below and above."""
    low, high = sorted((space.fewest, space.most))
    reach = 2 * space.longest
    counts = replace(space, fewest=max(1, low - reach), most=high + reach).reachable
    if space.fewest > space.most:
        # The window lies between two whole numbers: no count is inside.
        return [c for c in counts if c <= low][-1:] + [c for c in counts if c >= high][:1]
    return [c for c in counts if c < low][-1:] + [c for c in counts if c > high][:1]


def _in_series(n: int) -> str:
    return f"{n} in series" if n > 1 else "1 module"


def _when(check: str) -> str:
    return "at 25 degC" if check == "mppt-high" else "in the cold"


def _range(low: int, high: int) -> str:
    return str(low) if low == high else f"{low} to {high}"
