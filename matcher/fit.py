"""Which inverters take a module (or the other way round), in which arrangements, in which order.

`fit` is the entry. It takes plain records and gives back a `Fit`: exact totals, and the options in order, as
columns (`Fit.ranked`) that are made into full options one by one (`Fit.option`).
"""

from __future__ import annotations

import heapq
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property, partial

import numpy as np

from catalog.records import Inverter, Module
from matcher.checks import (
    Check, Confirm, ModulePoints, Pair, Tracker, Verdict, check_option, to_confirm, verdict, worst_of_each,
)  # fmt: skip
from matcher.climate import ClimateWindow
from matcher.columns import InverterColumns
from matcher.electrical import Points, design_points
from matcher.errors import MatcherError
from matcher.limits import UNLIMITED
from matcher.moduleyear import ModuleYear, PlaneYear
from matcher.multipairs import MultiPairs
from matcher.near import Rejection, rejection
from matcher.options import Options, Unit, join, label
from matcher.order import in_words
from matcher.request import Request
from matcher.search import WHOLE_EVERY, Lazy, Search
from matcher.shared import free_space, on_several_units, with_strings
from matcher.shelf import Shelf

__all__ = ["Fit", "Option", "Request", "Totals", "fit", "module_points"]


@dataclass(frozen=True, slots=True)
class Option:
    """One option in full, ready to be shown."""

    rank: int
    verdict: Verdict
    module: int
    inverter: int
    modules: int
    wired: tuple[Unit, ...]
    dc_ac_ratio: float
    clipping_loss_pct: float | None
    current_clipping_pct: float | None
    yearly_kwh: float | None
    checks: tuple[Check, ...] = ()
    confirm: tuple[Confirm, ...] = ()
    coldest_c: float | None = None
    hottest_c: float | None = None
    cost: float | None = None
    cold_by_hours: bool = False

    @property
    def power_clipping_pct(self) -> float | None:
        """What the power limit takes of the unlimited AC energy [%]; the rest of the loss is the current limits'."""
        if self.clipping_loss_pct is None or self.current_clipping_pct is None:
            return None
        return self.clipping_loss_pct - self.current_clipping_pct

    @property
    def units(self) -> int:
        """Number of inverters."""
        return sum(u.copies for u in self.wired)

    @property
    def arrangement(self) -> tuple[Tracker, ...]:
        """What the trackers in use of one unit carry; of the first, where units are unlike."""
        return self.wired[0].trackers

    @property
    def label(self) -> str:
        """Like ``2x11 | 1x12``: strings x modules in series, trackers parted by a bar; unlike units by a plus."""
        return label(self.wired)


@dataclass(frozen=True, slots=True)
class Totals:
    """How much was looked at: records on the listed side, those with an option, and all arrangements."""

    records_considered: int
    records_with_option: int
    arrangements: int


