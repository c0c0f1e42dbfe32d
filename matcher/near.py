"""Why an inverter takes no arrangement at all, and what would change that.

The cause that is named is a check that fails for the arrangement which misses least: the limits are given way
one after the other (longer strings, shorter ones, more strings on a tracker, more power), and the checks
themselves say what is then wrong and by how much.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from matcher import reach
from matcher.arrangements import Space
from matcher.checks import Check, Pair, Verdict, check_option, worst_of_each
from matcher.climate import ClimateWindow
from matcher.limits import TOLERANCE, voltage_cap
from matcher.options import Unit, label
from matcher.request import Request

#: Where counts below and above can be wired, a count whose nearest arrangement misses a limit by more than
#: this share, or only with what is left over, is called the wrong count: it is the count that wants changing.
MISS = 0.10

#: A limit that is missed by more than this share is not a near miss any more.
FAR = 1.0


#: A way of wiring, and its checks.
Nearest = tuple[tuple[Unit, ...], list[Check]]


@dataclass(frozen=True, slots=True)
class Rejection:
    """One inverter without option: the checks that stop it, and the nearest thing that would not.

    ``failed`` begins with the check that stops the nearest arrangement (``module-count`` where no rating is to
    blame, ``ratio-window`` where only the asked DC/AC ratios are). ``distance`` is how far the nearest is from
    fitting, as a share of the limit that is missed; it ranks the near misses. ``checks`` and ``wired`` are those
    of the nearest arrangement, where there is one.
    """

    failed: tuple[str, ...]
    nearest: str
    distance: float
    checks: tuple[Check, ...] = ()
    wired: tuple[Unit, ...] = ()


def voltage_maxima(pair: Pair) -> dict[str, float]:
    """Limits [V] on the cold Voc of a string that are stated, by check."""
    cap = voltage_cap(pair.site, pair.rules)
    stated = {
        "max-dc-voltage": pair.inverter.max_dc_voltage_v,
        "system-voltage": pair.module.max_system_voltage_v,
        "voltage-cap": None if cap != cap else cap,
    }
    return {check: limit for check, limit in stated.items() if limit is not None}


def rejection(pair: Pair, space: Space, window: ClimateWindow, request: Request) -> Rejection:
    """Why a pair has no option: string length, strings, the asked strings or count, then the asked ratio.

    ``space`` holds what the ratings allow, whatever count and DC/AC ratio are asked for; its ``most`` is bound
    by the array power at most. An inverter that is far too large or too small for the asked modules is no near
    miss, however little else is missed.
    """
    found = _rejection(pair, space, window, request)
    ratio, miss = _asked_ratio(pair, request)
    if miss <= TOLERANCE or "ratio-window" in found.failed:
        return found
    low, high = request.ratio
    words = f"{found.nearest}; and the DC/AC ratio, {ratio:.2f}, is outside the asked {low:g} to {high:g}"
    return replace(found, nearest=words, distance=found.distance + miss)


def _asked_ratio(pair: Pair, request: Request) -> tuple[float, float]:
    """The DC/AC ratio of the asked modules that is nearest to the asked window, and by what share it is outside."""
    low, high = (request.modules_in_strings,) * 2 if request.strings is not None else request.counts or (0, 0)
    if not high:
        return request.ratio[0], 0.0
    each = pair.points.pmax_w / pair.inverter.ac_power_w
    # Any number of modules and units of their ranges: only where the whole span is outside is the size wrong.
    least, most = low * each / request.units[1], high * each / request.units[0]
    nearest = min(max(request.ratio[0], least), most)
    return nearest, _ratio_miss(nearest, request.ratio)


def _rejection(pair: Pair, space: Space, window: ClimateWindow, request: Request) -> Rejection:
    if space.shortest > space.longest:
        return no_length(pair, space, window)
    if all(g.max_strings < 1 for g in space.groups):
        return no_string(pair)
    if request.strings is not None:
        stopped = strings_stopped(pair, space, request.strings, request.units)
        return stopped or _outside_ratio(pair, [request.modules_in_strings], request)
    return _no_count(pair, space, request)


def no_length(pair: Pair, space: Space, window: ClimateWindow) -> Rejection:
    """What stops every string length."""
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
    if not fewer:
        words = [f"a single module makes {value:,.1f} V of {limit:,g} V {_when(check)}"]
    else:
        words = [f"{n} in series would be needed to reach {low_limit:,g} V in the heat, and make {value:,.1f} V of"
                 f" {limit:,g} V {_when(check)}"]  # fmt: skip
    ways = list(_ways_out_of_length(pair, window, n, fewer, [o[1] for o in over], low, low_limit, each))
    if ways:
        words.append("it would take " + " or ".join(ways))
    short = (low_limit - fewer * each) / low_limit if fewer else np.inf
    failed = [o[1] for o in over]
    if fewer:
        # One module fewer misses the lower limit; what is missed by less stands first.
        failed = [low, *failed] if short < excess else [*failed, low]
    return Rejection(tuple(failed), "; ".join(words), float(min(excess, short)))


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
        yield f"{word} {np.floor(fewer * each):,.0f} V for {_in_series(fewer)} (it has {low_limit:,g} V)"


def no_string(pair: Pair) -> Rejection:
    """What stops a single string on any tracker: its current."""
    best = max(g.max_isc_a or 0.0 for g in pair.inverter.inputs)
    need = pair.points.isc_design_a
    return Rejection(
        ("short-circuit",),
        f"one string has {need:.1f} A of design short-circuit current, a tracker takes {best:g} A:"
        f" it would take a tracker with {need - best:.1f} A more",
        need / best - 1.0,
    )


def _no_count(pair: Pair, space: Space, request: Request) -> Rejection:
    """The lengths and strings are there, but no module count that is asked for can be made of them."""
    pmax, ac = pair.points.pmax_w, pair.inverter.ac_power_w
    if space.most < space.shortest:
        array = pair.inverter.max_array_power_w or 0.0
        least = space.shortest * pmax
        return Rejection(
            ("array-power",),
            f"the shortest string, {_in_series(space.shortest)}, has {least:,.0f} W, the inverter takes {array:,.0f} W",
            least / array - 1.0,
        )
    low_units, high_units = request.units
    if request.counts is None:
        return _outside_ratio(pair, _counts_near_window(pair, space, request), request)
    low, high = request.counts
    reachable: list[int] = []
    misses: list[Rejection] = []
    for units in range(low_units, high_units + 1):
        one = _one_unit(space, high)
        bits = reach.on_units(one, units, high) if units > 1 else one
        inside = reach.members(bits >> low << low)
        if inside:
            reachable += [c for c in inside if not _in_ratio(pair, c, units, request)]
            continue
        # Of a range of counts the ends are nearest to what can be wired.
        misses += [count_stopped(pair, space, count, units) for count in sorted({low, high})]
    if reachable:
        units = low_units
        nearest = sorted(set(reachable), key=lambda c: _ratio_miss(c * pmax / (units * ac), request.ratio))[:2]
        return _outside_ratio(pair, sorted(nearest), request)
    return min(misses, key=lambda r: r.distance)


def _in_ratio(pair: Pair, count: int, units: int, request: Request) -> bool:
    ratio = count * pair.points.pmax_w / (units * pair.inverter.ac_power_w)
    return _ratio_miss(ratio, request.ratio) <= TOLERANCE


def _ratio_miss(ratio: float, window: tuple[float, float]) -> float:
    return max(window[0] / ratio - 1.0, ratio / window[1] - 1.0, 0.0)


def _counts_near_window(pair: Pair, space: Space, request: Request) -> list[int]:
    """Reachable counts next to the window of DC/AC ratios, below and above."""
    each = pair.points.pmax_w / pair.inverter.ac_power_w
    low, high = int(np.ceil(request.ratio[0] / each)), int(np.floor(request.ratio[1] / each))
    bits = _one_unit(space, max(low, high) + 2 * space.longest)
    found = [reach.below(bits, max(low, high + 1)), reach.above(bits, min(low - 1, high))]
    return [c for c in found if c is not None]


def _outside_ratio(pair: Pair, counts: Sequence[int], request: Request) -> Rejection:
    """Counts that can be wired, at a DC/AC ratio that is not asked for."""
    each = pair.points.pmax_w / pair.inverter.ac_power_w / request.units[0]
    misses = [_ratio_miss(c * each, request.ratio) for c in counts]
    said = " or ".join(f"{_modules(c)} (DC/AC {c * each:.3f})" for c in counts)
    low, high = request.ratio
    words = f"it can be wired with {said}, outside the asked DC/AC ratio of {low:g} to {high:g}"
    sizes = [c * each for c in counts]
    if min(sizes) > high:
        words += ": it would take a larger inverter"
    elif max(sizes) < low:
        words += ": it would take a smaller inverter"
    return Rejection(("ratio-window",), words, min(misses))


def _one_unit(space: Space, most: int) -> int:
    """Counts up to ``most`` that one unit takes."""
    return reach.one_unit(replace(space, fewest=1, most=max(0, min(space.most, most))))


def count_stopped(pair: Pair, space: Space, total: int, units: int) -> Rejection:
    """What stops ``total`` modules on ``units`` inverters, some of whose string lengths can be had.

    ``space`` is that of `rejection`, with a string length and a string that the ratings allow.
    """
    smaller, larger = counts_around(space, total, units)
    held = max(space.longest * sum(g.trackers * g.max_strings for g in space.groups), 1)
    found = [] if total < units else list(_given_way(pair, space, total, units))
    best = min(found, key=_miss, default=None)
    single = space.longest == 1 and total > units * held
    between = smaller is not None and larger is not None
    if best is None or single or (between and (_miss(best) > MISS or _is_rest(best, space))):
        return _wrong_count(pair, space, total, units, smaller, larger)
    wired, checks = best
    failed = _failing(checks)
    said = "; ".join(describe(c, pair) for c in failed)
    return Rejection(
        tuple(c.check for c in failed), f"the nearest way, {label(wired)}: {said}{_counts_that_work(smaller, larger)}",
        _miss(best), tuple(checks), wired,
    )  # fmt: skip


def _is_rest(nearest: Nearest, space: Space) -> bool:
    """Whether only the rest of a division misses: some strings have a length that the ratings allow, others not."""
    inside = {space.shortest <= t.in_series <= space.longest for unit in nearest[0] for t in unit.trackers}
    return len(inside) == 2


def counts_around(space: Space, total: int, units: int) -> tuple[int | None, int | None]:
    """Module counts next below and next above ``total`` that the units can take."""
    most = total + units * max(space.longest, 1) * 2
    one = _one_unit(space, most)
    bits = reach.on_units(one, units, most) if units > 1 else one
    return reach.below(bits, total), reach.above(bits, total)


def _given_way(pair: Pair, space: Space, total: int, units: int) -> Iterator[Nearest]:
    """Arrangements that hold the count once one limit gives way by as little as it takes, with their checks."""
    whole = replace(space, fewest=1, most=total)
    farthest = min(total, int(space.longest * (1.0 + FAR)))
    ways = [
        [whole],
        [replace(whole, longest=n) for n in range(space.longest + 1, farthest + 1)],
        [replace(whole, shortest=n) for n in range(space.shortest - 1, 0, -1)],
        [replace(whole, groups=_with_more_strings(space, extra)) for extra in (1, 2, 4)],
    ]
    found = list(filter(None, (_first_wired(pair, way, total, units) for way in ways)))
    yield from found
    if found:
        return
    for extra in (0, 1, 2, 4):
        groups = _with_more_strings(space, extra)
        way = [
            replace(whole, shortest=max(1, 2 * space.shortest - n), longest=n, groups=groups)
            for n in range(space.longest + 1, farthest + 1)
        ]
        nearest = _first_wired(pair, way, total, units)
        if nearest is not None:
            yield nearest


def _first_wired(pair: Pair, spaces: Sequence[Space], total: int, units: int) -> Nearest | None:
    """The count wired in the first of some spaces, each inside the next, that takes it."""
    if not spaces or not _takes(spaces[-1], total, units):
        return None
    first = bisect_left(spaces, True, key=lambda s: _takes(s, total, units))
    return _wired(pair, spaces[first], total, units)


def _takes(space: Space, total: int, units: int) -> bool:
    return reach.adds_up(reach.one_unit(space), total, units)


def _with_more_strings(space: Space, extra: int) -> tuple:
    return tuple(replace(g, max_strings=g.max_strings + extra) for g in space.groups)


def _wired(pair: Pair, space: Space, total: int, units: int) -> Nearest:
    """One way of wiring the count in a space that takes it, and its checks."""
    split = reach.split(reach.one_unit(space), total, units)
    assert split is not None
    wired = reach.any_wiring(space, pair.inverter, split)
    return wired, checks_of(pair, wired)


def checks_of(pair: Pair, wired: Sequence[Unit]) -> list[Check]:
    """The deciding checks of all units together."""
    return worst_of_each([c for unit in wired for c in check_option(pair, unit.trackers)])


def _failing(checks: Sequence[Check]) -> list[Check]:
    """Failing checks, the one that is missed by most first: it has to be mended in any case."""
    failed = [c for c in checks if c.stop and c.verdict is Verdict.DOES_NOT_FIT]
    return sorted(failed, key=lambda c: c.margin_pct if c.margin_pct is not None else 0.0)


def _miss(nearest: Nearest) -> float:
    """How far the worst check of an arrangement is from passing, as a share of its limit."""
    return max((-(c.margin_pct or 0.0) / 100.0 for c in _failing(nearest[1])), default=0.0)


def _wrong_count(
    pair: Pair, space: Space, total: int, units: int, smaller: int | None, larger: int | None
) -> Rejection:
    trackers = units * sum(g.trackers for g in space.groups)
    shared = f" on {units} units" if units > 1 else ""
    lengths = f"{space.shortest} to {space.longest}" if space.shortest < space.longest else str(space.longest)
    words = f"no strings of {lengths} on {trackers:,} tracker{'s' if trackers > 1 else ''} add up to {_modules(total)}"
    near = [c for c in (smaller, larger) if c is not None]
    distance = min((abs(c - total) / total for c in near), default=1.0)
    return Rejection(("module-count",), f"{words}{shared}{_counts_that_work(smaller, larger)}", distance)


def _counts_that_work(smaller: int | None, larger: int | None) -> str:
    near = [c for c in (smaller, larger) if c is not None]
    if not near:
        return ""
    ahead = f"{near[0]:,} or " if len(near) > 1 else ""
    return f"; {ahead}{_modules(near[-1])} can be wired"


def strings_stopped(
    pair: Pair, space: Space, strings: Sequence[tuple[int, int]], units: tuple[int, int]
) -> Rejection | None:
    """What stops an array given as (modules in series, strings) pairs; ``None`` where nothing does."""
    lengths = [n for n, _ in strings]
    whole = replace(space, fewest=1, most=sum(n * s for n, s in strings))
    for count in range(units[0], units[1] + 1):
        for extra in (0, 1, 2, 4, sum(s for _, s in strings)):
            relaxed = replace(whole, shortest=min(*lengths, space.shortest), longest=max(*lengths, space.longest),
                              groups=_with_more_strings(space, extra))  # fmt: skip
            wired = reach.any_hosting(relaxed, pair.inverter, strings, count)
            if wired is None:
                continue
            checks = checks_of(pair, wired)
            if not _failing(checks):
                return None
            stopped = stopped_by(pair, wired, checks)
            return replace(stopped, nearest=stopped.nearest + _whole_strings(pair, whole.most, count, checks))
    return Rejection(("module-count",), "these strings cannot be shared by so many units", 1.0)


def _whole_strings(pair: Pair, total: int, units: int, checks: Sequence[Check]) -> str:
    """That modules shared out evenly would not exceed the array power of a unit, were strings not whole; or empty."""
    even_w = total / units * pair.points.pmax_w
    power = next((c for c in _failing(checks) if c.check == "array-power"), None)
    if units == 1 or power is None or power.limit is None or even_w > power.limit:
        return ""
    return f" (strings stay whole: they cannot be parted into {even_w:,.0f} W on each of {units} units)"


def stopped_by(pair: Pair, wired: tuple[Unit, ...], checks: Sequence[Check]) -> Rejection:
    """What stops one arrangement, of which a check fails."""
    failed = _failing(checks)
    said = "; ".join(describe(c, pair) for c in failed)
    return Rejection(tuple(c.check for c in failed), f"wired as {label(wired)}: {said}", _miss((wired, list(checks))),
                     tuple(checks), wired)  # fmt: skip


_WHERE = {
    "max-dc-voltage": "{value:,.1f} V in the cold ({low:g} degC), the inverter takes {limit:,g} V",
    "system-voltage": "{value:,.1f} V in the cold ({low:g} degC), the modules take {limit:,g} V",
    "voltage-cap": "{value:,.1f} V in the cold ({low:g} degC), the cap is {limit:,g} V",
    "mppt-low": "{value:,.1f} V in the heat ({high:g} degC), tracking begins at {limit:,g} V",
    "mppt-high": "{value:,.1f} V at 25 degC, tracking ends at {limit:,g} V",
    "start": "{value:,.1f} V in the heat ({high:g} degC), the inverter starts at {limit:,g} V",
    "short-circuit": "{value:,.1f} A of design short-circuit current on a tracker that takes {limit:,g} A",
    "string-inputs": "{value:.0f} strings on a tracker that has inputs for {limit:.0f}",
    "array-power": "{value:,.0f} W of modules on an inverter that allows {limit:,.0f} W",
}


def describe(check: Check, pair: Pair) -> str:
    """A failing stop check in words and numbers."""
    return _WHERE[check.check].format(
        value=check.value, limit=check.limit, low=pair.site.design_low_c, high=pair.site.design_high_c
    )


def _modules(n: int) -> str:
    return f"{n:,} module{'s' if n != 1 else ''}"


def _in_series(n: int) -> str:
    return f"{n} in series" if n > 1 else "1 module"


def _when(check: str) -> str:
    return "at 25 degC" if check == "mppt-high" else "in the cold"
