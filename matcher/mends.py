"""What is to be changed where a bundle is not sound: the smallest changes that mend it."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from math import log

from catalog.records import Inverter
from matcher.bench import Bench

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
    bench: Bench, i: int, total: int, units: int, candidates: Iterable[int] = (), strings: bool = False
) -> list[Mend]:
    """Changes of one thing each that make ``total`` modules on ``units`` of inverter i sound, smallest first.

    Parameters
    ----------
    candidates
        Inverters that may take its place, the nearest first (see `nearest_inverters`).
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
    unsure: int | None = None
    module_w = float(bench.fit.points.pmax_w[0])
    for other in candidates:
        too_small = total * module_w > HIGHEST_RATIO * units * _power(bench, other)
        if too_small or not bench.takes(other, total, units):
            continue
        size = abs(log(_power(bench, other) / _power(bench, i)))
        add("inverter", size, total, units, other)
        if found[-1].verdict == "fits":
            if unsure is not None:
                del found[unsure]
            break
        if unsure is not None:
            found.pop()
        else:
            unsure = len(found) - 1
    return sorted(found, key=lambda m: m.size)


def _power(bench: Bench, i: int) -> float:
    return bench.fit.inverters[i].ac_power_w


def nearest_inverters(
    inverters: tuple[Inverter, ...], i: int, tried: int = TRIED, only: Callable[[int], bool] = lambda _: True
) -> list[int]:
    """Inverters next to inverter i in AC power, nearest first; of the same power those of its maker first."""
    own = inverters[i]

    def rank(j: int) -> tuple[float, bool, str]:
        return abs(log(inverters[j].ac_power_w / own.ac_power_w)), inverters[j].maker != own.maker, inverters[j].name

    near = [
        j for j, other in enumerate(inverters)
        if j != i and 1 / NEAR_POWER <= other.ac_power_w / own.ac_power_w <= NEAR_POWER and only(j)
    ]  # fmt: skip
    return sorted(near, key=rank)[:tried]