@dataclass(eq=False)
class Fit:
    """Result of a search.

    ``lists_inverters`` tells which side is listed, ``found`` (bool, one per listed record) which records have
    an option.
    """

    modules: tuple[Module, ...]
    inverters: tuple[Inverter, ...]
    request: Request
    points: Points
    year: ModuleYear | None
    totals: Totals
    lists_inverters: bool
    found: np.ndarray
    table: Options
    lazy: list[Callable[[], Lazy]]
    search: Search

    @property
    def is_pair(self) -> bool:
        """Whether the question is about one module and one inverter."""
        return len(self.modules) == 1 and len(self.inverters) == 1

    @property
    def order(self) -> str:
        """The order of the options in words."""
        return in_words(self.request.order, self.request.clip_cap_pct, self.year is not None)

    def ranked(self) -> Iterator[Options]:
        """Options in order, in tables of any size."""
        if not self.lazy:
            yield self.table
            return
        keys = self.search.keys(self.table)
        whole = ((tuple(k), self.table, j) for j, k in enumerate(keys.tolist()))
        for _, table, row in heapq.merge(whole, *(begin() for begin in self.lazy), key=lambda entry: entry[0]):
            yield table.take(slice(row, row + 1))

    def options(self, limit: int | None = None, full: bool = True) -> Iterator[Option]:
        """Options in order as objects, the first ``limit``; with checks and climate window if ``full``."""
        rank = 0
        for table in self.ranked():
            for row in range(len(table)):
                if limit is not None and rank >= limit:
                    return
                rank += 1
                yield self.option(table, row, rank, full)

    def option(self, table: Options, row: int, rank: int, full: bool = True) -> Option:
        """One row of a table as an option."""
        m, i = int(table.module[row]), int(table.inverter[row])
        wired = table.wired(row)
        checks: tuple[Check, ...] = ()
        confirm: tuple[Confirm, ...] = ()
        coldest = hottest = None
        outcome = Verdict.TO_CONFIRM if table.to_confirm[row] else Verdict.FITS
        if full:
            pair = self.pair(m, i)
            checks = tuple(worst_of_each([c for unit in wired for c in check_option(pair, unit.trackers)]))
            confirm = tuple(to_confirm(checks))
            assert verdict(checks) is outcome, f"{wired}: the search and the checks disagree"
            lengths = [t.in_series for unit in wired for t in unit.trackers]
            coldest = self.window(m).coldest(self.inverters[i], max(lengths))
            hottest = self.window(m).hottest(self.inverters[i], min(lengths))
        return Option(
            rank, outcome, m, i, int(table.modules[row]), wired, float(table.ratio[row]),
            _number(table.clipping_pct[row]), _number(table.current_clipping_pct[row]),
            _number(table.yearly_kwh[row]), checks, confirm, coldest, hottest,
            _number(self.search.cost(table.take(slice(row, row + 1)))[0]),
            self.request.rules.cold_voltage == "hourly",
        )  # fmt: skip

    def module_points(self, m: int) -> ModulePoints:
        """Design values of one module."""
        return module_points(self.points, m)

    def pair(self, m: int, i: int) -> Pair:
        """What the checks need to know of a module and an inverter."""
        r = self.request
        return Pair(self.modules[m], self.module_points(m), self.inverters[i], r.site, r.rules, r.combiner)

    def rejections(self) -> list[tuple[int, Rejection]]:
        """Listed records without option, the nearest misses first: index, and why."""
        missed = []
        for k in np.flatnonzero(~self.found):
            m, i = (0, int(k)) if self.lists_inverters else (int(k), 0)
            missed.append((int(k), self.rejection(m, i)))
        return sorted(missed, key=lambda entry: entry[1].distance)

    def rejection(self, m: int, i: int) -> Rejection:
        """Why a pair has no option."""
        reason = self.points.reasons[m]
        if reason is not None:
            return Rejection((), f"cannot be matched: {reason}", np.inf)
        space = free_space(self.search, m, i, UNLIMITED)
        return rejection(self.pair(m, i), space, self.window(m), self.search.asked(m, i))

    @cached_property
    def _windows(self) -> dict[int, ClimateWindow]:
        return {}

    def window(self, m: int) -> ClimateWindow:
        if m not in self._windows:
            self._windows[m] = ClimateWindow(
                self.modules[m], self.module_points(m), self.request.site, self.request.rules
            )
        return self._windows[m]


def module_points(points: Points, m: int) -> ModulePoints:
    """Design values of one module of several."""
    voc_hot = points.voc_hot_v[m]
    return ModulePoints(
        cell_cold_c=float(points.cell_cold_c[m]),
        cell_hot_c=float(points.cell_hot_c[m]),
        voc_cold_v=float(points.voc_cold_v[m]),
        voc_hot_v=None if np.isnan(voc_hot) else float(voc_hot),
        vmp_hot_v=float(points.vmp_hot_v[m]),
        vmp_25_v=float(points.vmp_25_v[m]),
        vmp_cold_v=float(points.vmp_cold_v[m]),
        isc_design_a=float(points.isc_design_a[m]),
        imp_a=float(points.imp_a[m]),
        pmax_w=float(points.pmax_w[m]),
    )


