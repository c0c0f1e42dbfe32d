"""All arrangements of many pairs with one tracker each, expanded as arrays."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from matcher.limits import PairLimits


@dataclass(frozen=True, slots=True, eq=False)
class Expansion:
    """Lines of one pair and one string length each, with the strings that length can have.

    ``pair``, ``in_series``, ``from_strings`` and ``ways`` have shape (lines,); ``sizes`` (pairs,) is the
    exact number of arrangements of each pair.
    """

    pair: np.ndarray
    in_series: np.ndarray
    from_strings: np.ndarray
    ways: np.ndarray
    sizes: np.ndarray

    def parts(self, size: int) -> Iterator[tuple[int, int]]:
        """Ranges of lines, whole pairs each, with about ``size`` arrangements; at least one range."""
        first, held = 0, 0
        ends = np.append(np.flatnonzero(np.diff(self.pair)) + 1, len(self.pair))
        before = np.append(0, np.cumsum(self.ways))
        for end in ends:
            held = before[end] - before[first]
            if held >= size:
                yield first, int(end)
                first = int(end)
        if first < len(self.pair) or first == 0:
            yield first, len(self.pair)

    def part(self, first: int, last: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Arrangements of a range of lines: pair, strings and modules in series, arrays (n,)."""
        ways = self.ways[first:last]
        line = np.repeat(np.arange(first, last), ways)
        nth = np.arange(len(line)) - np.repeat(np.cumsum(ways) - ways, ways)
        return self.pair[line], self.from_strings[line] + nth, self.in_series[line]


def expand(limits: PairLimits, max_strings: np.ndarray) -> Expansion:
    """Every string length of every pair, with the range of strings that the module counts leave.

    ``max_strings`` (pairs,) is what the tracker takes at most.
    """
    # A string longer than the whole count allows is no string.
    longest = np.minimum(limits.longest, limits.most)
    lengths = np.maximum(longest - limits.shortest + 1, 0)
    pair = np.repeat(np.arange(len(lengths)), lengths)
    nth = np.arange(len(pair)) - np.repeat(np.cumsum(lengths) - lengths, lengths)
    in_series = limits.shortest[pair] + nth
    low = -(-limits.fewest[pair] // in_series)
    high = np.minimum(max_strings[pair], limits.most[pair] // in_series)
    ways = np.maximum(high - np.maximum(low, 1) + 1, 0)
    sizes = np.bincount(pair, weights=ways, minlength=len(lengths)).astype(np.int64)
    keep = ways > 0
    return Expansion(pair[keep], in_series[keep], np.maximum(low, 1)[keep], ways[keep], sizes)
