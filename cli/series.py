"""What the pictures of a report show, worked out by the engine: one string, like strings, module counts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from cli import facts
from matcher.checks import Tracker, Verdict, check_option
from matcher.columns import InverterColumns
from matcher.electrical import design_points, diode_parameters, hot_adder, vmp
from matcher.limits import TOLERANCE, voltage_cap
from matcher.moduleyear import ModuleYear
from matcher.search import Search

if TYPE_CHECKING:
    from catalog.records import Module, Site
    from matcher.arrangements import Space
    from matcher.fit import Fit, Option
    from matcher.rules import RuleSet

#: Air temperatures that a picture shows at most [degC].
_COLDEST_SHOWN, _HOTTEST_SHOWN = -60.0, 75.0

#: Rows and columns of the grid, and module counts, that a picture shows at most.
_ROWS, _COLUMNS, _COUNTS = 26, 24, 41

#: Stands for "any DC/AC ratio".
_ANY_RATIO = (1e-9, 1e9)


@dataclass(frozen=True, slots=True)
class Limit:
    """A limit on the string's voltage [V]: one that is on record, or one that is to be confirmed."""

    name: str
    volts: float
    maximum: bool = True
    recorded: bool = True


@dataclass(frozen=True, slots=True, eq=False)
class StringInClimate:
    """Voltages of an option's strings against air temperature, its limits, and where it holds.

    ``voc_v`` is the longest string's at dawn (cell at the air's temperature), ``vmp_v`` the shortest string's
    at 1000 W/m2; arrays of the shape of ``ambient_c``.
    """

    ambient_c: np.ndarray
    voc_v: np.ndarray
    vmp_v: np.ndarray
    longest: int
    shortest: int
    design_low_c: float
    design_high_c: float
    voc_cold_v: float
    vmp_hot_v: float
    coldest_c: float | None
    hottest_c: float | None
    window_v: tuple[float, float]
    limits: tuple[Limit, ...]
    words: str


@dataclass(frozen=True, slots=True)
class WiringGrid:
    """Outcome of S strings of N modules on one inverter: fits, to-confirm, ratio (outside the window) or no.

    ``cells[r][c]`` belongs to ``lengths[r]`` modules in series and ``strings[c]`` strings. ``row_notes`` says
    what stops a length altogether. ``chosen`` is (column, row) of the first option, where it is in the grid.
    """

    lengths: tuple[int, ...]
    strings: tuple[int, ...]
    cells: tuple[tuple[str, ...], ...]
    row_notes: tuple[str, ...]
    chosen: tuple[int, int] | None
    words: str


@dataclass(frozen=True, slots=True)
class EnergyByCount:
    """Yearly energy [kWh] and clipping loss [%] of the best wiring of each module count on one inverter."""

    counts: tuple[int, ...]
    yearly_kwh: tuple[float, ...]
    clipping_pct: tuple[float, ...]
    sure: tuple[bool, ...]
    chosen: int | None
    cap_pct: float
    words: str


def string_in_climate(fit: Fit, option: Option) -> StringInClimate:
    """Voltages of an option's strings over the air temperatures of its site and of its climate window."""
    module, inverter, site = fit.modules[option.module], fit.inverters[option.inverter], fit.request.site
    points = fit.module_points(option.module)
    lengths = [t.in_series for unit in option.wired for t in unit.trackers]
    longest, shortest = max(lengths), min(lengths)
    ends = (facts.holds_from(option), facts.holds_to(option))
    coldest, hottest = (end if isinstance(end, float) else None for end in ends)
    low = min(site.design_low_c - 8, site.design_low_c if coldest is None else coldest - 4)
    high = max(site.design_high_c + 8, site.design_high_c if hottest is None else hottest + 4)
    ambient = np.arange(np.floor(max(low, _COLDEST_SHOWN)), np.ceil(min(high, _HOTTEST_SHOWN)) + 0.5, 1.0)
    noon = vmp(module, ambient + hot_adder(module, site), diode_parameters(module))
    assert noon is not None  # a module without Vmp in the heat is never matched
    voc_cold, vmp_hot = longest * points.voc_cold_v, shortest * points.vmp_hot_v
    found = StringInClimate(
        ambient,
        longest * _dawn_voc(module, site, fit.request.rules, ambient),
        shortest * noon,
        longest,
        shortest,
        site.design_low_c,
        site.design_high_c,
        voc_cold,
        vmp_hot,
        coldest,
        hottest,
        (inverter.mppt_low_v, inverter.mppt_high_v),
        tuple(_limits(fit, option)),
        "",
    )
    holds = facts.climate_words(option, site.design_low_c, site.design_high_c)
    return replace(found, words=_climate_words(found, holds))


