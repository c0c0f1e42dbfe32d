"""Every way of putting strings on the trackers of one inverter: counted exactly, listed lazily.

A tracker takes S strings of N modules, a *choice*, or stays empty. Trackers of one group are alike, so an
arrangement is a multiset of choices per group. Counting multiplies generating functions in the number of
modules; listing walks the trackers one by one and only ever enters branches that reach a wanted count.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import combinations
from math import comb, gcd, prod

import numpy as np

from matcher.choices import FACE, ByCount, ByStrings, Choices, Group
from matcher.walking import Slot, walk


@dataclass(frozen=True)
class Space:
    """All arrangements of one module type on one inverter with ``fewest`` to ``most`` modules.

    String lengths run from ``shortest`` to ``longest``; those outside ``sure_from``..``sure_to`` leave a
    voltage to confirm. ``facing`` lists the lengths with their faces instead (see `FACE`), which only the
    tally by strings can tell apart.
    """

    groups: tuple[Group, ...]
    shortest: int
    longest: int
    sure_from: int
    sure_to: int
    fewest: int
    most: int
    facing: tuple[int, ...] = ()

    @cached_property
    def choices(self) -> tuple[Choices, ...]:
        """Choices of each group."""
        return tuple(self._choices(g) for g in self.groups)

    def _choices(self, group: Group) -> Choices:
        n, s = [], []
        lengths = self.facing or range(self.shortest, min(self.longest, self.most) + 1)
        for length in lengths:
            for strings in range(1, min(group.max_strings, self.most // (length % FACE)) + 1):
                n.append(length)
                s.append(strings)
        in_series, strings_ = np.array(n, dtype=np.int64), np.array(s, dtype=np.int64)
        plain = in_series % FACE
        unsure = (plain < self.sure_from) | (plain > self.sure_to)
        return Choices(in_series, strings_, unsure | group.to_confirm)

    @cached_property
    def ways(self) -> list[int]:
        """Exact number of arrangements by module count, index 0..most (`fits` and `to-confirm` together)."""
        return self._ways(sure_only=False)

    @cached_property
    def sure_ways(self) -> list[int]:
        """Exact number of arrangements that leave nothing to confirm, by module count."""
        return self._ways(sure_only=True)

    def _ways(self, sure_only: bool) -> list[int]:
        counts = self.ways_by(ByCount(self.most), sure_only)
        counts[0] = 0  # the empty inverter is no arrangement
        return [c if m >= self.fewest else 0 for m, c in enumerate(counts)]

    def ways_by(self, tally: ByCount | ByStrings, sure_only: bool = False) -> list[int]:
        """Exact number of arrangements in each state of a tally, the module window left aside."""
        # Machine integers hold most counts, and are many times faster than whole numbers of any size.
        most = prod(comb(len(c.strings) + g.trackers, g.trackers) for g, c in zip(self.groups, self.choices, strict=True))
        total = np.zeros(tally.states, dtype=np.int64 if most < 2**62 else object)
        total[0] = 1
        for group, choices in zip(self.groups, self.choices, strict=True):
            if sure_only:
                choices = choices.keep(~choices.to_confirm)
            total = _take_group(total, choices, group.trackers, tally)
        return [int(c) for c in total]

    @property
    def total(self) -> int:
        """Exact number of arrangements."""
        return sum(self.ways)

    @property
    def reachable(self) -> list[int]:
        """Module counts that some arrangement has, ascending."""
        return [m for m, ways in enumerate(self.ways) if ways]

    def size(self, modules: int, to_confirm: bool) -> int:
        """Exact number of arrangements of one module count and verdict."""
        sure = self.sure_ways[modules]
        return self.ways[modules] - sure if to_confirm else sure

    def listing(
        self,
        accepted: np.ndarray,
        to_confirm: bool | None = None,
        lengths: tuple[int, ...] | None = None,
        tally: ByCount | ByStrings | None = None,
    ) -> Iterator[np.ndarray]:
        """Arrangements whose state is accepted, in blocks of shape (k, trackers, 2): strings, in series.

        Parameters
        ----------
        accepted : bool array, shape (states,)
            Wanted states of the tally: module counts, where no other is given.
        to_confirm : bool, optional
            Only those that leave something to confirm (True) or nothing (False).
        lengths : tuple of int, optional
            Only these string lengths.
        """
        slots: list[Slot] = []
        for group, choices in zip(self.groups, self.choices, strict=True):
            if lengths is not None:
                choices = choices.of_lengths(lengths)
            if to_confirm is False:
                choices = choices.keep(~choices.to_confirm)
            slot = Slot.of(choices, tally or ByCount(self.most))
            slots += [slot if t == 0 else replace(slot, opens_group=False) for t in range(group.trackers)]
        return walk(slots, accepted, needs_confirm=to_confirm is True)

    def foremost(self, modules: int, to_confirm: bool) -> np.ndarray:
        """Of the arrangements of one module count and verdict, in which there are some, the first of `classes`.

        Shape (trackers, 2). Of those with as few lengths and as short a longest string, the first of `listing`.
        """
        for sets in self.sets_of_lengths(modules, to_confirm):
            firsts = (next(self.of_lengths(modules, to_confirm, lengths), None) for lengths in sets)
            found = [block[0] for block in firsts if block is not None]
            if found:
                return min(found, key=listing_key)
        raise ValueError(f"no arrangement has {modules} modules")

    def sets_of_lengths(
        self, modules: int, to_confirm: bool, at_most: int | None = None
    ) -> Iterator[list[tuple[int, ...]]]:
        """Sets of (at most so many) string lengths that together can reach a module count, as `classes` takes them.

        Fewest lengths first, then by the longest; sets that are alike in both come together.
        """
        every = range(self.shortest, min(self.longest, self.most) + 1)
        if not to_confirm:
            every = range(max(self.shortest, self.sure_from), min(self.longest, self.most, self.sure_to) + 1)
        several = min(len(every), sum(g.trackers for g in self.groups))
        for k in range(1, min(several, several if at_most is None else at_most) + 1):
            for end in range(k - 1, len(every)):
                sets = [(*others, every[end]) for others in combinations(every[:end], k - 1)]
                sets = [lengths for lengths in sets if self._reaches(modules, lengths, to_confirm)]
                if sets:
                    yield sets

    def _reaches(self, modules: int, lengths: tuple[int, ...], to_confirm: bool) -> bool:
        """Whether strings of these lengths can add up to a module count; counts are bits of a whole number."""
        if modules % gcd(*lengths):
            return False
        counts, below = 1, (1 << (modules + 1)) - 1
        for group in self.groups:
            if group.to_confirm and not to_confirm:
                continue
            steps = [n * s for n in lengths for s in range(1, min(group.max_strings, modules // n) + 1)]
            for _ in range(group.trackers):
                grown = counts
                for step in steps:
                    grown |= counts << step
                grown &= below
                if grown == counts:
                    break
                counts = grown
        return bool(counts >> modules & 1)

    def least_mean(
        self, modules: int, to_confirm: bool, lengths: Sequence[int], values: Sequence[np.ndarray]
    ) -> float:
        """Least mean over the modules of what each choice costs a module, for one module count.

        Over the arrangements with strings of some lengths (k,); those of the other verdict may be among them
        where ``to_confirm``. ``values`` has an array (strings, k) for each group, by strings less one. Infinite
        where no arrangement has the count.
        """
        least = np.full(modules + 1, np.inf)
        least[0] = 0.0
        for group, value in zip(self.groups, values, strict=True):
            if group.to_confirm and not to_confirm:
                continue
            steps = [
                (n * s, n * s * float(value[s - 1, k]))
                for k, n in enumerate(lengths)
                for s in range(1, min(group.max_strings, modules // n) + 1)
            ]
            for _ in range(group.trackers):
                before = least
                least = before.copy()
                for step, cost in steps:
                    np.minimum(least[step:], before[:-step] + cost, out=least[step:])
        return float(least[modules]) / modules

    def of_lengths(self, modules: int, to_confirm: bool, lengths: tuple[int, ...]) -> Iterator[np.ndarray]:
        """Arrangements of one module count and verdict with strings of all these lengths, in blocks."""
        accepted = np.zeros(self.most + 1, dtype=bool)
        accepted[modules] = True
        for block in self.listing(accepted, to_confirm, lengths):
            block = block[distinct_lengths(block) == len(lengths)]
            if len(block):
                yield block

    def upto(self, longest: int) -> Space:
        """The arrangements whose strings are no longer than this."""
        return replace(self, longest=min(longest, self.longest))

    def classes(
        self, modules: int, to_confirm: bool, eager: int, exactly_longest: bool = False
    ) -> Iterator[np.ndarray]:
        """Arrangements of exactly ``modules`` modules: fewest string lengths first, then the shorter ones.

        Up to ``eager`` arrangements are sorted in memory; more are listed set of lengths by set of lengths.
        ``exactly_longest`` leaves only those that have a string of the space's longest length.
        """
        accepted = np.zeros(self.most + 1, dtype=bool)
        accepted[modules] = True
        size = self.size(modules, to_confirm)
        if size == 0:
            return
        if size <= eager:
            found = np.concatenate(list(self.listing(accepted, to_confirm)))
            if exactly_longest:
                found = found[longest_string(found) == self.longest]
            if len(found):
                yield found[np.lexsort((longest_string(found), distinct_lengths(found)))]
            return
        for sets in self.sets_of_lengths(modules, to_confirm):
            for lengths in sets:
                if not exactly_longest or lengths[-1] == self.longest:
                    yield from self.of_lengths(modules, to_confirm, lengths)


def distinct_lengths(block: np.ndarray) -> np.ndarray:
    """Number of different string lengths of each arrangement; block (k, trackers, 2) -> (k,)."""
    n = np.sort(block[:, :, 1], axis=1)
    new = np.diff(n, axis=1, prepend=0) > 0
    return new.sum(axis=1)


def listing_key(row: np.ndarray) -> list[tuple[int, int]]:
    """Sorts arrangements (trackers, 2) as they are listed: choices by length, then strings, an empty tracker last."""
    return [(n, s) if s else (FACE, 0) for s, n in row.tolist()]


def longest_string(block: np.ndarray) -> np.ndarray:
    """Longest string of each arrangement [modules]; block (k, trackers, 2) -> (k,)."""
    return block[:, :, 1].max(axis=1)


def _take_group(total: np.ndarray, choices: Choices, trackers: int, tally: ByCount | ByStrings) -> np.ndarray:
    """Ways of each state after a group of like trackers; a multiset of at most ``trackers`` choices is added."""
    steps, opens = tally.steps(choices), tally.open(choices)
    # used[k]: ways with k trackers of the group in use. A choice may be taken again and again, so each
    # is worked in for k ascending; what it can be added to is cut to the states it is open from.
    used = [total] + [np.zeros_like(total) for _ in range(trackers)]
    for step, opened in zip(steps.tolist(), opens, strict=True):
        start = np.flatnonzero(opened)
        if not len(start):
            continue
        for k in range(1, trackers + 1):
            used[k][start + step] += used[k - 1][start]
    return sum(used[1:], start=used[0])
