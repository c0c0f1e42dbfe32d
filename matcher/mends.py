"""What is to be changed where a bundle is not sound: the smallest changes that mend it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import log

import numpy as np

from matcher.bench import Bench
from matcher.checks import Verdict
from matcher.columns import InverterColumns

#: Inverters next in AC power that are tried in search of one that takes the bundle.
TRIED = 60

#: Factor of AC power within which an inverter counts as one that could take the place of another.
NEAR_POWER = 2.0


#: DC/AC ratio up to which another inverter is offered: one that is far too small mends nothing.
HIGHEST_RATIO = 1.5


@dataclass(frozen=True, slots=True)
class Mend:
    """One change that makes a bundle sound.

    ``kind`` is ``count``, ``strings``, ``units`` or ``inverter``; the one that is named differs from the bundle.
    ``size`` is the change as a share of what was there, which orders the mends.
    """

    kind: str
    size: float
    verdict: str
    modules: int
    units: int
    inverter: int
    label: str


def mends(
    bench: Bench, i: int, total: int, units: int, candidates: np.ndarray, strings: bool = False
) -> list[Mend]:
    """Changes of one thing each that make ``total`` modules on ``units`` of inverter i sound, smallest first.

    Parameters
    ----------
    candidates
        Inverters that may take its place, the nearest first (see `Neighbours`).
    strings
        The bundle's strings were given, so other strings may mend it.
    """
    found = []

    def add(kind: str, size: float, modules: int, k: int, inverter: int) -> bool:
        option = bench.best(inverter, modules, k)
        if option is None:
            return False
        found.append(Mend(kind, size, str(option.verdict), modules, k, inverter, option.label))
        return True

    if strings:
        add("strings", 0.0, total, units, i)
    for count in bench.around(i, total, units):
        if count:
            add("count", abs(count - total) / total, count, units, i)
    others = (k for k in range(1, max(2 * units, units + 4) + 1) if k != units)
    for k in sorted(others, key=lambda k: (abs(k - units), -k)):
        if bench.takes(i, total, k) and add("units", abs(k - units) / units, total, k, i):
            break
    other = _in_its_place(bench, total, units, candidates)
    if other is not None:
        add("inverter", abs(log(_power(bench, other) / _power(bench, i))), total, units, other)
    return sorted(found, key=lambda m: m.size)


def _power(bench: Bench, i: int) -> float:
    return bench.fit.inverters[i].ac_power_w


def _in_its_place(bench: Bench, total: int, units: int, candidates: np.ndarray) -> int | None:
    """The first inverter on which the bundle fits, else the first on which it would once a value is confirmed."""
    columns = bench.fit.search.inverters
    module_w = float(bench.fit.points.pmax_w[0])
    large_enough = candidates[total * module_w <= HIGHEST_RATIO * units * columns.ac_power_w[candidates]]
    may_take, may_fit = bench.likely(large_enough, total, units)
    unsure = None
    for other, sure in zip(large_enough[may_take].tolist(), may_fit[may_take].tolist(), strict=True):
        if unsure is not None and not sure:
            continue
        outcome = bench.outcome(other, total, units)
        if outcome is Verdict.FITS:
            return other
        if outcome is not None and unsure is None:
            unsure = other
    return unsure


class Neighbours:
    """Inverters next to others in AC power."""

    def __init__(self, columns: InverterColumns, available: Sequence[bool] | None = None) -> None:
        self._power = np.log(columns.ac_power_w)
        self._makers = np.unique([i.maker for i in columns.records], return_inverse=True)[1]
        self._names = np.unique([i.name for i in columns.records], return_inverse=True)[1]
        self._available = np.ones(len(self._power), dtype=bool) if available is None else np.array(available, dtype=bool)

    def of(self, i: int, tried: int = TRIED) -> np.ndarray:
        """Inverters next to inverter i in AC power, nearest first; of the same power those of its maker first."""
        off = np.abs(self._power - self._power[i])
        near = self._available & (off <= log(NEAR_POWER) + 1e-12)
        near[i] = False
        near = np.flatnonzero(near)
        order = np.lexsort((self._names[near], self._makers[near] != self._makers[i], off[near]))
        return near[order[:tried]]
