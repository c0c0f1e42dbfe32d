"""The search: which inverters take a module (or the other way round), in which arrangements, in which order.

`fit` is the entry. It takes plain records and gives back a `Fit`: exact totals, and the options in order, as
columns (`Fit.ranked`) that are made into full options one by one (`Fit.option`).

Pairs whose inverter has one tracker are all worked out together as arrays. An inverter with several trackers
is worked out whole while its arrangements are few, and best first (`matcher.bestfirst`) where they are many.
"""

from __future__ import annotations

import heapq
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from catalog.records import Inverter, Module, Site
from matcher.arrangements import Group, Space
from matcher.bestfirst import best_first
from matcher.checks import (
    Check, Confirm, ModulePoints, Pair, Tracker, Verdict, check_option, to_confirm, verdict,
)  # fmt: skip
from matcher.climate import ClimateWindow
from matcher.clipping import Losses, block_losses, count_bounds, single_losses
from matcher.columns import InverterColumns, column
from matcher.electrical import Points, design_points
from matcher.errors import MatcherError
from matcher.limits import PairLimits, at_most, pair_limits
from matcher.moduleyear import ModuleYear
from matcher.near import Rejection, rejection
from matcher.options import Options, build, join
from matcher.order import Order, in_words, ranked, sort_keys
from matcher.rules import DEFAULT_RULES, RuleSet
from matcher.singles import expand

#: An inverter of several trackers with no more arrangements than this is worked out whole.
WHOLE = 2_000
WHOLE_EVERY = 50_000

#: Options worked out before they are reduced to the best of each record.
PART = 400_000

#: Options that can be sorted at once.
MOST_AT_ONCE = 5_000_000


@dataclass(frozen=True, slots=True)
class Request:
    """What is asked besides the records.

    ``ratio`` is the window of DC/AC ratios, ``counts`` the lowest and highest number of modules on an
    inverter, ``clip_cap_pct`` the clipping loss [%] up to which a higher ratio is better. ``every`` asks for
    all arrangements and not for the best one of each record. With ``combiner`` strings are paralleled ahead
    of the inverter, which waives its string inputs.
    """

    site: Site
    rules: RuleSet = DEFAULT_RULES
    ratio: tuple[float, float] = (0.8, 1.5)
    counts: tuple[int, int] | None = None
    clip_cap_pct: float = 2.0
    combiner: bool = False
    order: Order = Order.LEAST_INVERTER
    every: bool = False

    def __post_init__(self) -> None:
        low, high = self.ratio
        if not 0 < low <= high:
            raise MatcherError(f"the DC/AC ratio window {low:g}..{high:g} is upside down or not above 0")
        if self.counts is not None and not 0 < self.counts[0] <= self.counts[1]:
            raise MatcherError(f"the module count {self.counts[0]}..{self.counts[1]} is upside down or not above 0")
        if self.site.design_low_c > self.site.design_high_c:
            raise MatcherError(
                f"the design low {self.site.design_low_c:g} degC is above the design high"
                f" {self.site.design_high_c:g} degC"
            )


