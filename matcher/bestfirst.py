"""The options of one inverter with several trackers, in order, without listing them all.

Arrangements come in classes of one verdict and one module count (and, in the order of the cold-voltage
margin, one longest string). For each class the best sort key that any
of its members can have is known beforehand (bounds on clipping and energy from the efficiency curves at all
string lengths), so a class is opened only when its turn can have come, and an option is given out only
when nothing unopened can hold a better one.

A class of more than `SORTED_AT_ONCE` arrangements is not sorted whole: it is listed by its number of string
lengths, then by the longest, block by block. For the options within the clipping cap that is their order
exactly; for those over it, whose losses differ by hundredths of a percentage point only, it is the order by
module count and by block.
"""

from __future__ import annotations

import heapq
from collections.abc import Callable, Iterator
from itertools import count

import numpy as np

from matcher.arrangements import Space
from matcher.order import Order, leading_keys

SORTED_AT_ONCE = 100_000

Key = tuple[float, ...]


def best_first(
    space: Space,
    order: Order,
    clip_cap_pct: float,
    bounds: Callable[[np.ndarray, int], dict[str, np.ndarray]],
    rows_of: Callable[[np.ndarray, bool], tuple[object, np.ndarray]],
) -> Iterator[tuple[Key, object, int]]:
    """Options of a space in order: (sort key, table, position in the table).

    Parameters
    ----------
    bounds : function of module counts (c,) and the length that the longest string has at least
        Best ratio, clipping_pct, margin_pct, yearly_kwh and cost that an arrangement of each count can have,
        arrays (c,) by name.
    rows_of : function of a block (k, trackers, 2) and whether it is to be confirmed
        The options of the block as a table, and their sort keys (k, keys).
    """
    tick = count()
    classes = _by_longest(space, bounds) if order is Order.MARGIN else _by_count(space, order, clip_cap_pct, bounds)
    heap: list[tuple[Key, int, object, int | None]] = [
        (key, next(tick), (blocks, to_confirm), None) for key, to_confirm, blocks in classes
    ]
    heapq.heapify(heap)
    while heap:
        key, _, held, row = heapq.heappop(heap)
        if row is not None:
            yield key, held, row
            continue
        blocks, to_confirm = held  # type: ignore[misc]
        block = next(blocks, None)
        if block is None:
            continue
        table, keys = rows_of(block, to_confirm)
        tuples = list(map(tuple, keys.tolist()))
        for position, row_key in enumerate(tuples):
            heapq.heappush(heap, (row_key, next(tick), table, position))
        # The class goes on when the block's rows of the foremost stage are given out.
        least = min(tuples)
        resume = max(k for k in tuples if k[:2] == least[:2])
        heapq.heappush(heap, (resume, next(tick), held, None))


#: One class: the least key its members can have, its verdict, its arrangements in blocks.
Class = tuple[Key, bool, Iterator[np.ndarray]]


def _by_count(
    space: Space, order: Order, clip_cap_pct: float, bounds: Callable[[np.ndarray, int], dict[str, np.ndarray]]
) -> Iterator[Class]:
    """Classes of one verdict and module count."""
    for to_confirm in (False, True):
        counts = [m for m in space.reachable if space.size(m, to_confirm)]
        if not counts:
            continue
        best = bounds(np.array(counts), space.shortest)
        leading = leading_keys(
            order, clip_cap_pct, best["ratio"], best["clipping_pct"], best["margin_pct"], best["yearly_kwh"],
            best["cost"],
        )  # fmt: skip
        for modules, *key in zip(counts, *(k.tolist() for k in leading), strict=True):
            yield (float(to_confirm), *key), to_confirm, space.classes(modules, to_confirm, SORTED_AT_ONCE)


def _by_longest(space: Space, bounds: Callable[[np.ndarray, int], dict[str, np.ndarray]]) -> Iterator[Class]:
    """Classes of one verdict, module count and longest string, on which the cold-voltage margin depends."""
    shorter = None
    for longest in range(space.shortest, min(space.longest, space.most) + 1):
        upto = space.upto(longest)
        counts = np.array(upto.reachable, dtype=np.int64)
        best = bounds(counts, longest)
        for modules, ratio, margin in zip(counts.tolist(), best["ratio"], best["margin_pct"], strict=True):
            for to_confirm in (False, True):
                if upto.size(modules, to_confirm) > (shorter.size(modules, to_confirm) if shorter else 0):
                    blocks = upto.classes(modules, to_confirm, SORTED_AT_ONCE, exactly_longest=True)
                    yield (float(to_confirm), -margin, -ratio), to_confirm, blocks
        shorter = upto