def _dawn_voc(module: Module, site: Site, rules: RuleSet, ambient: np.ndarray) -> np.ndarray:
    """Voc of a module [V] with its cells at the air's temperature, by the method of the rule set.

    By the coefficient, or the table, where the rule set takes the cold voltage from hours of weather.
    """
    if rules.cold_voltage == "hourly":
        rules = replace(rules, cold_voltage="coefficient")
    # A coefficient of Vmp only spares the engine the single-diode model, whose Vmp is not asked for here.
    plain = replace(module, vmp_coef_pct=module.vmp_coef_pct or -0.4)
    return np.array(
        [
            design_points([plain], replace(site, design_low_c=t, design_high_c=t), rules).voc_cold_v[0]
            for t in ambient.tolist()
        ]
    )


def _limits(fit: Fit, option: Option) -> list[Limit]:
    module, inverter = fit.modules[option.module], fit.inverters[option.inverter]
    cap = voltage_cap(fit.request.site, fit.request.rules)
    stated = (
        ("max DC voltage", inverter.max_dc_voltage_v, True),
        ("module system voltage", module.max_system_voltage_v, True),
        ("voltage cap", None if np.isnan(cap) else cap, True),
        ("MPPT window, top", inverter.mppt_high_v, True),
        ("MPPT window, bottom", inverter.mppt_low_v, False),
        ("start voltage", inverter.start_voltage_v, False),
    )
    found = [Limit(name, volts, maximum) for name, volts, maximum in stated if volts is not None]
    asked = {"max_dc_voltage_v": "max DC voltage", "max_system_voltage_v": "system voltage"}
    for c in option.confirm:
        least = facts.at_least(c)
        if c.field in asked and least is not None:
            found.append(Limit(f"confirm {asked[c.field]}", least, recorded=False))
    return found


def volts_words(limit: Limit) -> str:
    """Like "850 V"; a value to confirm with its tenth, which is rounded up already."""
    return f"{limit.volts:,.0f} V" if limit.recorded else f"≥ {limit.volts:,.1f} V"


def _string(in_series: int) -> str:
    return f"{in_series} modules in series have" if in_series > 1 else "1 module has"


def _climate_words(s: StringInClimate, holds: str) -> str:
    limits = ", ".join(f"{lim.name} {volts_words(lim)}" for lim in s.limits)
    return (
        f"{_string(s.longest)} {s.voc_cold_v:,.0f} V open-circuit at the design low of"
        f" {s.design_low_c:g} °C; {_string(s.shortest)} {s.vmp_hot_v:,.0f} V at maximum power at the"
        f" design high of {s.design_high_c:g} °C in full sun. Limits: {limits}. The wiring holds in air of"
        f" {holds}."
    )


def _one_inverter(fit: Fit, module: int, inverter: int, ratio: tuple[float, float]) -> Search:
    """A search of one unit of one pair with the design values, the year and the rules of a result."""
    year = fit.year
    if year is not None and year.power_w.ndim == 2:
        hours = year.hours[module] if year.hours.ndim == 2 else year.hours
        year = ModuleYear(year.power_w[module], year.vmp_v[module], hours)
    request = replace(fit.request, ratio=ratio, counts=None, strings=None, units=(1, 1), every=False)
    points = fit.points.take(module)
    return Search(
        fit.modules[module : module + 1],
        InverterColumns.of(fit.inverters[inverter : inverter + 1]),
        request,
        points,
        year,
    )


def wiring_grid(fit: Fit, module: int, inverter: int, option: Option | None) -> WiringGrid:
    """Which numbers of like strings, of which length, one inverter takes, whatever else was asked for."""
    space = _one_inverter(fit, module, inverter, _ANY_RATIO).space(0, 0)
    shortest, longest = space.shortest, space.longest
    pmax, ac = fit.modules[module].pmax_w, fit.inverters[inverter].ac_power_w
    unit = option.wired[0] if option is not None else None
    uniform = unit is not None and len({t.in_series for t in unit.trackers}) == 1
    strings = sum(t.strings for t in unit.trackers) if unit is not None else 1
    length = unit.trackers[0].in_series if unit is not None else min(shortest, longest)
    low, high = sorted((shortest, longest))
    rows = _span(max(1, low - 2), high + 2, length, _ROWS)
    most = int(fit.request.ratio[1] * ac / (max(1, low) * pmax))
    columns = _span(1, max(most + 1, strings + 1, 4), strings, _COLUMNS)
    pair = fit.pair(module, inverter)
    cells, notes = [], []
    for n in rows:
        inside = [_inside(n * s * pmax / ac, fit.request.ratio) for s in columns]
        cells.append(tuple(_outcome(space, n, s, i) for s, i in zip(columns, inside, strict=True)))
        failing = [
            c for c in check_option(pair, (Tracker(0, 1, n),)) if c.stop and c.verdict is Verdict.DOES_NOT_FIT
        ]
        notes.append("".join(f"{c.check} {c.value:,.0f} of {c.limit:,.0f} {c.unit}" for c in failing[:1]))
    chosen = None
    if uniform and length in rows and strings in columns:
        chosen = (columns.index(strings), rows.index(length))
    return WiringGrid(rows, columns, tuple(cells), tuple(notes), chosen, _grid_words(rows, columns, cells))