def fit(
    modules: Sequence[Module],
    inverters: Sequence[Inverter],
    request: Request,
    year: ModuleYear | None = None,
    plane: PlaneYear | None = None,
    shelf: Shelf | None = None,
) -> Fit:
    """Every valid arrangement of the modules on the inverters, counted, worked out and ranked.

    Parameters
    ----------
    modules, inverters : sequences of records
        One of either, or several of one side. With one module the inverters are listed, otherwise the modules.
    request : Request
        Site, rules and wishes.
    year : ModuleYear, optional
        Condensed year of the module, arrays (classes,), or of all modules, (modules, classes). Without it
        there is no clipping figure.
    plane : PlaneYear, optional
        The year on the site's array, for rule sets that take the cold voltage from hourly weather.
    shelf : Shelf, optional
        How many of each record can be had, and at what price.

    Raises
    ------
    MatcherError
        Where the one module that was named cannot be matched at all, with the value that is missing; or
        where ``every`` asks for more options than can be listed at once.
    """
    if request.several and request.counts is None and request.strings is None:
        raise MatcherError("several units need to know what they share: a module count, or strings")
    points = design_points(modules, request.site, request.rules, plane)
    if len(modules) == 1 and points.reasons[0] is not None:
        raise MatcherError(f"{modules[0].name} cannot be matched: {points.reasons[0]}")
    search = Search(tuple(modules), InverterColumns.of(inverters), request, points, year, shelf)
    if request.strings is not None:
        table, arrangements, lazy = *with_strings(search, request.kinds), []
    elif request.several:
        table, arrangements, lazy = *on_several_units(search), []
    else:
        table, arrangements, lazy = _on_one_unit(search)
    table = table.take(search.rank(table))
    lists_inverters = len(modules) == 1
    listed = table.inverter if lists_inverters else table.module
    if not request.every:
        _, first = np.unique(listed, return_index=True)
        table = table.take(np.sort(first))
    totals = Totals(len(arrangements), int(sum(a > 0 for a in arrangements)), sum(arrangements))
    found = np.array([a > 0 for a in arrangements], dtype=bool)
    return Fit(
        tuple(modules), tuple(inverters), request, points, year, totals, lists_inverters, found, table, lazy, search
    )


def _on_one_unit(search: Search) -> tuple[Options, list[int], list[Callable[[], Lazy]]]:
    """Options of one inverter each, the exact number of arrangements per listed record, and lazy inverters."""
    request, singles = search.request, np.flatnonzero(search.inverters.single)
    lists_inverters = len(search.modules) == 1
    module = np.repeat(np.arange(len(search.modules)), len(singles))
    inverter = np.tile(singles, len(search.modules))
    table, _, sizes = search.single_trackers(module, inverter, search.limits(module, inverter), request.every)
    arrangements = [0] * (len(search.inverters.records) if lists_inverters else len(search.modules))
    for record, size in zip((inverter if lists_inverters else module).tolist(), sizes.tolist(), strict=True):
        arrangements[record] += size
    parts: list[Options] = [table]
    lazy: list[Callable[[], Lazy]] = []
    several = np.flatnonzero(~search.inverters.single)
    module, inverter = np.repeat(np.arange(len(search.modules)), len(several)), np.tile(several, len(search.modules))
    if not request.every:
        tables, sizes = MultiPairs(search, module, inverter).bests()
        for record, size in zip((inverter if lists_inverters else module).tolist(), sizes, strict=True):
            arrangements[record] += size
        return join([table, *tables]), arrangements, lazy
    for m, i in zip(module.tolist(), inverter.tolist(), strict=True):
        space = search.space(m, i)
        if not space.total:
            continue
        arrangements[i if lists_inverters else m] += space.total
        if space.total <= WHOLE_EVERY:
            whole = search.whole(m, i, space)
            assert whole is not None
            parts.append(whole)
        else:
            lazy.append(partial(search.in_order, m, i, space))
    return join(parts), arrangements, lazy


def _number(value: float) -> float | None:
    return None if np.isnan(value) else float(value)
