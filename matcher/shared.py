"""Arrays that are given as a whole: as strings to be hosted exactly, or as a count shared by several units."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np

from matcher.arrangements import FACE, ByStrings, Space
from matcher.errors import MatcherError
from matcher.limits import TOLERANCE, at_most
from matcher.options import Options, join
from matcher.reach import share_of
from matcher.search import Search
from matcher.several import even_split, even_strings, together

#: States of a hosted array (strings of each length so far) that are gone through at most.
MOST_STATES = 200_000


def on_several_units(search: Search) -> tuple[Options, list[int]]:
    """One option per listed record, number of units and module count: the most even split, best wired.

    Returns the options and, per listed record, the exact number of arrangements of one unit whose module count
    is one of those that the splits use.
    """
    request = search.request
    assert request.counts is not None
    parts: list[Options] = []
    arrangements: list[int] = []
    for m, i in _pairs(search):
        space = free_space(search, m, i, request.counts[1])
        ways: dict[int, int] = {}
        for units, total in _wanted(search, m, i):
            split = even_split(space.reachable, total, units)
            if split is None:
                continue
            copies = Counter(split)
            rows = [search.best_of_count(m, i, space, count) for count in copies]
            ways |= {count: space.ways[count] for count in copies}
            parts.append(_joined(search, rows, list(copies.values())))
        arrangements.append(sum(ways.values()))
    return _all(search, parts), arrangements


def with_strings(search: Search, strings: Sequence[tuple[int, int]]) -> tuple[Options, list[int]]:
    """Options that host exactly these (modules in series, strings) pairs, on one or several units.

    Modules in series may carry a face (`matcher.arrangements.FACE`).

    Raises
    ------
    MatcherError
        Where the strings are too many kinds to go through.
    """
    wanted = Counter[int]()
    for length, count in strings:
        wanted[length] += count
    tally = ByStrings(tuple(sorted(wanted.items())))
    if tally.states > MOST_STATES:
        raise MatcherError("the strings have too many different lengths to be spread exactly; give fewer kinds")
    total = sum(kind % FACE * count for kind, count in wanted.items())
    parts: list[Options] = []
    arrangements: list[int] = []
    for m, i in _pairs(search):
        space = replace(free_space(search, m, i, total), facing=tuple(wanted) if search.request.faces else ())
        ways = 0
        low, high = search.asked(m, i).units
        for units in range(low, high + 1):
            if not _inside(search, m, i, total, units):
                continue
            options, number = _hosted(search, m, i, space, tally, units)
            ways += number
            parts += options
        arrangements.append(ways)
    return _all(search, parts), arrangements


def _hosted(
    search: Search, m: int, i: int, space: Space, tally: ByStrings, units: int
) -> tuple[list[Options], int]:
    """Options of one pair with a number of units, and how many arrangements of one unit there are."""
    lengths = tuple(kind % FACE for kind, _ in tally.wanted)
    if not all(space.shortest <= length <= space.longest for length in lengths):
        return [], 0
    ways = space.ways_by(tally)
    if units == 1:
        if not ways[-1] or sum(n * c for n, (_, c) in zip(lengths, tally.wanted, strict=True)) > space.most:
            return [], 0
        tables = search.hosting(m, i, space, tally, tally.states - 1)
        if search.request.every:
            return list(tables), ways[-1]
        first = next(tables)
        return [first.take(search.rank(first)[:1])], ways[-1]
    shares = {share_of(tally, state): state for state, w in enumerate(ways) if w and state}
    hosted = frozenset(s for s in shares if sum(n * c for n, c in zip(lengths, s, strict=True)) <= space.most)
    split = even_strings(hosted, lengths, tuple(count for _, count in tally.wanted), units)
    if split is None:
        return [], 0
    copies = Counter(split)
    rows = []
    for share in copies:
        first = next(search.hosting(m, i, space, tally, shares[share]))
        rows.append(first.take(search.rank(first)[:1]))
    return [_joined(search, rows, list(copies.values()))], sum(ways[shares[s]] for s in copies)


def _pairs(search: Search) -> Iterator[tuple[int, int]]:
    for m in range(len(search.modules)):
        for i in range(len(search.inverters.records)):
            yield m, i


def free_space(search: Search, m: int, i: int, most: int) -> Space:
    """Arrangements of one unit with up to ``most`` modules, whatever its own DC/AC ratio."""
    limits = search.limits(np.array([m]), np.array([i]))
    held = at_most(search.inverters.max_array_power_w[i : i + 1], search.points.pmax_w[m : m + 1])
    one = np.ones(1, dtype=np.int64)
    return search.space(m, i, replace(limits, fewest=one, most=np.minimum(held, most)))


def _wanted(search: Search, m: int, i: int) -> Iterator[tuple[int, int]]:
    """Numbers of units and module counts that are asked of a pair and whose ratio is in the window."""
    request = search.asked(m, i)
    assert request.counts is not None
    for units in range(request.units[0], request.units[1] + 1):
        for total in range(max(request.counts[0], units), request.counts[1] + 1):
            if _inside(search, m, i, total, units):
                yield units, total


def _inside(search: Search, m: int, i: int, total: int, units: int) -> bool:
    low, high = search.request.ratio
    ratio = total * search.points.pmax_w[m] / (units * search.inverters.ac_power_w[i])
    return bool(low * (1.0 - TOLERANCE) <= ratio <= high * (1.0 + TOLERANCE))


def _joined(search: Search, rows: list[Options], copies: list[int]) -> Options:
    table = join(rows)
    m, i = int(table.module[0]), int(table.inverter[0])
    return together(table, copies, float(search.points.pmax_w[m]), float(search.inverters.ac_power_w[i]))


def _all(search: Search, parts: list[Options]) -> Options:
    if parts:
        return join(parts)
    none = np.zeros(0, dtype=np.int64)
    limits = search.limits(none, none)
    return search.single_trackers(none, none, limits, every=True)[0]
