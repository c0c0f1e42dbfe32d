"""One array on several inverters of one type: split as evenly as what each can take allows."""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache

import numpy as np

from matcher.options import Options


def even_split(reachable: Sequence[int], total: int, units: int) -> tuple[int, ...] | None:
    """Module counts of the units, falling, that add up to ``total`` and differ as little as can be.

    Every count is one of ``reachable``. ``None`` where they cannot add up to the total.
    """
    known = {c for c in reachable if c <= total}
    whole, rest = divmod(total, units)
    ideal = (whole + 1,) * rest + (whole,) * (units - rest)
    if known.issuperset(ideal):
        return ideal
    split = _even_strings(frozenset((c,) for c in known), (1,), (total,), units)
    return None if split is None else tuple(c for (c,) in split)


def even_strings(
    hosted: frozenset[tuple[int, ...]], lengths: tuple[int, ...], wanted: tuple[int, ...], units: int
) -> tuple[tuple[int, ...], ...] | None:
    """Strings of each length for each unit, that add up to ``wanted``; their module counts differ as little as can be.

    Parameters
    ----------
    hosted
        What one unit can host: strings of each length.
    lengths
        Modules in series of each length.
    wanted
        Strings of each length that all units together host.
    """
    return _even_strings(hosted, lengths, wanted, units)


@lru_cache(maxsize=4096)
def _even_strings(
    hosted: frozenset[tuple[int, ...]], lengths: tuple[int, ...], wanted: tuple[int, ...], units: int
) -> tuple[tuple[int, ...], ...] | None:
    """As `even_strings`; kept, because inverters by the hundreds host the same."""
    shares = [s for s in hosted if all(a <= b for a, b in zip(s, wanted, strict=True))]
    modules = {s: sum(n * k for n, k in zip(lengths, s, strict=True)) for s in shares}
    mean = sum(n * k for n, k in zip(lengths, wanted, strict=True)) / units
    sizes = sorted(set(modules.values()))

    def within(low: int, high: int) -> tuple[tuple[int, ...], ...] | None:
        some = [s for s in shares if low <= modules[s] <= high]
        return _adding_up(some, wanted, units)

    lows = [v for v in sizes if v <= mean]
    highs = [v for v in sizes if v >= mean]
    if not lows or not highs or (found := within(sizes[0], sizes[-1])) is None:
        return None
    # From the narrowest window of module counts around the mean to lower and lower ones.
    spread = sizes[-1] - sizes[0]
    for low in reversed(lows):
        # The first low has no bound yet and widens; each later one has to beat what is found.
        inside = [v for v in highs if v - low < spread]
        if low == lows[-1]:
            better = next((b for high in inside if (b := within(low, high)) is not None), None)
        else:
            better = within(low, inside[-1]) if inside else None
        while better is not None:
            found = better
            taken = [modules[s] for s in found]
            spread = max(taken) - min(taken)
            inside = [v for v in highs if v - low < spread]
            better = within(low, inside[-1]) if inside else None
    return tuple(sorted(found, key=lambda s: modules[s], reverse=True))


def _adding_up(
    shares: Sequence[tuple[int, ...]], wanted: tuple[int, ...], units: int
) -> tuple[tuple[int, ...], ...] | None:
    """Some ``units`` shares, with repetition, that add up to ``wanted``; ``None`` where there are none.

    A sum of shares is a bit of one whole number: the place of the sum in a mixed radix with room for twice
    what is wanted of each length, so that adding one share never carries. Bit of ``after[k]``: k shares can
    add up to it.
    """
    strides = [1]
    for w in wanted:
        strides.append(strides[-1] * (2 * w + 1))

    def place(share: Sequence[int]) -> int:
        return sum(k * stride for k, stride in zip(share, strides, strict=False))

    allowed = 1
    for w, stride in zip(wanted, strides, strict=False):
        # Every number of strings of this length up to the wanted one: a geometric series.
        allowed *= ((1 << stride * (w + 1)) - 1) // ((1 << stride) - 1)
    places = [place(s) for s in shares]
    after = [1]
    for _ in range(units):
        reached = 0
        for p in places:
            reached |= after[-1] << p
        after.append(reached & allowed)
    if not after[units] >> place(wanted) & 1:
        return None
    chosen: list[tuple[int, ...]] = []
    left = wanted
    for k in range(units, 0, -1):
        # Nearest to an equal part of what is left, so that units are alike where they can be.
        chosen.append(
            min(
                (
                    s
                    for s, p in zip(shares, places, strict=True)
                    if all(a <= b for a, b in zip(s, left, strict=True)) and after[k - 1] >> (place(left) - p) & 1
                ),
                key=lambda s: (sum(abs(k * a - b) for a, b in zip(s, left, strict=True)), s),
            )
        )
        left = tuple(b - a for a, b in zip(chosen[-1], left, strict=True))
    return tuple(chosen)


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
        face=flat(rows.face),
        kind=flat(np.repeat(np.arange(len(times), dtype=np.int16), width)),
    )
