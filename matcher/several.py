"""One array on several inverters of one type: split as evenly as what each can take allows."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache

import numpy as np

from matcher.options import Options


def even_split(reachable: Sequence[int], total: int, units: int) -> tuple[int, ...] | None:
    """Module counts of the units, falling, that add up to ``total`` and differ as little as can be.

    Every count is one of ``reachable`` (ascending). ``None`` where they cannot add up to the total.
    """
    counts = [c for c in reachable if c <= total]
    whole, rest = divmod(total, units)
    ideal = [whole + 1] * rest + [whole] * (units - rest)
    if set(ideal) <= set(counts):
        return tuple(ideal)
    if not _sums(counts, total, units):
        return None
    known = set(counts)
    lows = [c for c in counts if c * units <= total]
    for spread in range(counts[-1] - counts[0] + 1):
        for low in lows:
            if (low + spread) * units < total or low + spread not in known:
                continue
            found = _sums([c for c in counts if low <= c <= low + spread], total, units)
            if found:
                return found
    return None


def _sums(counts: Sequence[int], total: int, units: int) -> tuple[int, ...] | None:
    """Some ``units`` counts, with repetition, that add up to ``total``, falling; ``None`` where there are none.

    Bit m of ``after[k]`` says whether k counts can add up to m.
    """
    if not counts:
        return None
    mask = (1 << (total + 1)) - 1
    after = [1]
    for _ in range(units):
        reached = 0
        for c in counts:
            reached |= after[-1] << c
        after.append(reached & mask)
    if not after[units] >> total & 1:
        return None
    chosen, left = [], total
    middle = total / units
    for k in range(units, 0, -1):
        for c in sorted(counts, key=lambda c: abs(c - middle)):
            if c <= left and after[k - 1] >> (left - c) & 1:
                chosen.append(c)
                left -= c
                break
    return tuple(sorted(chosen, reverse=True))


def even_strings(
    hosted: frozenset[tuple[int, ...]], lengths: tuple[int, ...], wanted: tuple[int, ...], units: int
) -> tuple[tuple[int, ...], ...] | None:
    """Strings of each length for each unit, that add up to ``wanted`` and whose module counts differ little.

    Parameters
    ----------
    hosted
        What one unit can host: strings of each length.
    lengths
        Modules in series of each length.
    wanted
        Strings of each length that all units together host.
    """

    def modules(share: tuple[int, ...]) -> int:
        return sum(n * s for n, s in zip(lengths, share, strict=True))

    @cache
    def split(left: tuple[int, ...], count: int) -> tuple[tuple[int, ...], ...] | None:
        if count == 1:
            return (left,) if left in hosted else None
        aim = modules(left) / count
        shares = (s for s in hosted if all(a <= b for a, b in zip(s, left, strict=True)))
        for share in sorted(shares, key=lambda s: (abs(modules(s) - aim), s)):
            rest = split(tuple(b - a for a, b in zip(share, left, strict=True)), count - 1)
            if rest is not None:
                return (share, *rest)
        return None

    found = split(wanted, units)
    return None if found is None else tuple(sorted(found, key=modules, reverse=True))


def together(rows: Options, copies: Sequence[int], pmax_w: float, ac_power_w: float) -> Options:
    """One option of several units from the options of its different units.

    Parameters
    ----------
    rows : Options
        One row per different unit, k of them.
    copies : sequence of int
        How many units are wired like each row.
    """
    times = np.asarray(copies)
    units = int(times.sum())
    modules = int((rows.modules * times).sum())
    kwh = rows.yearly_kwh * times
    # What each unit would deliver without any limit, from which the loss of the whole follows.
    unlimited = kwh / (1.0 - rows.clipping_pct / 100.0)
    whole = unlimited.sum()  # NaN, and with it the losses, where one of them is not known
    current = (unlimited * rows.current_clipping_pct).sum() / whole
    lengths = len(np.unique(rows.in_series[rows.in_series > 0]))
    width = rows.strings.shape[1]

    def flat(a: np.ndarray) -> np.ndarray:
        return a.reshape(1, -1)

    return Options(
        module=rows.module[:1],
        inverter=rows.inverter[:1],
        units=np.array([units], dtype=np.int32),
        modules=np.array([modules]),
        ratio=np.array([modules * pmax_w / (units * ac_power_w)]),
        to_confirm=np.array([bool(rows.to_confirm.any())]),
        clipping_pct=np.array([(1.0 - kwh.sum() / whole) * 100.0]),
        current_clipping_pct=np.array([current]),
        yearly_kwh=np.array([kwh.sum()]),
        lengths=np.array([lengths]),
        margin_pct=np.array([rows.margin_pct.min()]),
        strings=flat(rows.strings),
        in_series=flat(rows.in_series),
        inputs=flat(rows.inputs),
        copies=flat(np.repeat(times.astype(np.int32), width)),
        kind=flat(np.repeat(np.arange(len(times), dtype=np.int16), width)),
    )
