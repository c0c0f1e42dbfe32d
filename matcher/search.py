"""Going through pairs of a module and an inverter, and making tables of options of them.

Pairs whose inverter has one tracker are all worked out together as arrays. An inverter with several trackers
is worked out whole while its arrangements are few, and best first (`matcher.bestfirst`) where they are many.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from catalog.records import Inverter, Module
from matcher.arrangements import Space
from matcher.choices import FACE, ByStrings, Group
from matcher.bestfirst import SORTED_AT_ONCE, Key, best_first
from matcher.clipping import Losses, block_losses, count_bounds
from matcher.columns import InverterColumns, column
from matcher.electrical import Points
from matcher.errors import MatcherError
from matcher.limits import PairLimits, at_most, pair_limits
from matcher.moduleyear import ModuleYear
from matcher.options import Options, build, join
from matcher.order import ranked, sort_keys
from matcher.request import Request
from matcher.shelf import Shelf
from matcher.shortlist import Heads
from matcher.singlepairs import SinglePairs
from matcher.singles import expand

#: An inverter of several trackers with no more arrangements than this is worked out whole.
WHOLE = 2_000
WHOLE_EVERY = 50_000

#: Options that can be sorted at once.
MOST_AT_ONCE = 5_000_000

#: Options in order: sort key, table, row of the table.
Lazy = Iterator[tuple[Key, Options, int]]


@dataclass(eq=False)
class Search:
    """Records, request and design values of one search, and what is made of its pairs."""

    modules: tuple[Module, ...]
    inverters: InverterColumns
    request: Request
    points: Points
    year: ModuleYear | None
    shelf: Shelf | None = None

    @cached_property
    def system_voltage_v(self) -> np.ndarray:
        """Maximum system voltage of each module [V], NaN where not stated."""
        return column(self.modules, "max_system_voltage_v")

    @cached_property
    def name_rank(self) -> np.ndarray:
        """Rank of each pair by maker and model, inverter first, shape (modules, inverters)."""
        return _ranks(self.inverters.records)[None, :] * len(self.modules) + _ranks(self.modules)[:, None]

    def limits(self, module: np.ndarray, inverter: np.ndarray) -> PairLimits:
        """Bounds of pairs, for one unit with the module counts and ratios that the request asks for."""
        r = self.request
        limits = pair_limits(
            self.points, self.inverters, module, inverter, self.system_voltage_v, r.site, r.rules, r.ratio, r.counts
        )
        if self.shelf is None:
            return limits
        return replace(limits, most=np.minimum(limits.most, self.shelf.modules_at_most[module]))

    def asked(self, m: int, i: int) -> Request:
        """What the request asks of one pair, no more than can be had."""
        return self.request if self.shelf is None else self.shelf.bounded(self.request, m, i)

    def cost(self, options: Options) -> np.ndarray:
        """Cost of modules and inverters of each option, (n,); NaN where it is not known."""
        if self.shelf is None:
            return np.full(len(options), np.nan)
        return self.shelf.cost(options.module, options.inverter, options.modules, options.units)

    def rank(self, options: Options) -> np.ndarray:
        """Positions of the options in the order of the request."""
        rank = self.name_rank[options.module, options.inverter]
        return ranked(options, self.request.order, self.request.clip_cap_pct, rank, self.cost(options))

    def keys(self, options: Options) -> np.ndarray:
        """Sort keys of the options, shape (n, keys)."""
        rank = self.name_rank[options.module, options.inverter]
        return np.column_stack(
            sort_keys(options, self.request.order, self.request.clip_cap_pct, rank, self.cost(options))
        )

    def max_strings(self, module: np.ndarray, inverter: np.ndarray) -> np.ndarray:
        """Strings that the first tracker of each inverter takes at most."""
        strings = at_most(self.inverters.max_isc_a[inverter], self.points.isc_design_a[module])
        if self.request.combiner:
            return strings
        stated = at_most(self.inverters.strings_per_tracker[inverter], np.ones(len(inverter)))
        return np.minimum(strings, stated)

    def single_trackers(
        self, module: np.ndarray, inverter: np.ndarray, limits: PairLimits, every: bool
    ) -> tuple[Options, np.ndarray, np.ndarray]:
        """Options of pairs whose inverter has one tracker: all, or the best of each pair.

        Returns
        -------
        Options, the pair of each (n,), and the exact number of arrangements of each pair (pairs,).

        Raises
        ------
        MatcherError
            Where all are asked for and there are more than can be sorted at once.
        """
        lines = expand(limits, self.max_strings(module, inverter))
        total = int(lines.sizes.sum())
        if every and total > MOST_AT_ONCE:
            raise MatcherError(
                f"{total:,} arrangements are too many to list at once; narrow the ratio window or the module count"
            )
        pairs = SinglePairs(self, module, inverter, limits)
        options, pair = pairs.every(lines) if every else pairs.bests(lines)
        return options, pair, lines.sizes

    def space(self, m: int, i: int, limits: PairLimits | None = None) -> Space:
        """All arrangements of one pair inside the limits, which are the request's where none are given."""
        if limits is None:
            limits = self.limits(np.array([m]), np.array([i]))
        groups = []
        for g in self.inverters.records[i].inputs:
            limit = np.array([np.nan if g.max_isc_a is None else g.max_isc_a])
            strings = int(at_most(limit, self.points.isc_design_a[m : m + 1])[0])
            if g.strings_per_tracker is not None and not self.request.combiner:
                strings = min(strings, g.strings_per_tracker)
            groups.append(Group(g.trackers, strings, g.max_isc_a is None))
        shortest, longest, sure_from, sure_to, fewest, most = (
            int(a[0])
            for a in (limits.shortest, limits.longest, limits.sure_from, limits.sure_to, limits.fewest, limits.most)
        )
        # No more modules than the trackers hold; keeps the tables of counts short.
        held = sum(g.trackers * g.max_strings for g in groups) * max(longest, 0)
        return Space(tuple(groups), shortest, longest, sure_from, sure_to, fewest, max(0, min(most, held)))

    def table(self, m: int, i: int, block: np.ndarray, unsure: bool | np.ndarray) -> Options:
        """Options of a block of arrangements (k, trackers, 2) of one pair."""
        k = len(block)
        face, in_series = np.divmod(block[:, :, 1], FACE)
        block = np.stack([block[:, :, 0], in_series], axis=-1)
        inputs = self.inverters.records[i].inputs
        slots = np.repeat(np.arange(len(inputs)), [g.trackers for g in inputs])
        year = self.year_of(m)
        currents = column(inputs, "max_current_a")[slots]
        if year is None:
            losses = Losses.unknown(k)
        else:
            losses = block_losses(year, self.inverters, i, currents, block, face - 1 if self.request.faces else None)
        limit = self.limits(np.array([m]), np.array([i])).voltage_limit_v[0]
        return build(
            np.full(k, m, dtype=np.int32), np.full(k, i, dtype=np.int32), np.broadcast_to(unsure, k).copy(),
            block[:, :, 0].astype(np.int32), block[:, :, 1].astype(np.int32),
            np.broadcast_to(slots.astype(np.int16), block.shape[:2]),
            pmax_w=self.points.pmax_w[m], ac_power_w=self.inverters.ac_power_w[i],
            voc_cold_v=self.points.voc_cold_v[m], voltage_limit_v=limit, losses=losses, face=face.astype(np.int16),
        )  # fmt: skip

    def year_of(self, m: int) -> ModuleYear | None:
        """The year of one module, or of all its faces; ``None`` where there is none."""
        if self.year is None or self.year.power_w.ndim == 1 or self.request.faces:
            return self.year
        if np.isnan(self.year.power_w[m]).all():
            # No model of its power: bounds on losses must say unknown too, or all options are worked out.
            return None
        hours = self.year.hours
        return replace(
            self.year, power_w=self.year.power_w[m], vmp_v=self.year.vmp_v[m], hours=hours[m] if hours.ndim == 2 else hours
        )

    def heads(self, module: np.ndarray) -> tuple[Heads, np.ndarray] | None:
        """Sums of the years of some modules (n,), and the line of each; ``None`` where no clipping can be known."""
        year = self.year
        if year is None or not year.shows_clipping or not len(module):
            return None
        at = np.zeros(len(module), dtype=np.int64)
        if year.power_w.ndim == 2:
            several, at = np.unique(module, return_inverse=True)
            hours = year.hours[several] if year.hours.ndim == 2 else year.hours
            year = replace(year, power_w=year.power_w[several], vmp_v=year.vmp_v[several], hours=hours)
        return Heads.of(year, self.request.clip_cap_pct), at

    def whole(self, m: int, i: int, space: Space) -> Options | None:
        """All options of a space; ``None`` where it is empty."""
        accepted = np.arange(space.most + 1) >= space.fewest
        parts = [
            self.table(m, i, np.concatenate(blocks), unsure)
            for unsure in (False, True)
            if (blocks := list(space.listing(accepted, unsure)))
        ]
        return join(parts) if parts else None

    def in_order(self, m: int, i: int, space: Space) -> Lazy:
        """Options of a space in order, one by one, without listing them all."""
        limit = self.limits(np.array([m]), np.array([i])).voltage_limit_v[0]
        lengths = np.arange(space.shortest, min(space.longest, space.most) + 1)
        year = self.year_of(m)

        def rows_of(block: np.ndarray, unsure: bool) -> tuple[Options, np.ndarray]:
            options = self.table(m, i, block, unsure)
            return options, self.keys(options)

        def bounds(counts: np.ndarray, longest: int) -> dict[str, np.ndarray]:
            volts = longest * self.points.voc_cold_v[m]
            clipping, kwh = count_bounds(year, self.inverters, i, counts, lengths)
            return {
                "ratio": counts * self.points.pmax_w[m] / self.inverters.ac_power_w[i],
                "clipping_pct": clipping,
                "yearly_kwh": kwh,
                "margin_pct": np.full(len(counts), (limit - volts) / limit * 100.0),
                "cost": self._cost_of_counts(m, i, counts),
            }

        return best_first(space, self.request.order, self.request.clip_cap_pct, bounds, rows_of)

    def _cost_of_counts(self, m: int, i: int, counts: np.ndarray) -> np.ndarray:
        """Cost of one unit with each number of modules, (c,)."""
        if self.shelf is None:
            return np.full(len(counts), np.nan)
        one = np.ones(len(counts), dtype=np.int64)
        return self.shelf.cost(m * one, i * one, counts, one)

    def best(self, m: int, i: int, space: Space) -> Options | None:
        """The first option of a space in the order of the request; ``None`` where it is empty."""
        if not space.total:
            return None
        if space.total <= WHOLE:
            options = self.whole(m, i, space)
            assert options is not None
            return options.take(self.rank(options)[:1])
        _, options, row = next(self.in_order(m, i, space))
        return options.take(slice(row, row + 1))

    def best_of_count(
        self, m: int, i: int, space: Space, modules: int, lengths: tuple[int, ...] | None = None
    ) -> Options:
        """The first option with exactly ``modules`` modules, which the space can reach.

        With some string lengths given, the first of those that have these.
        """
        if lengths is not None:
            unsure = not space.size(modules, False)
            return self.table(m, i, next(space.of_lengths(modules, unsure, lengths))[:1], unsure)
        found = self.best(m, i, replace(space, fewest=modules, most=modules))
        assert found is not None, f"{modules} modules are not reachable"
        return found

    def hosting(self, m: int, i: int, space: Space, tally: ByStrings, state: int) -> Iterator[Options]:
        """Options that host exactly the strings of one state of a tally, in tables."""
        accepted = np.zeros(tally.states, dtype=bool)
        accepted[state] = True
        held: list[Options] = []
        for unsure in (False, True):
            for block in space.listing(accepted, unsure, tally=tally):
                held.append(self.table(m, i, block, unsure))
                if sum(len(t) for t in held) >= SORTED_AT_ONCE:
                    yield join(held)
                    held = []
        if held:
            yield join(held)


def _ranks(records: Sequence[Module] | Sequence[Inverter]) -> np.ndarray:
    order = sorted(range(len(records)), key=lambda k: (records[k].maker, records[k].model))
    rank = np.empty(len(records), dtype=np.int64)
    rank[order] = np.arange(len(records))
    return rank