def _span(low: int, high: int, around: int, most: int) -> tuple[int, ...]:
    """Whole numbers from low to high, no more than ``most`` of them, with ``around`` inside."""
    if high - low >= most:
        low = min(max(low, around - most // 2), high - most + 1)
        high = low + most - 1
    return tuple(range(low, high + 1))


def _inside(ratio: float, window: tuple[float, float]) -> bool:
    return window[0] * (1 - TOLERANCE) <= ratio <= window[1] * (1 + TOLERANCE)


def _outcome(space: Space, in_series: int, strings: int, inside: bool) -> str:
    """Outcome of like strings spread over the trackers, those that leave nothing to confirm first."""
    taken = sum(g.trackers * g.max_strings for g in space.groups)
    if (
        not space.shortest <= in_series <= space.longest
        or strings > taken
        or in_series * strings > space.most
    ):
        return "no"
    if not inside:
        return "ratio"
    sure = sum(g.trackers * g.max_strings for g in space.groups if not g.to_confirm)
    return "fits" if space.sure_from <= in_series <= space.sure_to and strings <= sure else "to-confirm"


def _grid_words(rows: Sequence[int], columns: Sequence[int], cells: Sequence[Sequence[str]]) -> str:
    parts = [
        f"Strings of {rows[0]} to {rows[-1]} modules, {columns[0]} to {columns[-1]} of them on one inverter."
    ]
    for outcome, name in (
        ("fits", "Fits"),
        ("to-confirm", "To confirm"),
        ("ratio", "Outside the DC/AC window only"),
    ):
        some = []
        for n, row in zip(rows, cells, strict=True):
            counts = [s for s, cell in zip(columns, row, strict=True) if cell == outcome]
            if counts:
                some.append(f"{_runs(counts)} of {n}")
        parts.append(f"{name}: {'; '.join(some) or 'none'}.")
    return " ".join(parts)


def _runs(numbers: Sequence[int]) -> str:
    """Like ``1 to 3, 5``."""
    runs: list[list[int]] = []
    for n in numbers:
        if runs and n == runs[-1][1] + 1:
            runs[-1][1] = n
        else:
            runs.append([n, n])
    return ", ".join(str(a) if a == b else f"{a} to {b}" for a, b in runs)


def energy_by_count(fit: Fit, option: Option) -> EnergyByCount | None:
    """Energy and clipping of each module count inside the ratio window; ``None`` without a year."""
    if option.yearly_kwh is None or option.clipping_loss_pct is None:
        return None
    search = _one_inverter(fit, option.module, option.inverter, fit.request.ratio)
    space = search.space(0, 0)
    reachable = [int(c) for c in space.reachable]
    chosen = option.wired[0].modules
    if len(reachable) > _COUNTS:
        picked = {reachable[k] for k in np.linspace(0, len(reachable) - 1, _COUNTS).astype(int).tolist()}
        reachable = sorted(picked | ({chosen} & set(reachable)))
    best = [search.best_of_count(0, 0, space, count) for count in reachable]
    if len(best) < 2:
        return None
    kwh, clipping = [float(t.yearly_kwh[0]) for t in best], [float(t.clipping_pct[0]) for t in best]
    words = (
        f"From {reachable[0]:,} modules, {kwh[0]:,.0f} kWh a year with {clipping[0]:.2f} % clipped, to"
        f" {reachable[-1]:,} modules, {kwh[-1]:,.0f} kWh with {clipping[-1]:.2f} % clipped, each in its"
        f" best wiring on one inverter. The cap on clipping is {fit.request.clip_cap_pct:g} %."
    )
    sure = tuple(not bool(t.to_confirm[0]) for t in best)
    return EnergyByCount(
        tuple(reachable),
        tuple(kwh),
        tuple(clipping),
        sure,
        chosen if chosen in reachable else None,
        fit.request.clip_cap_pct,
        words,
    )
