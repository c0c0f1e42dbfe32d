"""Arrangements listed tracker by tracker, entering only branches that reach what is wanted."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from matcher.choices import ByCount, ByStrings, Choices

#: Partial arrangements that are carried on at once: bounds memory, whatever the number of arrangements.
BLOCK = 4096


@dataclass(frozen=True, slots=True, eq=False)
class Slot:
    """One tracker on the walk. The last entry of each array stands for leaving it empty."""

    choices: Choices
    step: np.ndarray
    unsure: np.ndarray
    open: np.ndarray
    opens_group: bool = True

    @classmethod
    def of(cls, choices: Choices, tally: ByCount | ByStrings) -> Slot:
        return cls(
            choices,
            np.append(tally.steps(choices), 0),
            np.append(choices.to_confirm, False),
            np.vstack([tally.open(choices), np.ones((1, tally.states), dtype=bool)]),
        )


def _reach(slots: list[Slot], accepted: np.ndarray, needs_confirm: bool) -> list[list[np.ndarray]]:
    """Per slot and flag: whether an accepted state can still be reached; bool (choices + 1, states).

    Entry [slot][flag][c, state] is for a slot that may take choice c or a later one, or stay empty. Flag 0:
    something to confirm is still to come; flag 1: nothing is asked any more.
    """
    nothing = np.zeros(len(accepted), dtype=bool)
    table: list[list[np.ndarray]] = [[np.empty(0)] * 2 for _ in slots]
    for j in range(len(slots) - 1, -1, -1):
        slot = slots[j]
        for flag in (0, 1) if needs_confirm else (1,):
            rows = np.zeros_like(slot.open)
            for c in range(len(slot.step) - 1, -1, -1):
                after = 1 if flag or slot.unsure[c] else 0
                if j + 1 == len(slots):
                    target = accepted if after else nothing
                else:
                    # The next tracker of a group takes the same choice or a later one.
                    target = table[j + 1][after][0 if slots[j + 1].opens_group else c]
                step = int(slot.step[c])
                if step < len(target):
                    rows[c, : len(target) - step] = target[step:]
                rows[c] &= slot.open[c]
                if c + 1 < len(slot.step):
                    rows[c] |= rows[c + 1]
            table[j][flag] = rows
    return table


def walk(slots: list[Slot], accepted: np.ndarray, needs_confirm: bool) -> Iterator[np.ndarray]:
    """Depth first over blocks of partial arrangements; yields complete ones, shape (k, trackers, 2)."""
    if not slots:
        return
    table = _reach(slots, accepted, needs_confirm)
    flag = 0 if needs_confirm else 1
    if not table[0][flag][0, 0]:
        return
    stack = [(np.zeros((1, 0), dtype=np.int64), np.zeros(1, np.int64), np.full(1, flag))]
    while stack:
        path, state, flags = stack.pop()
        j = path.shape[1]
        if j == len(slots):
            yield _complete(slots, path)
            continue
        slot = slots[j]
        row, c = np.nonzero(_allowed(slots, table, accepted, path, state, flags))
        grown = np.column_stack([path[row], c])
        grown_state = state[row] + slot.step[c]
        grown_flags = flags[row] | slot.unsure[c]
        for start in reversed(range(0, len(row), BLOCK)):
            part = slice(start, start + BLOCK)
            stack.append((grown[part], grown_state[part], grown_flags[part]))


def _allowed(
    slots: list[Slot],
    table: list[list[np.ndarray]],
    accepted: np.ndarray,
    path: np.ndarray,
    state: np.ndarray,
    flags: np.ndarray,
) -> np.ndarray:
    """Which choices each partial arrangement can take next; bool (k, choices + 1), the last is "empty"."""
    j = path.shape[1]
    slot = slots[j]
    index = np.arange(len(slot.step))[None, :]
    from_choice = np.zeros((len(path), 1), dtype=np.int64) if slot.opens_group else path[:, -1:]
    inside = (index >= from_choice) & slot.open[:, state].T
    after = flags[:, None] | slot.unsure[None, :]
    next_state = np.minimum(state[:, None] + slot.step[None, :], len(accepted) - 1)
    if j + 1 == len(slots):
        return inside & (after == 1) & accepted[next_state]
    entry = np.zeros_like(index) if slots[j + 1].opens_group else index
    entry = np.broadcast_to(entry, next_state.shape)
    good = table[j + 1][1][entry, next_state]
    if len(table[j + 1][0]):
        good = np.where(after == 1, good, table[j + 1][0][entry, next_state])
    return inside & good


def _complete(slots: list[Slot], path: np.ndarray) -> np.ndarray:
    """Chosen indices turned into strings and lengths; empty trackers are 0, 0."""
    out = np.zeros((len(path), len(slots), 2), dtype=np.int64)
    for j, slot in enumerate(slots):
        out[:, j, 0] = np.append(slot.choices.strings, 0)[path[:, j]]
        out[:, j, 1] = np.append(slot.choices.in_series, 0)[path[:, j]]
    return out
