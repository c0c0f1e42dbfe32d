"""A module count on an inverter where no site is given: the climate is solved for.

Of all ways to wire the count, the one is looked for that holds over the widest window of ambient temperatures.
A window depends on the shortest and the longest string only, so it is enough to go through pairs of lengths,
widest window first, until one is found between which the count can be wired.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from catalog.records import Site
from matcher import reach
from matcher.bench import Bench, on_one_tracker
from matcher.checks import ModulePoints
from matcher.climate import ClimateWindow
from matcher.electrical import design_points
from matcher.fit import module_points

#: Ambient temperatures [degC] between which people build (common practice, no source): a wider window is worth
#: no more, and what holds throughout is said to hold from the one to the other.
ORDINARY_C = (-40.0, 50.0)

#: Both design temperatures of the bench that a search over climates starts from [degC]: no place on record stays
#: warmer all year, so strings that are too long there are too long anywhere.
MILD_C = 25.0


@dataclass(frozen=True, slots=True)
class Window:
    """Coldest and hottest ambient temperature [degC] of a way to wire; ``None`` where nothing known bounds it.

    An end is open where a value that is not on record may bound it more narrowly. ``by_hours``: the cold voltage
    comes from hourly weather, and no temperature stands for the cold end.
    """

    coldest_c: float | None
    hottest_c: float | None
    cold_open: bool = False
    hot_open: bool = False
    by_hours: bool = False

    def site(self, like: Site) -> Site | None:
        """A site at the edges, in whole degrees inside ordinary climates; ``None`` where no climate is left."""
        low = ORDINARY_C[0] if self.coldest_c is None else max(np.ceil(self.coldest_c - 1e-6), ORDINARY_C[0])
        high = ORDINARY_C[1] if self.hottest_c is None else min(np.floor(self.hottest_c - 0.01), ORDINARY_C[1])
        return replace(like, design_low_c=float(low), design_high_c=float(high)) if low <= high else None


def cool(mild: Site) -> Site:
    """Where windows are solved: bounds in the cold from a mild day, bounds in the heat from a cool one."""
    return replace(mild, design_low_c=MILD_C, design_high_c=ORDINARY_C[0])


class AnyClimate:
    """Climate windows of one module on the inverters of a bench at `MILD_C`, whatever the site's temperatures.

    ``points`` are the design values at the `cool` site, where they have been worked out with those of others.
    """

    def __init__(self, mild: Bench, points: ModulePoints | None = None) -> None:
        self.mild = mild
        module, request = mild.fit.modules[0], mild.fit.request
        site = cool(request.site)
        if points is None:
            points = module_points(design_points([module], site, request.rules), 0)
        self._window = ClimateWindow(module, points, site, request.rules)
        self._counts: dict[tuple[int, int, int], tuple[int, int]] = {}
        self._pairs: dict[int, list[tuple[int, int]]] = {}

    def of_lengths(self, i: int, shortest: int, longest: int) -> Window:
        """Window of any wiring with these lengths on inverter i."""
        inverter = self.mild.fit.inverters[i]
        return Window(
            self._window.coldest(inverter, longest), self._window.hottest(inverter, shortest),
            self._window.cold_is_open(inverter, longest), self._window.heat_is_open(inverter),
        )  # fmt: skip

    def widest(self, i: int, total: int, units: int) -> tuple[int, int] | None:
        """Shortest and longest string of the wiring with the widest window; ``None`` where no climate is left."""
        # Where it is cooler, strings may be shorter than those of the mild day.
        space = replace(self.mild.space(i), shortest=1)
        if not units <= total <= units * space.most:
            return None
        if units == 1 and self.mild.fit.search.inverters.single[i]:
            # One tracker takes strings of one length: counting through sets is not needed.
            alone = [n for _, n, _ in on_one_tracker(space, total)]
            return next((p for p in self._by_width(i) if any(p[0] <= n <= p[1] for n in alone)), None) if alone else None
        if not self._takes(i, 1, space.longest, total, units):
            return None
        for shortest, longest in self._by_width(i):
            if self._takes(i, shortest, longest, total, units):
                return shortest, longest
        return None

    def _by_width(self, i: int) -> list[tuple[int, int]]:
        """Pairs of lengths that leave a climate, the widest window first, then those that are alike."""
        if i in self._pairs:
            return self._pairs[i]
        inverter, lengths = self.mild.fit.inverters[i], range(1, self.mild.space(i).longest + 1)
        unbounded = np.array([not self._window.known_maxima(inverter, n) for n in lengths], dtype=bool)
        windows = [self.of_lengths(i, n, n) for n in lengths]
        cold = np.array([w.coldest_c for w in windows], dtype=float)
        hot = np.array([w.hottest_c for w in windows], dtype=float)
        low = np.fmax(np.ceil(cold - 1e-6), ORDINARY_C[0])
        high = np.fmin(np.floor(hot - 0.01), ORDINARY_C[1])
        short, long = np.triu_indices(len(windows))
        width = high[short] - low[long]
        # What no known rating bounds is to be confirmed, and worth less than what is known to hold.
        order = np.lexsort((short, long, long - short, -width, unbounded[long]))
        order = order[width[order] >= 0]
        self._pairs[i] = list(zip((short[order] + 1).tolist(), (long[order] + 1).tolist(), strict=True))
        return self._pairs[i]

    def _takes(self, i: int, shortest: int, longest: int, total: int, units: int) -> bool:
        held, bits = self._counts.get((i, shortest, longest), (-1, 0))
        if held < total:
            held = total + total // 2
            space = replace(self.mild.space(i), shortest=shortest, longest=longest, fewest=1)
            bits = reach.one_unit(replace(space, most=max(0, min(space.most, held))))
            self._counts[i, shortest, longest] = (held, bits)
        return reach.adds_up(bits, total, units)
