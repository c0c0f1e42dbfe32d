"""The module counts next to those that were asked for which something takes, where nothing takes the asked ones."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

from matcher import reach
from matcher.fit import Fit
from matcher.limits import TOLERANCE
from matcher.shared import free_space


@dataclass(frozen=True, slots=True)
class Count:
    """A module count that goes, and on what."""

    modules: int
    module: int
    inverter: int
    units: int


def nearest_counts(found: Fit) -> tuple[Count | None, Count | None]:
    """The largest count below the asked ones and the smallest above that some record takes.

    Of all records considered, inside the DC/AC window and the asked numbers of units, whatever the verdict.
    """
    counts = found.request.counts
    assert counts is not None
    smaller: Count | None = None
    larger: Count | None = None
    for m, i, units, bits in _reachable(found):
        below, above = reach.below(bits, counts[0]), reach.above(bits, counts[1])
        if below and (smaller is None or below > smaller.modules):
            smaller = Count(below, m, i, units)
        if above and (larger is None or above < larger.modules):
            larger = Count(above, m, i, units)
    return smaller, larger


def _reachable(found: Fit) -> Iterator[tuple[int, int, int, int]]:
    """Module, inverter, number of units, and as bits the counts inside the window that they take."""
    search, (low, high) = found.search, found.request.ratio
    for m in range(len(found.modules)):
        if found.points.reasons[m] is not None:
            continue
        pmax_w = float(search.points.pmax_w[m])
        for i, inverter in enumerate(found.inverters):
            each = inverter.ac_power_w / pmax_w
            first, last = search.asked(m, i).units
            most = math.floor(high * last * each * (1.0 + TOLERANCE))
            if search.shelf is not None:
                most = min(most, int(search.shelf.modules_at_most[m]))
            one = reach.one_unit(free_space(search, m, i, most))
            for units in range(first, last + 1):
                fewest = math.ceil(low * units * each * (1.0 - TOLERANCE))
                bits = reach.on_units(one, units, min(most, math.floor(high * units * each * (1.0 + TOLERANCE))))
                yield m, i, units, bits >> fewest << fewest
