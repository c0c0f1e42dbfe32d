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

    def parts(self, size: int, weight: np.ndarray | None = None) -> Iterator[Expansion]:
        """Lines in parts, whole pairs each, with about ``size`` arrangements; at least one part.

        ``weight`` (lines,) counts in the place of the arrangements where it is given.
        """
        ends = np.append(np.flatnonzero(np.diff(self.pair)) + 1, len(self.pair))
        before = np.append(0, np.cumsum(self.ways if weight is None else weight))
        first = 0
        while first < len(self.pair) or first == 0:
            # The first end of a pair at which the size is reached.
            k = int(np.searchsorted(before[ends], before[first] + size))
            end = int(ends[min(k, len(ends) - 1)])
            yield self.take(slice(first, end))
            if end == first:
                return
            first = end

    def take(self, lines: slice | np.ndarray) -> Expansion:
        """Some lines; the sizes of the pairs stay."""
        return Expansion(*(a[lines] for a in (self.pair, self.in_series, self.from_strings, self.ways)), self.sizes)

    def options(self) -> tuple[np.ndarray, np.ndarray]:
        """The line and the strings of each arrangement, arrays (n,)."""
        line = np.repeat(np.arange(len(self.ways)), self.ways)
        nth = np.arange(len(line)) - np.repeat(np.cumsum(self.ways) - self.ways, self.ways)
        return line, self.from_strings[line] + nth


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
