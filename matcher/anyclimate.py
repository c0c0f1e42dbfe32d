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
from matcher.bench import Bench
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
    """Coldest and hottest ambient temperature [degC] of a way to wire; ``None`` where nothing known bounds it."""

    coldest_c: float | None
    hottest_c: float | None

    def site(self, like: Site) -> Site | None:
        """A site at the edges, in whole degrees inside ordinary climates; ``None`` where no climate is left."""
        low = ORDINARY_C[0] if self.coldest_c is None else max(np.ceil(self.coldest_c - 1e-6), ORDINARY_C[0])
        high = ORDINARY_C[1] if self.hottest_c is None else min(np.floor(self.hottest_c - 0.01), ORDINARY_C[1])
        return replace(like, design_low_c=float(low), design_high_c=float(high)) if low <= high else None


class AnyClimate:
    """Climate windows of one module on the inverters of a bench at `MILD_C`, whatever the site's temperatures."""

    def __init__(self, mild: Bench) -> None:
        self.mild = mild
        module, request = mild.fit.modules[0], mild.fit.request
        # Bounds in the cold are solved from a mild day, bounds in the heat from a cool one.
        site = replace(request.site, design_low_c=MILD_C, design_high_c=ORDINARY_C[0])
        points = module_points(design_points([module], site, request.rules), 0)
        self._window = ClimateWindow(module, points, site, request.rules)
        self._counts: dict[tuple[int, int, int], tuple[int, int]] = {}
        self._pairs: dict[int, list[tuple[int, int]]] = {}

    def of_lengths(self, i: int, shortest: int, longest: int) -> Window:
        """Window of any wiring with these lengths on inverter i."""
        inverter = self.mild.fit.inverters[i]
        return Window(self._window.coldest(inverter, longest), self._window.hottest(inverter, shortest))

    def widest(self, i: int, total: int, units: int) -> tuple[int, int] | None:
        """Shortest and longest string of the wiring with the widest window; ``None`` where no climate is left."""
        space = self.mild.space(i)
        if not units <= total <= units * space.most or not self._takes(i, 1, space.longest, total, units):
            return None
        for shortest, longest in self._by_width(i):
            if self._takes(i, shortest, longest, total, units):
                return shortest, longest
        return None

    def _by_width(self, i: int) -> list[tuple[int, int]]:
        """Pairs of lengths that leave a climate, the widest window first, then those that are alike."""
        if i in self._pairs:
            return self._pairs[i]
        longest = self.mild.space(i).longest
        windows = {n: self.of_lengths(i, n, n) for n in range(1, longest + 1)}
        like = self.mild.fit.request.site
        ranked = []
        for low in windows:
            for high in range(low, longest + 1):
                window = Window(windows[high].coldest_c, windows[low].hottest_c)
                site = window.site(like)
                if site is not None:
                    width = site.design_high_c - site.design_low_c
                    # What no known rating bounds is to be confirmed, and worth less than what is known to hold.
                    ranked.append((window.coldest_c is None, -width, high - low, high, low))
        self._pairs[i] = [(low, high) for *_, high, low in sorted(ranked)]
        return self._pairs[i]

    def _takes(self, i: int, shortest: int, longest: int, total: int, units: int) -> bool:
        held, bits = self._counts.get((i, shortest, longest), (-1, 0))
        if held < total:
            held = total + total // 2
            space = replace(self.mild.space(i), shortest=shortest, longest=longest, fewest=1)
            bits = reach.one_unit(replace(space, most=max(0, min(space.most, held))))
            self._counts[i, shortest, longest] = (held, bits)
        return bool((bits if units == 1 else reach.on_units(bits, units, total)) >> total & 1)
