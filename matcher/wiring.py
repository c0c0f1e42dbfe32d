"""A wiring that is given tracker by tracker, put on the trackers of an inverter as well as can be."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence

from matcher.checks import Pair, Tracker, Verdict, check_option, verdict
from matcher.errors import MatcherError

#: What one tracker carries: strings, and modules in series.
Load = tuple[int, int]

_RANK = {Verdict.FITS: 0, Verdict.TO_CONFIRM: 1, Verdict.DOES_NOT_FIT: 2}


def place(pair: Pair, loads: Sequence[Load]) -> tuple[Tracker, ...]:
    """The trackers that carry these loads, with the best verdict and then the largest margin that can be had.

    Raises
    ------
    MatcherError
        Where the inverter has fewer trackers than there are loads.
    """
    inverter = pair.inverter
    trackers = sum(g.trackers for g in inverter.inputs)
    if len(loads) > trackers:
        words = " | ".join(f"{s}x{n}" for s, n in loads)
        raise MatcherError(
            f"{words} needs {len(loads)} trackers, and {inverter.name} has {trackers}: part strings that share a"
            " tracker in any way with commas instead (2x11,1x12)"
        )

    def rank(placed: tuple[Tracker, ...]) -> tuple[int, float]:
        checks = check_option(pair, placed)
        margins = [c.margin_pct for c in checks if c.stop and c.margin_pct is not None]
        return _RANK[verdict(checks)], -min(margins, default=0.0)

    return min(_placements(tuple(g.trackers for g in inverter.inputs), loads), key=rank)


def _placements(free: tuple[int, ...], loads: Sequence[Load]) -> Iterator[tuple[Tracker, ...]]:
    """Every way to put the loads on groups of like trackers, in the order of the groups."""
    kinds = list(Counter(loads).items())

    def spread(k: int, left: tuple[int, ...]) -> Iterator[tuple[Tracker, ...]]:
        if k == len(kinds):
            yield ()
            return
        (strings, in_series), times = kinds[k]
        for shares in _shares(times, left):
            here = tuple(Tracker(g, strings, in_series) for g, n in enumerate(shares) for _ in range(n))
            for rest in spread(k + 1, tuple(a - b for a, b in zip(left, shares, strict=True))):
                yield here + rest

    for placed in spread(0, free):
        yield tuple(sorted(placed, key=lambda t: t.inputs))


def _shares(times: int, left: tuple[int, ...]) -> Iterator[tuple[int, ...]]:
    if not left:
        if not times:
            yield ()
        return
    for here in range(min(times, left[0]), -1, -1):
        for rest in _shares(times - here, left[1:]):
            yield (here, *rest)
