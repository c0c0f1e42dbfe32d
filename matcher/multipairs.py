"""The best option of many pairs whose inverter has several trackers.

In the order of least inverter the best option of a pair is the largest array that clips no more than the cap,
and of the arrangements of one module count the one with the fewest string lengths. So arrangements need not be
listed: the module counts near the cap are found by estimates (`matcher.shortlist`), the foremost arrangement of
each is worked out, all pairs at once, and a count is gone through whole only where its foremost arrangement
clips too much and another one might not. Modules with the same string lengths share counts and arrangements.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from itertools import accumulate
from typing import TYPE_CHECKING

import numpy as np

from matcher.arrangements import Space, listing_key
from matcher.choices import Group
from matcher.clipping import Losses, has_model, pair_losses
from matcher.columns import column
from matcher.limits import at_most
from matcher.options import Options, build
from matcher.order import Order, phase
from matcher.shortlist import Estimates, margin
from matcher.singlelosses import single_losses

if TYPE_CHECKING:
    from catalog.records import Inputs
    from matcher.limits import PairLimits
    from matcher.search import Search

#: Pairs gone through at once: bounds memory.
_PART = 2_000

#: By how much unlike strings together may clip less than the mean of them alone, as a share of the difference
#: between these (measured on the CEC table: no more than 0.03).
_MIXING = 0.05

#: Arrangements of one module count that are all worked out; and how many string lengths those have of a count
#: with more of them.
_LISTED = 2_000
_MOST_LENGTHS = 3


@dataclass(eq=False)
class _Lengths:
    """What modules with the same string lengths on like trackers share: counts, and foremost arrangements."""

    space: Space
    _first: dict[tuple[int, bool], np.ndarray] = field(default_factory=dict)

    def __post_init__(self) -> None:
        ways, sure = self.space.ways, self.space.sure_ways
        self._before = [0, *accumulate(ways)]
        self._counts = {
            False: [m for m, w in enumerate(sure) if w],
            True: [m for m, (w, s) in enumerate(zip(ways, sure, strict=True)) if w > s],
        }

    def total(self, fewest: int, most: int) -> int:
        """Exact number of arrangements with so many modules."""
        most = min(most, self.space.most)
        return self._before[most + 1] - self._before[fewest] if fewest <= most else 0

    def counts(self, to_confirm: bool, fewest: int, most: int) -> list[int]:
        """Module counts in a range that arrangements of a verdict have, ascending."""
        counts = self._counts[to_confirm]
        return counts[bisect_left(counts, fewest) : bisect_right(counts, most)]

    def foremost(self, modules: int, to_confirm: bool) -> np.ndarray:
        """See `Space.foremost`."""
        if (modules, to_confirm) not in self._first:
            self._first[modules, to_confirm] = self.space.foremost(modules, to_confirm)
        return self._first[modules, to_confirm]


@dataclass(frozen=True, slots=True)
class _Asked:
    """A module count of a pair, of one verdict."""

    pair: int
    modules: int
    to_confirm: bool


@dataclass(frozen=True, slots=True, eq=False)
class _NearCap:
    """Module counts of pairs that surely, and perhaps, clip no more than the cap; arrays (pairs,).

    ``known``: whether there is a clipping figure; ``wild``: whether it cannot be estimated. The estimates are
    those at the shortest and the longest string.
    """

    surely: np.ndarray
    perhaps: np.ndarray
    known: np.ndarray
    wild: np.ndarray
    estimates: tuple[Estimates, Estimates]

    def agrees(self, table: Options, asked: list[_Asked]) -> np.ndarray:
        """Whether the loss by the power limit of each row is as estimated, or cannot be known."""
        of = np.array([a.pair for a in asked])
        one, other = (e.loss_pct(of, table.modules) for e in self.estimates)
        power = table.clipping_pct - table.current_clipping_pct
        low, high = np.minimum(one, other), np.maximum(one, other)
        with np.errstate(invalid="ignore"):
            outside = (power < low - margin(low) / 2) | (power > high + margin(high) / 2)
        return ~outside | ~self.known[of]


class MultiPairs:
    """Pairs ``(module[j], inverter[j])`` of a search, each inverter with several trackers; arrays (pairs,)."""

    def __init__(self, search: Search, module: np.ndarray, inverter: np.ndarray) -> None:
        self._search, self._module, self._inverter = search, module, inverter
        self._shared: dict[tuple, _Lengths] = {}

    def bests(self) -> tuple[list[Options], list[int]]:
        """The best option of each pair that has one, in tables, and the exact number of arrangements of each pair."""
        tables: list[Options] = []
        sizes: list[int] = []
        for first in range(0, len(self._module), _PART):
            part = slice(first, first + _PART)
            m, i = self._module[part], self._inverter[part]
            limits = self._search.limits(m, i)
            lengths = self._lengths(m, i, limits)
            some = [
                0 if known is None else known.total(int(fewest), int(most))
                for known, fewest, most in zip(lengths, limits.fewest, limits.most, strict=True)
            ]
            sizes += some
            tables += self._bests(m, i, limits, lengths, np.flatnonzero(np.array(some, dtype=object) > 0))
        return tables, sizes

    def _lengths(self, m: np.ndarray, i: np.ndarray, limits: PairLimits) -> list[_Lengths | None]:
        """Of each pair; ``None`` where no string goes."""
        strings: list[list[int]] = [[] for _ in m]
        groups: dict[int, list[int]] = {}
        for j, row in enumerate(i.tolist()):
            groups.setdefault(row, []).append(j)
        search = self._search
        for row, pairs in groups.items():
            isc = search.points.isc_design_a[m[pairs]]
            for g in search.inverters.records[row].inputs:
                most = at_most(np.full(len(pairs), np.nan if g.max_isc_a is None else g.max_isc_a), isc)
                if g.strings_per_tracker is not None and not search.request.combiner:
                    most = np.minimum(most, g.strings_per_tracker)
                for j, s in zip(pairs, most.tolist(), strict=True):
                    strings[j].append(s)
        keys: list[tuple | None] = []
        held: dict[tuple, int] = {}
        bounds = (limits.shortest, limits.longest, limits.sure_from, limits.sure_to, limits.fewest, limits.most)
        for row, several, shortest, longest, sure_from, sure_to, fewest, most in zip(
            i.tolist(), strings, *(b.tolist() for b in bounds), strict=True
        ):
            if longest < shortest or most < max(fewest, shortest):
                keys.append(None)
                continue
            inputs = search.inverters.records[row].inputs
            like = tuple(
                Group(g.trackers, min(s, most // shortest), g.max_isc_a is None) for g, s in zip(inputs, several, strict=True)
            )
            longest = min(longest, most)
            key = (like, shortest, longest, sure_from, min(sure_to, longest))
            most = min(most, sum(g.trackers * g.max_strings for g in like) * longest)
            held[key] = max(held.get(key, 0), most)
            keys.append(key)
        for key, most in held.items():
            known = self._shared.get(key)
            if known is None or known.space.most < most:
                self._shared[key] = _Lengths(Space(*key, fewest=1, most=most))
        return [None if key is None else self._shared[key] for key in keys]

    def _bests(
        self, m: np.ndarray, i: np.ndarray, limits: PairLimits, lengths: list[_Lengths | None], pairs: np.ndarray
    ) -> list[Options]:
        """The best options of those pairs that have any, in tables."""
        order = self._search.request.order
        if order not in (Order.LEAST_INVERTER, Order.RATIO):
            return [self._searched(m, i, j) for j in pairs.tolist()]
        near = self._near_cap(m[pairs], i[pairs], limits, pairs) if order is Order.LEAST_INVERTER else None
        asked: list[_Asked] = []
        slow: list[int] = []
        counts_of: dict[int, list[int]] = {}
        for k, j in enumerate(pairs.tolist()):
            known = lengths[j]
            assert known is not None
            fewest, most = int(limits.fewest[j]), int(limits.most[j])
            to_confirm = not known.counts(False, fewest, most)
            if near is None or not near.known[k]:
                asked.append(_Asked(k, known.counts(to_confirm, fewest, most)[-1], to_confirm))
                continue
            counts = known.counts(to_confirm, fewest, min(int(near.perhaps[k]), most))[::-1]
            if near.wild[k] or not counts:
                slow.append(j)
                continue
            # From the largest that may clip no more than the cap to the first that surely does not.
            counts_of[k] = counts
            last = next((n for n, count in enumerate(counts) if count <= near.surely[k]), len(counts) - 1)
            asked += [_Asked(k, count, to_confirm) for count in counts[: last + 1]]
        if not asked:
            return [self._searched(m, i, j) for j in slow]
        table = self._foremost(m, i, limits, lengths, pairs, asked)
        if near is None:
            return [table]
        rows, open_, wrong = self._decided(table, near, asked)
        found = [table.take(rows)] if rows else []
        for k, (first, to_confirm) in open_.items():
            j, counts = int(pairs[k]), counts_of[k]
            best = self._of_counts(int(m[j]), int(i[j]), lengths[j], counts[counts.index(first) :], to_confirm)
            if best is None:
                slow.append(j)
            else:
                found.append(best)
        return found + [self._searched(m, i, j) for j in slow + pairs[wrong].tolist()]

    def _near_cap(self, m: np.ndarray, i: np.ndarray, limits: PairLimits, pairs: np.ndarray) -> _NearCap | None:
        """Module counts near the cap; ``None`` where no clipping can be known."""
        search, found = self._search, self._search.heads(m)
        if found is None:
            return None
        heads, at = found
        known = has_model(search.inverters)[i] & (heads.highest_w[at] > 0)
        fewest, most = limits.fewest[pairs], limits.most[pairs]
        by_length = []
        for in_series in (limits.shortest[pairs], np.minimum(limits.longest[pairs], most)):
            estimates = Estimates.of(heads, search.inverters, at, i, in_series, most)
            by_length.append(replace(estimates, step=np.ones(len(m), dtype=np.int64)))
        near = [e.near(search.request.clip_cap_pct, fewest, most) for e in by_length]
        wild = by_length[0].wild | by_length[1].wild
        return _NearCap(
            np.minimum(near[0][0], near[1][0]), np.maximum(near[0][1], near[1][1]), known, wild, (by_length[0], by_length[1])
        )

    def _foremost(
        self, m: np.ndarray, i: np.ndarray, limits: PairLimits, lengths: list[_Lengths | None], pairs: np.ndarray,
        asked: list[_Asked],
    ) -> Options:  # fmt: skip
        """The foremost arrangement of each pair and module count asked for."""
        search = self._search
        of = pairs[[a.pair for a in asked]]
        slots = {row: _slots(search.inverters.records[row].inputs) for row in np.unique(i[of]).tolist()}
        width = max(len(s) for s in slots.values())
        strings, in_series, inputs = (np.zeros((len(asked), width), dtype=np.int64) for _ in range(3))
        amps = np.full((len(asked), width), np.nan)
        for k, (a, j) in enumerate(zip(asked, of.tolist(), strict=True)):
            known, slot = lengths[j], slots[int(i[j])]
            assert known is not None
            strings[k, : len(slot)], in_series[k, : len(slot)] = known.foremost(a.modules, a.to_confirm).T
            inputs[k, : len(slot)] = slot
            amps[k, : len(slot)] = column(search.inverters.records[int(i[j])].inputs, "max_current_a")[slot]
        m, i = m[of], i[of]
        if search.year is None:
            losses = Losses.unknown(len(asked))
        else:
            several = search.year.power_w.ndim == 2
            line = m if several else np.zeros(len(m), dtype=np.int64)
            losses = pair_losses(search.year, search.inverters, line, i, amps, strings, in_series)
        return build(
            m.astype(np.int32), i.astype(np.int32), np.array([a.to_confirm for a in asked]),
            strings.astype(np.int32), in_series.astype(np.int32), inputs.astype(np.int16),
            pmax_w=search.points.pmax_w[m], ac_power_w=search.inverters.ac_power_w[i],
            voc_cold_v=search.points.voc_cold_v[m], voltage_limit_v=limits.voltage_limit_v[of], losses=losses,
        )  # fmt: skip

    def _decided(
        self, table: Options, near: _NearCap, asked: list[_Asked]
    ) -> tuple[list[int], dict[int, tuple[int, bool]], list[int]]:
        """Rows that are the best of their pairs, pairs still open, and pairs whose estimate is no good.

        An open pair comes with the largest count that may hold its best option, and the verdict.
        """
        cap = self._search.request.clip_cap_pct
        within, right = phase(table.clipping_pct, cap) < 2, near.agrees(table, asked)
        perhaps = np.zeros(len(asked), dtype=bool)
        out = np.flatnonzero(~within)
        perhaps[out] = self._least(table, out) <= cap
        rows: list[int] = []
        open_: dict[int, tuple[int, bool]] = {}
        wrong: list[int] = []
        done: set[int] = set()
        last = {a.pair: row for row, a in enumerate(asked)}
        for row, a in enumerate(asked):
            if a.pair in done:
                continue
            if not right[row]:
                wrong.append(a.pair)
            elif within[row]:
                rows.append(row)
            elif perhaps[row] or row == last[a.pair]:
                open_[a.pair] = (a.modules, a.to_confirm)
            else:
                continue
            done.add(a.pair)
        return rows, open_, wrong

    def _least(self, table: Options, rows: np.ndarray) -> np.ndarray:
        """Least clipping loss by the power limit [%] that the modules of some rows can have in any strings."""
        if not len(rows):
            return np.empty(0)
        m, i = table.module[rows].astype(np.int64), table.inverter[rows].astype(np.int64)
        limits = self._search.limits(m, i)
        several = np.minimum(limits.longest, table.modules[rows]) - limits.shortest + 1
        of = np.repeat(np.arange(len(rows)), several)
        in_series = limits.shortest[of] + np.arange(len(of)) - np.repeat(np.cumsum(several) - several, several)
        alone = self._alone(m[of], i[of], table.modules[rows][of], in_series)
        least, most = (f.reduceat(alone, np.cumsum(several) - several) for f in (np.minimum, np.maximum))
        return least - _MIXING * (most - least)

    def _alone(self, m: np.ndarray, i: np.ndarray, modules: np.ndarray, in_series: np.ndarray) -> np.ndarray:
        """Clipping loss by the power limit [%] of so many modules, all in strings of one length; arrays (n,)."""
        year, inverters = self._search.year, self._search.inverters
        assert year is not None
        free = replace(inverters, max_current_a=np.full(len(inverters.records), np.nan))
        line = m if year.power_w.ndim == 2 else None
        return single_losses(year, free, i, modules / in_series, in_series, line).power_pct

    def _of_counts(self, m: int, i: int, known: _Lengths, counts: list[int], to_confirm: bool) -> Options | None:
        """The best option of a pair that has one of these counts, the first first, and clips within the cap.

        Of a count with more than `_LISTED` arrangements, those of more than `_MOST_LENGTHS` lengths are left out.
        """
        search, space = self._search, known.space
        cap = search.request.clip_cap_pct
        lengths = np.arange(space.shortest, space.longest + 1)
        held = self._held(m, i, space)
        for modules in counts:
            one = np.ones(len(lengths), dtype=np.int64)
            alone = self._alone(m * one, i * one, modules * one, lengths)

            def too_much(some: np.ndarray, modules: int = modules, alone: np.ndarray = alone) -> bool:
                costs = [np.broadcast_to(alone[some], (g.max_strings, len(some))) for g in space.groups]
                names = lengths[some].tolist()
                slack = _MIXING * float(np.ptp(alone[some]))
                return space.least_mean(modules, to_confirm, names, costs) - slack > cap or bool(held) and (
                    space.least_mean(modules, to_confirm, names, [h[:, some] for h in held]) > cap
                )

            if too_much(np.arange(len(lengths))):
                continue
            if space.size(modules, to_confirm) <= _LISTED:
                best = search.best_of_count(m, i, replace(space, fewest=1), modules)
                if phase(best.clipping_pct, cap)[0] < 2:
                    return best
                continue
            for sets in space.sets_of_lengths(modules, to_confirm, _MOST_LENGTHS):
                found = [
                    option
                    for some in sets
                    if not too_much(np.array(some) - space.shortest)
                    and (option := self._first_within(m, i, space.of_lengths(modules, to_confirm, some), to_confirm))
                ]
                if found:
                    return min(found, key=lambda o: listing_key(np.column_stack([o.strings[0], o.in_series[0]])))
        return None

    def _held(self, m: int, i: int, space: Space) -> list[np.ndarray]:
        """Energy that the current limit surely takes of strings in parallel [%], (strings, lengths) by group.

        Empty where no limit can act. An efficiency may rise where power falls, so a tenth is left out.
        """
        year = self._search.year_of(m)
        assert year is not None
        inputs = self._search.inverters.records[i].inputs
        with np.errstate(invalid="ignore", divide="ignore"):
            amps = np.nan_to_num(year.power_w / year.vmp_v)
        energy, found = float(year.power_w @ year.hours), []
        for group, g in zip(space.groups, inputs, strict=True):
            limit = np.inf if g.max_current_a is None else g.max_current_a
            each = limit / np.arange(1, group.max_strings + 1)
            lost = np.array([np.maximum(amps - a, 0.0) @ (year.vmp_v * year.hours) for a in each]) / energy * 90.0
            found.append(np.broadcast_to(lost[:, None], (len(each), space.longest - space.shortest + 1)))
        return found if any(f.any() for f in found) else []

    def _first_within(self, m: int, i: int, blocks: Iterator[np.ndarray], to_confirm: bool) -> Options | None:
        """The first arrangement of some blocks that clips no more than the cap."""
        for block in blocks:
            table = self._search.table(m, i, block, to_confirm)
            within = np.flatnonzero(phase(table.clipping_pct, self._search.request.clip_cap_pct) < 2)
            if len(within):
                return table.take(within[:1])
        return None

    def _searched(self, m: np.ndarray, i: np.ndarray, j: int) -> Options:
        """The best option of a pair, its arrangements gone through."""
        search = self._search
        found = search.best(int(m[j]), int(i[j]), search.space(int(m[j]), int(i[j])))
        assert found is not None
        return found


def _slots(inputs: Sequence[Inputs]) -> np.ndarray:
    """The group of each tracker."""
    return np.repeat(np.arange(len(inputs)), [g.trackers for g in inputs])
