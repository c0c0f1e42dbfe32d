"""What a tracker can carry, and by what arrangements are told apart while trackers are filled one by one."""

from __future__ import annotations

from dataclasses import dataclass
from math import prod

import numpy as np

#: A string length with the way it faces: ``face * FACE + length``. Strings that face different ways are
#: different strings; face 0 is the plain length.
FACE = 100_000


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

    def keep(self, which: np.ndarray) -> Choices:
        """Only these choices, in their order."""
        return Choices(self.in_series[which], self.strings[which], self.to_confirm[which])

    def of_lengths(self, lengths: tuple[int, ...]) -> Choices:
        """Only the choices with one of these string lengths."""
        return self.keep(np.isin(self.in_series, lengths))


@dataclass(frozen=True, slots=True)
class ByCount:
    """Arrangements told apart by their module count: state m is m modules placed, up to ``most``."""

    most: int

    @property
    def states(self) -> int:
        """Number of states."""
        return self.most + 1

    def steps(self, choices: Choices) -> np.ndarray:
        """States that each choice moves on, shape (c,)."""
        return choices.modules

    def open(self, choices: Choices) -> np.ndarray:
        """From which states each choice can be made; bool (c, states)."""
        return np.arange(self.states)[None, :] + choices.modules[:, None] <= self.most


@dataclass(frozen=True, slots=True)
class ByStrings:
    """Arrangements told apart by their strings of each length, up to ``wanted``: (length, strings) pairs.

    A state is a mixed-radix number with one digit per length, the strings of that length placed so far.
    """

    wanted: tuple[tuple[int, int], ...]

    @property
    def states(self) -> int:
        """Number of states; the last one is all strings placed."""
        return prod(count + 1 for _, count in self.wanted)

    def _strides(self) -> dict[int, tuple[int, int]]:
        """Stride and wanted strings of each length."""
        strides, stride = {}, 1
        for length, count in self.wanted:
            strides[length] = (stride, count)
            stride *= count + 1
        return strides

    def steps(self, choices: Choices) -> np.ndarray:
        """States that each choice moves on, shape (c,)."""
        strides = self._strides()
        stride = np.array([strides[n][0] if n in strides else 0 for n in choices.in_series.tolist()], dtype=np.int64)
        return choices.strings * stride

    def open(self, choices: Choices) -> np.ndarray:
        """From which states each choice can be made; bool (c, states)."""
        strides = self._strides()
        state = np.arange(self.states)
        rows = np.zeros((len(choices.in_series), self.states), dtype=bool)
        for c, (n, s) in enumerate(zip(choices.in_series.tolist(), choices.strings.tolist(), strict=True)):
            if n in strides:
                stride, count = strides[n]
                rows[c] = state // stride % (count + 1) + s <= count
        return rows