@dataclass(frozen=True, slots=True)
class Option:
    """One option in full, ready to be shown."""

    rank: int
    verdict: Verdict
    module: int
    inverter: int
    modules: int
    arrangement: tuple[Tracker, ...]
    dc_ac_ratio: float
    clipping_loss_pct: float | None
    current_clipping_pct: float | None
    yearly_kwh: float | None
    checks: tuple[Check, ...] = ()
    confirm: tuple[Confirm, ...] = ()
    coldest_c: float | None = None
    hottest_c: float | None = None

    @property
    def label(self) -> str:
        """Like ``2x11 | 1x12``: strings x modules in series, trackers parted by a bar."""
        return " | ".join(t.label for t in self.arrangement)


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
    lazy: list[Iterator[tuple[tuple[float, ...], Options, int]]]
    search: _Search

    @property
    def is_pair(self) -> bool:
        """Whether the question is about one module and one inverter."""
        return len(self.modules) == 1 and len(self.inverters) == 1

    @property
    def order(self) -> str:
        """The order of the options in words."""
        return in_words(self.request.order, self.request.clip_cap_pct, self.year is not None)

    @cached_property
    def name_rank(self) -> np.ndarray:
        """Rank of each pair by maker and model, shape (modules, inverters)."""
        return _name_rank(self.modules, self.inverters)

    def ranked(self) -> Iterator[Options]:
        """Options in order, in tables of any size; can be gone through once where inverters are lazy."""
        if not self.lazy:
            yield self.table
            return
        rank = self.name_rank[self.table.module, self.table.inverter]
        keys = np.column_stack(sort_keys(self.table, self.request.order, self.request.clip_cap_pct, rank))
        whole = ((tuple(k), self.table, j) for j, k in enumerate(keys.tolist()))
        for _, table, row in heapq.merge(whole, *self.lazy, key=lambda entry: entry[0]):
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
        arrangement = table.trackers(row)
        checks: tuple[Check, ...] = ()
        confirm: tuple[Confirm, ...] = ()
        coldest = hottest = None
        outcome = Verdict.TO_CONFIRM if table.to_confirm[row] else Verdict.FITS
        if full:
            checks = tuple(check_option(self.pair(m, i), arrangement))
            confirm = tuple(to_confirm(checks))
            assert verdict(checks) is outcome, f"{arrangement}: the search and the checks disagree"
            window = self._window(m)
            coldest = window.coldest(self.inverters[i], max(t.in_series for t in arrangement))
            hottest = window.hottest(self.inverters[i], min(t.in_series for t in arrangement))
        return Option(
            rank, outcome, m, i, int(table.modules[row]), arrangement, float(table.ratio[row]),
            _number(table.clipping_pct[row]), _number(table.current_clipping_pct[row]),
            _number(table.yearly_kwh[row]), checks, confirm, coldest, hottest,
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
            reason = self.points.reasons[m]
            if reason is not None:
                missed.append((int(k), Rejection((), f"cannot be matched: {reason}", np.inf)))
                continue
            limits = self.search.limits(np.array([m]), np.array([i]))
            space = self.search.space(m, i, limits)
            missed.append((int(k), rejection(self.pair(m, i), space, self._window(m), self.request.ratio)))
        return sorted(missed, key=lambda entry: entry[1].distance)

    @cached_property
    def _windows(self) -> dict[int, ClimateWindow]:
        return {}

    def _window(self, m: int) -> ClimateWindow:
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

    Raises
    ------
    MatcherError
        Where the one module that was named cannot be matched at all, with the value that is missing; or
        where ``every`` asks for more options than can be listed at once.
    """
    points = design_points(modules, request.site, request.rules)
    if len(modules) == 1 and points.reasons[0] is not None:
        raise MatcherError(f"{modules[0].name} cannot be matched: {points.reasons[0]}")
    search = _Search(tuple(modules), InverterColumns.of(inverters), request, points, year)
    lists_inverters = len(modules) == 1
    table, found, arrangements = search.single_trackers()
    parts, lazy = [table], []
    for m in range(len(modules)):
        for i in np.flatnonzero(~search.inverters.single):
            space, whole, iterator = search.several_trackers(m, int(i))
            arrangements += space.total
            if space.total:
                found[int(i) if lists_inverters else m] = True
            if whole is not None:
                parts.append(whole)
            if iterator is not None:
                lazy.append(iterator)
    table = join(parts)
    rank = search.name_rank[table.module, table.inverter]
    table = table.take(ranked(table, request.order, request.clip_cap_pct, rank))
    if not request.every:
        table = _first_of_each(table, lists_inverters)
    totals = Totals(len(inverters) if lists_inverters else len(modules), int(found.sum()), arrangements)
    return Fit(tuple(modules), tuple(inverters), request, points, year, totals, lists_inverters, found, table, lazy, search)


class _Search:
    """Records, request and design values of one search, and the two ways of going through pairs."""

    def __init__(
        self,
        modules: tuple[Module, ...],
        inverters: InverterColumns,
        request: Request,
        points: Points,
        year: ModuleYear | None,
    ) -> None:
        self.modules, self.inverters, self.request = modules, inverters, request
        self.points, self.year = points, year
        self.system_voltage_v = column(modules, "max_system_voltage_v")
        self.lists_inverters = len(modules) == 1

    @cached_property
    def name_rank(self) -> np.ndarray:
        return _name_rank(self.modules, self.inverters.records)

    def limits(self, module: np.ndarray, inverter: np.ndarray) -> PairLimits:
        r = self.request
        return pair_limits(
            self.points, self.inverters, module, inverter, self.system_voltage_v, r.site, r.rules, r.ratio, r.counts
        )

    def single_trackers(self) -> tuple[Options, np.ndarray, int]:
        """Options of all pairs with one tracker, which listed records have one, and how many there are."""
        singles = np.flatnonzero(self.inverters.single)
        module = np.repeat(np.arange(len(self.modules)), len(singles))
        inverter = np.tile(singles, len(self.modules))
        limits = self.limits(module, inverter)
        strings = at_most(self.inverters.max_isc_a[inverter], self.points.isc_design_a[module])
        if not self.request.combiner:
            strings = np.minimum(strings, at_most(self.inverters.strings_per_tracker[inverter], np.ones(len(inverter))))
        expansion = expand(limits, strings)
        found = np.zeros(len(self.inverters.records) if self.lists_inverters else len(self.modules), dtype=bool)
        found[(inverter if self.lists_inverters else module)[expansion.sizes > 0]] = True
        total = int(expansion.sizes.sum())
        if self.request.every and total > MOST_AT_ONCE:
            raise MatcherError(
                f"{total:,} arrangements are too many to list at once; narrow the ratio window or the module count"
            )
        parts = [
            self._single_part(module, inverter, limits, expansion.part(first, last))
            for first, last in expansion.parts(PART)
        ]
        return join(parts), found, total

    def _single_part(
        self, module: np.ndarray, inverter: np.ndarray, limits: PairLimits, part: tuple[np.ndarray, ...]
    ) -> Options:
        pair, strings, in_series = part
        m, i = module[pair], inverter[pair]
        unsure = (in_series < limits.sure_from[pair]) | (in_series > limits.sure_to[pair])
        unsure |= np.isnan(self.inverters.max_isc_a[i])
        losses = self._single_losses(m, i, strings, in_series)
        options = build(
            m.astype(np.int32), i.astype(np.int32), unsure,
            strings[:, None].astype(np.int32), in_series[:, None].astype(np.int32),
            np.zeros((len(m), 1), dtype=np.int16),
            pmax_w=self.points.pmax_w[m], ac_power_w=self.inverters.ac_power_w[i],
            voc_cold_v=self.points.voc_cold_v[m], voltage_limit_v=limits.voltage_limit_v[pair], losses=losses,
        )  # fmt: skip
        if self.request.every:
            return options
        rank = self.name_rank[options.module, options.inverter]
        options = options.take(ranked(options, self.request.order, self.request.clip_cap_pct, rank))
        return _first_of_each(options, self.lists_inverters)

    def _single_losses(self, m: np.ndarray, i: np.ndarray, strings: np.ndarray, in_series: np.ndarray) -> Losses:
        if self.year is None:
            return Losses.unknown(len(m))
        several = self.year.power_w.ndim == 2
        return single_losses(self.year, self.inverters, i, strings, in_series, m if several else None)

    def _year_of(self, m: int) -> ModuleYear | None:
        if self.year is None or self.year.power_w.ndim == 1:
            return self.year
        hours = self.year.hours
        return ModuleYear(self.year.power_w[m], self.year.vmp_v[m], hours[m] if hours.ndim == 2 else hours)

    def several_trackers(
        self, m: int, i: int
    ) -> tuple[Space, Options | None, Iterator[tuple[tuple[float, ...], Options, int]] | None]:
        """Space of one pair, its options where they are few, else an iterator over them in order."""
        limits = self.limits(np.array([m]), np.array([i]))
        space = self.space(m, i, limits)
        if not space.total:
            return space, None, None
        year = self._year_of(m)
        record = self.inverters.records[i]
        slots = np.repeat(np.arange(len(record.inputs)), [g.trackers for g in record.inputs])
        currents = column(record.inputs, "max_current_a")[slots]

        def table_of(block: np.ndarray, unsure: bool) -> Options:
            k = len(block)
            losses = Losses.unknown(k) if year is None else block_losses(year, self.inverters, i, currents, block)
            return build(
                np.full(k, m, dtype=np.int32), np.full(k, i, dtype=np.int32), np.full(k, unsure),
                block[:, :, 0].astype(np.int32), block[:, :, 1].astype(np.int32),
                np.broadcast_to(slots.astype(np.int16), block.shape[:2]),
                pmax_w=self.points.pmax_w[m], ac_power_w=self.inverters.ac_power_w[i],
                voc_cold_v=self.points.voc_cold_v[m], voltage_limit_v=limits.voltage_limit_v[0], losses=losses,
            )  # fmt: skip

        if space.total <= (WHOLE_EVERY if self.request.every else WHOLE):
            accepted = np.arange(space.most + 1) >= space.fewest
            parts = [
                table_of(np.concatenate(blocks), unsure)
                for unsure in (False, True)
                if (blocks := list(space.listing(accepted, unsure)))
            ]
            return space, join(parts), None

        def rows_of(block: np.ndarray, unsure: bool) -> tuple[Options, np.ndarray]:
            options = table_of(block, unsure)
            rank = np.full(len(block), self.name_rank[m, i])
            return options, np.column_stack(sort_keys(options, self.request.order, self.request.clip_cap_pct, rank))

        def bounds(counts: np.ndarray, longest: int) -> dict[str, np.ndarray]:
            volts = longest * self.points.voc_cold_v[m]
            limit = limits.voltage_limit_v[0]
            lengths = np.arange(space.shortest, min(space.longest, space.most) + 1)
            clipping, kwh = count_bounds(year, self.inverters, i, counts, lengths)
            return {
                "ratio": counts * self.points.pmax_w[m] / self.inverters.ac_power_w[i],
                "clipping_pct": clipping,
                "yearly_kwh": kwh,
                "margin_pct": np.full(len(counts), (limit - volts) / limit * 100.0),
            }

        iterator = best_first(space, self.request.order, self.request.clip_cap_pct, bounds, rows_of)
        if self.request.every:
            return space, None, iterator
        _, options, row = next(iterator)
        return space, options.take(slice(row, row + 1)), None

    def space(self, m: int, i: int, limits: PairLimits) -> Space:
        """All arrangements of a module on an inverter of several trackers."""
        groups = []
        for g in self.inverters.records[i].inputs:
            strings = at_most(np.array([np.nan if g.max_isc_a is None else g.max_isc_a]), self.points.isc_design_a[m])[0]
            if g.strings_per_tracker is not None and not self.request.combiner:
                strings = min(strings, g.strings_per_tracker)
            groups.append(Group(g.trackers, int(strings), g.max_isc_a is None))
        shortest, longest, sure_from, sure_to, fewest, most = (
            int(a[0])
            for a in (limits.shortest, limits.longest, limits.sure_from, limits.sure_to, limits.fewest, limits.most)
        )
        # No more modules than the trackers hold; keeps the tables of counts short.
        held = sum(g.trackers * g.max_strings for g in groups) * max(longest, 0)
        return Space(tuple(groups), shortest, longest, sure_from, sure_to, fewest, max(0, min(most, held)))


def _first_of_each(table: Options, lists_inverters: bool) -> Options:
    """Of options in order, the first of each listed record, still in order."""
    record = table.inverter if lists_inverters else table.module
    _, first = np.unique(record, return_index=True)
    return table.take(np.sort(first))


def _name_rank(modules: Sequence[Module], inverters: Sequence[Inverter]) -> np.ndarray:
    """Rank of each pair by maker and model, inverter first, shape (modules, inverters)."""

    def ranks(records: Sequence[Module] | Sequence[Inverter]) -> np.ndarray:
        order = sorted(range(len(records)), key=lambda k: (records[k].maker, records[k].model))
        rank = np.empty(len(records), dtype=np.int64)
        rank[order] = np.arange(len(records))
        return rank

    return ranks(inverters)[None, :] * len(modules) + ranks(modules)[:, None]


def _number(value: float) -> float | None:
    return None if np.isnan(value) else float(value)
