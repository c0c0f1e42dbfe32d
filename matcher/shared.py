"""Arrays that are given as a whole: as strings to be hosted exactly, or as a count shared by several units."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import replace
from functools import lru_cache, partial
from itertools import islice

import numpy as np

from matcher.arrangements import Space
from matcher.choices import FACE, ByStrings
from matcher.errors import MatcherError
from matcher.limits import TOLERANCE, PairLimits, at_most
from matcher.options import Options, join
from matcher.reach import share_of
from matcher.search import Search
from matcher.singleunits import SingleUnits
from matcher.several import even_split, even_strings, together

#: States of a hosted array (strings of each length so far) that are gone through at most.
MOST_STATES = 200_000

#: Sets of string lengths that are looked at for one of two unlike units, and how many lengths they have.
_MOST_SETS = 60
_MOST_LENGTHS = 3

#: An option that is still to be put together: its units as rows of the single-tracker table or as tables of
#: their own, and how many there are of each.
_Plan = tuple[list["int | Options"], list[int]]


def on_several_units(search: Search) -> tuple[Options, list[int]]:
    """One option per listed record, number of units and module count: the most even split, best wired.

    Returns the options and, per listed record, the exact number of arrangements of one unit whose module count
    is one of those that the splits use.
    """
    request = search.request
    assert request.counts is not None
    singles = SingleUnits(search, request.counts[1])
    plans: list[list[_Plan]] = []
    arrangements: list[int] = []
    for m, i in _pairs(search):
        wanted = list(_wanted(search, m, i))
        used: dict[int, int] = {}
        if wanted and search.inverters.single[i]:
            ways = singles.ways(m, i)
            row = partial(singles.ask, m, i)
            sets = partial(singles.sets_of_lengths, m, i)
        elif wanted:
            space = free_space(search, m, i, request.counts[1])
            ways = {count: space.ways[count] for count in space.reachable}
            row = partial(search.best_of_count, m, i, space)
            sets = partial(_sets_of_lengths, space)
        for units, total in wanted:
            split = even_split(list(ways), total, units)
            if split is None:
                continue
            copies = Counter(split)
            used |= {count: ways[count] for count in copies}
            number = list(copies.values())
            alternatives: list[_Plan] = [([row(count) for count in copies], number)]
            if len(copies) == 2:
                # Units that are wired unlike, each as it is best alone, may have more lengths than need be.
                alike = _alike(*(sets(count) for count in copies))
                alternatives.append(([row(count, lengths) for count, lengths in zip(copies, alike, strict=True)], number))
            plans.append(alternatives)
        arrangements.append(sum(used.values()))
    return _put_together(search, singles, plans), arrangements


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
    singles = SingleUnits(search, total)
    plans: list[list[_Plan]] = []
    arrangements: list[int] = []
    for m, i in _pairs(search):
        low, high = search.asked(m, i).units
        inside = [units for units in range(low, high + 1) if _inside(search, m, i, total, units)]
        space = None
        ways = 0
        for units in inside:
            if search.inverters.single[i] and not search.request.faces:
                options, number = _hosted_by_singles(singles, m, i, tally, units)
            else:
                if space is None:
                    facing = tuple(wanted) if search.request.faces else ()
                    space = replace(free_space(search, m, i, total), facing=facing)
                options, number = _hosted(search, m, i, space, tally, units)
            ways += number
            plans += [[plan] for plan in options]
        arrangements.append(ways)
    return _put_together(search, singles, plans), arrangements


def _hosted_by_singles(
    singles: SingleUnits, m: int, i: int, tally: ByStrings, units: int
) -> tuple[list[_Plan], int]:
    """As `_hosted`, for inverters with one tracker, which carries strings of one length."""
    lengths, counts = zip(*tally.wanted, strict=True)
    most = tuple(min(singles.strings(m, i, length), count) for length, count in tally.wanted)
    split = _single_shares(lengths, counts, most, units)
    if split is None:
        return [], 0
    copies = Counter(split)
    rows: list[int | Options] = []
    for share in copies:
        (length, strings) = next((n, s) for n, s in zip(lengths, share, strict=True) if s)
        rows.append(singles.ask(m, i, length * strings, (length,)))
    return [(rows, list(copies.values()))], len(copies)


@lru_cache(maxsize=1024)
def _single_shares(
    lengths: tuple[int, ...], counts: tuple[int, ...], most: tuple[int, ...], units: int
) -> tuple[tuple[int, ...], ...] | None:
    """Shares of units that take up to ``most`` strings of one of the lengths each."""
    places = range(len(lengths))
    hosted = frozenset(
        tuple(strings if p == k else 0 for p in places) for k in places for strings in range(1, most[k] + 1)
    )
    return even_strings(hosted, lengths, counts, units)


def _hosted(
    search: Search, m: int, i: int, space: Space, tally: ByStrings, units: int
) -> tuple[list[_Plan], int]:
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
            return [([table], []) for table in tables], ways[-1]
        first = next(tables)
        return [([first.take(search.rank(first)[:1])], [])], ways[-1]
    shares = {share_of(tally, state): state for state, w in enumerate(ways) if w and state}
    hosted = frozenset(s for s in shares if sum(n * c for n, c in zip(lengths, s, strict=True)) <= space.most)
    split = even_strings(hosted, lengths, tuple(count for _, count in tally.wanted), units)
    if split is None:
        return [], 0
    copies = Counter(split)
    rows: list[int | Options] = []
    for share in copies:
        first = next(search.hosting(m, i, space, tally, shares[share]))
        rows.append(first.take(search.rank(first)[:1]))
    return [(rows, list(copies.values()))], sum(ways[shares[s]] for s in copies)


def _pairs(search: Search) -> Iterator[tuple[int, int]]:
    for m in range(len(search.modules)):
        for i in range(len(search.inverters.records)):
            yield m, i


def free_space(search: Search, m: int, i: int, most: int) -> Space:
    """Arrangements of one unit with up to ``most`` modules, whatever its own DC/AC ratio."""
    return search.space(m, i, free_limits(search, m, np.array([i]), most))


def free_limits(search: Search, m: int, inverters: np.ndarray, most: int) -> PairLimits:
    """Bounds of one module on some inverters, one unit each with up to ``most`` modules, whatever the ratio."""
    limits = search.limits(np.full(len(inverters), m), inverters)
    held = at_most(search.inverters.max_array_power_w[inverters], search.points.pmax_w[m : m + 1])
    return replace(limits, fewest=np.ones(len(inverters), dtype=np.int64), most=np.minimum(held, most))


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


#: Sets of string lengths of one unit, and whether they leave a safety rating to confirm.
_Sets = Sequence[tuple[tuple[int, ...], bool]]


def _sets_of_lengths(space: Space, modules: int) -> _Sets:
    """Of a module count, those with few lengths first, and no more than need be looked at."""
    unsure = not space.size(modules, False)
    found = (some for sets in space.sets_of_lengths(modules, unsure, _MOST_LENGTHS) for some in sets)
    return [(lengths, unsure) for lengths in islice(found, _MOST_SETS)]


def _alike(one: _Sets, other: _Sets) -> tuple[tuple[int, ...], tuple[int, ...]]:
    """Lengths of two unlike units: nothing to confirm, as few lengths in all, then as short a longest string."""
    pairs = ((a, b) for a in one for b in other)
    (first, _), (second, _) = min(
        pairs, key=lambda p: (p[0][1] or p[1][1], len({*p[0][0], *p[1][0]}), max(*p[0][0], *p[1][0]))
    )
    return first, second


def _put_together(search: Search, singles: SingleUnits, plans: Sequence[Sequence[_Plan]]) -> Options:
    """The first option of the alternatives of each plan in one table.

    A plan without copies, which has no alternative, is a table of one-unit options as it is.
    """
    rows = singles.table()
    parts: list[Options] = []
    for alternatives in plans:
        tables: list[Options] = []
        seen: set[tuple] = set()
        for units, copies in alternatives:
            if len(alternatives) > 1:
                wiring = tuple(_wiring(rows, u) for u in units)
                if wiring in seen:
                    continue
                seen.add(wiring)
            table = join([rows.take(slice(u, u + 1)) if isinstance(u, int) else u for u in units])
            if copies:
                m, i = int(table.module[0]), int(table.inverter[0])
                pmax_w, ac_power_w = float(search.points.pmax_w[m]), float(search.inverters.ac_power_w[i])
                table = together(table, copies, pmax_w, ac_power_w)
            tables.append(table)
        if len(tables) == 1:
            parts.append(tables[0])
        else:
            both = join(tables)
            parts.append(both.take(search.rank(both)[:1]))
    return join(parts) if parts else rows


def _wiring(rows: Options, unit: int | Options) -> bytes:
    """Tells the wirings of one unit apart."""
    table, k = (rows, unit) if isinstance(unit, int) else (unit, 0)
    return table.strings[k].tobytes() + table.in_series[k].tobytes()
