"""Every way of putting strings on the trackers of one inverter: counted exactly, listed lazily.

A tracker takes S strings of N modules, a *choice*, or stays empty. Trackers of one group are alike, so an
arrangement is a multiset of choices per group. Counting multiplies generating functions in the number of
modules; listing walks the trackers one by one and only ever enters branches that reach a wanted count.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import cached_property
from itertools import combinations

import numpy as np

#: Partial arrangements that are carried on at once: bounds memory, whatever the number of arrangements.
BLOCK = 4096


@dataclass(frozen=True, slots=True)
class Group:
    """Like trackers: how many, how many strings each takes at most, and whether using one is to be confirmed."""

    trackers: int
    max_strings: int
    to_confirm: bool


@dataclass(frozen=True, slots=True, eq=False)
class Choices:
    """What one tracker of a group can carry; arrays of shape (c,), ordered by length, then strings."""

    in_series: np.ndarray
    strings: np.ndarray
    to_confirm: np.ndarray

    @property
    def modules(self) -> np.ndarray:
        """Modules of each choice."""
        return self.in_series * self.strings

    def of_lengths(self, lengths: tuple[int, ...]) -> Choices:
        """Only the choices with one of these string lengths."""
        keep = np.isin(self.in_series, lengths)
        return Choices(self.in_series[keep], self.strings[keep], self.to_confirm[keep])


@dataclass(frozen=True)
class Space:
    """All arrangements of one module type on one inverter with ``fewest`` to ``most`` modules.

    String lengths run from ``shortest`` to ``longest``; those outside ``sure_from``..``sure_to`` leave a
    voltage to confirm.
    """

    groups: tuple[Group, ...]
    shortest: int
    longest: int
    sure_from: int
    sure_to: int
    fewest: int
    most: int

    @cached_property
    def choices(self) -> tuple[Choices, ...]:
        """Choices of each group."""
        return tuple(self._choices(g) for g in self.groups)

    def _choices(self, group: Group) -> Choices:
        n, s = [], []
        for length in range(self.shortest, min(self.longest, self.most) + 1):
            for strings in range(1, min(group.max_strings, self.most // length) + 1):
                n.append(length)
                s.append(strings)
        in_series, strings_ = np.array(n, dtype=np.int64), np.array(s, dtype=np.int64)
        unsure = (in_series < self.sure_from) | (in_series > self.sure_to)
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
        total = np.zeros(self.most + 1, dtype=object)
        total[0] = 1
        for group, choices in zip(self.groups, self.choices, strict=True):
            modules = choices.modules
            if sure_only:
                modules = modules[~choices.to_confirm]
            total = _multiply(total, _group_ways(modules, group.trackers, self.most))
        counts = [int(c) for c in total]
        counts[0] = 0  # the empty inverter is no arrangement
        return [c if m >= self.fewest else 0 for m, c in enumerate(counts)]

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
        self, accepted: np.ndarray, to_confirm: bool | None = None, lengths: tuple[int, ...] | None = None
    ) -> Iterator[np.ndarray]:
        """Arrangements whose module count is accepted, in blocks of shape (k, trackers, 2): strings, in series.

        Parameters
        ----------
        accepted : bool array, shape (most + 1,)
            Wanted module counts.
        to_confirm : bool, optional
            Only those that leave something to confirm (True) or nothing (False).
        lengths : tuple of int, optional
            Only these string lengths.
        """
        slots: list[tuple[Choices, bool]] = []
        for group, choices in zip(self.groups, self.choices, strict=True):
            if lengths is not None:
                choices = choices.of_lengths(lengths)
            if to_confirm is False:
                sure = ~choices.to_confirm
                choices = Choices(choices.in_series[sure], choices.strings[sure], choices.to_confirm[sure])
            slots += [(choices, t == 0) for t in range(group.trackers)]
        return _walk(slots, accepted, needs_confirm=to_confirm is True)

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
        every = range(self.shortest, min(self.longest, self.most) + 1)
        for k in range(1, len(every) + 1):
            for lengths in sorted(combinations(every, k), key=lambda c: (c[-1], c)):
                if exactly_longest and lengths[-1] != self.longest:
                    continue
                for block in self.listing(accepted, to_confirm, lengths):
                    block = block[distinct_lengths(block) == k]
                    if len(block):
                        yield block


def distinct_lengths(block: np.ndarray) -> np.ndarray:
    """Number of different string lengths of each arrangement; block (k, trackers, 2) -> (k,)."""
    n = np.sort(block[:, :, 1], axis=1)
    new = np.diff(n, axis=1, prepend=0) > 0
    return new.sum(axis=1)


def longest_string(block: np.ndarray) -> np.ndarray:
    """Longest string of each arrangement [modules]; block (k, trackers, 2) -> (k,)."""
    return block[:, :, 1].max(axis=1)


def _group_ways(modules: np.ndarray, trackers: int, most: int) -> np.ndarray:
    """Number of multisets of at most ``trackers`` choices, by total modules; object array (most + 1,)."""
    one = np.bincount(modules[modules <= most], minlength=most + 1).astype(object)
    if trackers == 1:
        one[0] += 1
        return one
    # used[k][m]: multisets of k choices with m modules; each choice may be taken again and again.
    used = [np.zeros(most + 1, dtype=object) for _ in range(trackers + 1)]
    used[0][0] = 1
    for m in modules[modules <= most]:
        for k in range(1, trackers + 1):
            used[k][m:] += used[k - 1][: most + 1 - m]
    return sum(used)


def _multiply(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """Product of two generating functions, cut at the length of ``a``."""
    out = np.zeros(len(a), dtype=object)
    for m in np.flatnonzero(b):
        out[m:] += a[: len(a) - m] * b[m]
    return out


def _reach(slots: list[tuple[Choices, bool]], accepted: np.ndarray, needs_confirm: bool) -> list[list[np.ndarray]]:
    """Per slot and flag: whether an accepted count can still be reached; bool (choices + 1, most + 1).

    Entry [slot][flag][c, used] is for a slot that may take choice c or a later one, or stay empty, with
    ``used`` modules placed. Flag 0: something to confirm is still to come; flag 1: nothing is asked any more.
    """
    most = len(accepted) - 1
    nothing = np.zeros(most + 1, dtype=bool)
    table: list[list[np.ndarray]] = [[np.empty(0)] * 2 for _ in slots]
    for j in range(len(slots) - 1, -1, -1):
        choices, _ = slots[j]
        modules, unsure = choices.modules, choices.to_confirm
        last = j + 1 == len(slots)
        next_is_new = not last and slots[j + 1][1]
        for flag in ((0, 1) if needs_confirm else (1,)):
            rows = np.zeros((len(modules) + 1, most + 1), dtype=bool)
            # Empty: so are all later trackers of the group, which row -1 of the next slot stands for.
            if last:
                rows[-1] = accepted if flag else nothing
            else:
                rows[-1] = table[j + 1][flag][0 if next_is_new else -1]
            for c in range(len(modules) - 1, -1, -1):
                after = 1 if flag or unsure[c] else 0
                if last:
                    target = accepted if after else nothing
                else:
                    target = table[j + 1][after][0 if next_is_new else c]
                rows[c] = rows[c + 1]
                m = int(modules[c])
                if m <= most:
                    rows[c, : most + 1 - m] |= target[m:]
            table[j][flag] = rows
    return table


def _walk(slots: list[tuple[Choices, bool]], accepted: np.ndarray, needs_confirm: bool) -> Iterator[np.ndarray]:
    """Depth first over blocks of partial arrangements; yields complete ones, shape (k, trackers, 2)."""
    if not slots:
        return
    table = _reach(slots, accepted, needs_confirm)
    flag0 = 0 if needs_confirm else 1
    if not table[0][flag0][0, 0]:
        return
    first = (np.zeros((1, 0), dtype=np.int64), np.zeros(1, np.int64), np.full(1, flag0))
    stack = [first]
    while stack:
        path, used, flag = stack.pop()
        j = path.shape[1]
        if j == len(slots):
            yield _complete(slots, path)
            continue
        choices, _ = slots[j]
        allowed = _allowed(slots, table, accepted, j, path, used, flag)
        row, c = np.nonzero(allowed)
        modules = np.append(choices.modules, 0)
        unsure = np.append(choices.to_confirm, False)
        grown = np.column_stack([path[row], c])
        grown_used = used[row] + modules[c]
        grown_flag = flag[row] | unsure[c]
        for start in reversed(range(0, len(row), BLOCK)):
            part = slice(start, start + BLOCK)
            stack.append((grown[part], grown_used[part], grown_flag[part]))


def _allowed(
    slots: list[tuple[Choices, bool]],
    table: list[list[np.ndarray]],
    accepted: np.ndarray,
    j: int,
    path: np.ndarray,
    used: np.ndarray,
    flag: np.ndarray,
) -> np.ndarray:
    """Which choices each partial arrangement can take next; bool (k, choices + 1), the last is "empty"."""
    choices, is_new = slots[j]
    count = len(choices.modules)
    most = len(accepted) - 1
    index = np.arange(count + 1)
    start = np.zeros(len(path), dtype=np.int64) if is_new else path[:, -1]
    modules = np.append(choices.modules, 0)
    unsure = np.append(choices.to_confirm, False)
    total = used[:, None] + modules[None, :]
    inside = (index[None, :] >= start[:, None]) & (total <= most)
    after = flag[:, None] | unsure[None, :]
    total = np.minimum(total, most)
    if j + 1 == len(slots):
        return inside & (after == 1) & accepted[total]
    next_is_new = slots[j + 1][1]
    nxt = np.zeros_like(index) if next_is_new else index
    nxt = np.broadcast_to(nxt[None, :], total.shape)
    good = table[j + 1][1][nxt, total]
    if len(table[j + 1][0]):
        good = np.where(after == 1, good, table[j + 1][0][nxt, total])
    return inside & good


def _complete(slots: list[tuple[Choices, bool]], path: np.ndarray) -> np.ndarray:
    """Chosen indices turned into strings and lengths; empty trackers are 0, 0."""
    out = np.zeros((len(path), len(slots), 2), dtype=np.int64)
    for j, (choices, _) in enumerate(slots):
        out[:, j, 0] = np.append(choices.strings, 0)[path[:, j]]
        out[:, j, 1] = np.append(choices.in_series, 0)[path[:, j]]
    return out
