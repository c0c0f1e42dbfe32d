"""Which module counts can be reached at all: sets of counts as bits of one whole number.

Bit m says whether m modules can be placed. That is less than `matcher.arrangements` knows (no number of ways,
no verdicts) and comes at a small part of the time, which is what going through neighbours of a question needs.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from catalog.records import Inverter
from matcher.arrangements import Space, distinct_lengths
from matcher.choices import ByStrings
from matcher.checks import Tracker
from matcher.options import Unit
from matcher.several import even_split, even_strings


#: Sets with more members than this are added by convolution.
_FEW = 64


def one_unit(space: Space) -> int:
    """Module counts that one inverter can take, 1 to the space's ``most``."""
    bits = 1
    for group in space.groups:
        tracker = 1 | _one_tracker(group.max_strings, space.shortest, space.longest, space.most)
        for _ in range(group.trackers):
            grown = _sums(bits, tracker, space.most)
            if grown == bits:
                break
            bits = grown
    return bits & ~1


def _one_tracker(strings: int, shortest: int, longest: int, most: int) -> int:
    """Counts up to ``most`` of up to ``strings`` strings of one length."""
    bits = 0
    for n in range(shortest, min(longest, most) + 1):
        times = min(strings, most // n)
        # A bit for every multiple of n up to the last one: a geometric series.
        bits |= ((1 << n * (times + 1)) - (1 << n)) // ((1 << n) - 1)
    return bits


def on_units(one: int, units: int, most: int) -> int:
    """Module counts up to ``most`` that some units, each with a count of ``one``, can take together."""
    bits = 1
    for _ in range(units):
        bits = _sums(bits, one, most)
    return bits


def _sums(a: int, b: int, most: int) -> int:
    """Sums of a member of each set, up to ``most``."""
    mask = (1 << (most + 1)) - 1
    a, b = a & mask, b & mask
    if a.bit_count() > b.bit_count():
        a, b = b, a
    if a.bit_count() <= _FEW:
        found = 0
        for shift in members(a):
            found |= b << shift
        return found & mask
    size = 1 << (a.bit_length() + b.bit_length() - 1).bit_length()  # powers of two are the fast ones
    product = np.fft.irfft(np.fft.rfft(_as_array(a), size) * np.fft.rfft(_as_array(b), size), size)
    packed = np.packbits(product > 0.5, bitorder="little").tobytes()
    return int.from_bytes(packed, "little") & mask


def _as_array(bits: int) -> np.ndarray:
    raw = np.frombuffer(bits.to_bytes(bits.bit_length() // 8 + 1, "little"), dtype=np.uint8)
    return np.unpackbits(raw, bitorder="little").astype(float)


def members(bits: int) -> list[int]:
    """The counts of a set, ascending."""
    if bits.bit_count() <= _FEW:
        found = []
        while bits:
            lowest = bits & -bits
            found.append(lowest.bit_length() - 1)
            bits ^= lowest
        return found
    return np.flatnonzero(_as_array(bits)).tolist()


def adds_up(one: int, total: int, units: int) -> bool:
    """Whether some units, each with a count of ``one``, can take exactly ``total`` modules together."""
    if units == 1:
        return bool(one >> total & 1)
    return _width(one, total, units, first=16, growth=8) is not None


def split(one: int, total: int, units: int) -> tuple[int, ...] | None:
    """Modules of each unit, as even as can be, each a count of ``one``; ``None`` where they do not add up.

    Counts far from the mean are left out before `even_split` goes through them: what can be done within some
    width around the mean has its evenest split within twice that width.
    """
    width = _width(one, total, units)
    if width is None:
        return None
    few, low = _around(one, total // units, 2 * width)
    return even_split([low + c for c in members(few)], total, units)


def _width(one: int, total: int, units: int, first: int = 1, growth: int = 2) -> int | None:
    """A width around the mean within which counts of ``one`` add up to the total; ``None`` where none do."""
    if total < units:
        return None
    mean, width = total // units, first
    one &= (1 << (total + 1)) - 1
    while True:
        # Counted from the low end, sums are small numbers.
        few, low = _around(one, mean, width)
        left = total - units * low
        if on_units(few, units, left) >> left & 1:
            return width
        if not one >> (mean + width + 2) and not low:
            return None
        width *= growth


def _around(bits: int, mean: int, width: int) -> tuple[int, int]:
    """The counts of a set within a width of the mean, less a number; and that number."""
    low = max(mean - width, 0)
    return (bits >> low) & ((1 << (mean + width + 2 - low)) - 1), low


def below(bits: int, count: int) -> int | None:
    """Largest count of the set that is smaller than ``count``."""
    some = bits & ((1 << count) - 1)
    return some.bit_length() - 1 if some else None


def above(bits: int, count: int) -> int | None:
    """Smallest count of the set that is larger than ``count``."""
    some = bits >> (count + 1)
    return count + 1 + (some & -some).bit_length() - 1 if some else None


def any_wiring(space: Space, inverter: Inverter, counts: Sequence[int]) -> tuple[Unit, ...]:
    """Units that take these module counts, each wired in one way with few string lengths."""
    copies: dict[int, int] = {}
    for c in counts:
        copies[c] = copies.get(c, 0) + 1
    units = []
    for modules, times in copies.items():
        like = _of_one_length(space, modules)
        if like is not None:
            units.append(Unit(times, like))
            continue
        accepted = np.zeros(space.most + 1, dtype=bool)
        accepted[modules] = True
        block = next(space.listing(accepted))
        units.append(Unit(times, _trackers(inverter, block[int(np.argmin(distinct_lengths(block)))])))
    return tuple(units)


def _of_one_length(space: Space, modules: int) -> tuple[Tracker, ...] | None:
    """Like strings, the shortest that will do, shared as evenly as the trackers take them; ``None`` where none do."""
    limits = [(g, group.max_strings) for g, group in enumerate(space.groups) for _ in range(group.trackers)]
    held = sum(strings for _, strings in limits)
    for n in range(space.shortest, min(space.longest, modules) + 1):
        strings, rest = divmod(modules, n)
        if rest or strings > held:
            continue
        # Those that take least are filled first, so that the others share what is left.
        shares = [0] * len(limits)
        by_limit = sorted(range(len(limits)), key=lambda k: limits[k][1])
        for done, k in enumerate(by_limit):
            shares[k] = min(limits[k][1], strings // (len(limits) - done))
            strings -= shares[k]
        return tuple(Tracker(limits[k][0], s, n) for k, s in enumerate(shares) if s)
    return None


def any_hosting(
    space: Space, inverter: Inverter, strings: Sequence[tuple[int, int]], units: int
) -> tuple[Unit, ...] | None:
    """Units that host exactly these (modules in series, strings) pairs, wired in one way; ``None`` where none do."""
    wanted: dict[int, int] = {}
    for length, count in strings:
        wanted[length] = wanted.get(length, 0) + count
    tally = ByStrings(tuple(sorted(wanted.items())))
    lengths, counts = zip(*sorted(wanted.items()), strict=True)
    ways = space.ways_by(tally)
    states = {share_of(tally, state): state for state, w in enumerate(ways) if w and state}
    split = even_strings(frozenset(states), lengths, counts, units)
    if split is None:
        return None
    found = []
    for share in dict.fromkeys(split):
        accepted = np.zeros(tally.states, dtype=bool)
        accepted[states[share]] = True
        block = next(space.listing(accepted, lengths=lengths, tally=tally))
        found.append(Unit(split.count(share), _trackers(inverter, block[0])))
    return tuple(found)


def share_of(tally: ByStrings, state: int) -> tuple[int, ...]:
    """Strings of each length in a state."""
    digits = []
    for _, count in tally.wanted:
        state, digit = divmod(state, count + 1)
        digits.append(digit)
    return tuple(digits)


def _trackers(inverter: Inverter, row: np.ndarray) -> tuple[Tracker, ...]:
    """The trackers in use of an arrangement, shape (trackers, 2)."""
    slots = np.repeat(np.arange(len(inverter.inputs)), [g.trackers for g in inverter.inputs])
    return tuple(Tracker(int(g), int(s), int(n)) for g, (s, n) in zip(slots, row, strict=True) if s)
