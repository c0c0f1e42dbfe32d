"""Units of inverters with one tracker, worked out together: one table, however many inverters there are."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from matcher.limits import at_most
from matcher.options import Options
from matcher.search import Search


class SingleUnits:
    """What one unit of each pair takes whatever its own DC/AC ratio, and the options that are asked of these.

    Parameters
    ----------
    search : Search
    most : int
        Modules of one unit at most.
    """

    def __init__(self, search: Search, most: int) -> None:
        self._search = search
        singles = np.flatnonzero(search.inverters.single)
        self._module = np.repeat(np.arange(len(search.modules)), len(singles))
        self._inverter = np.tile(singles, len(search.modules))
        self._limits = search.limits(self._module, self._inverter)
        power_w = search.inverters.max_array_power_w[self._inverter]
        self._most = np.minimum(at_most(power_w, search.points.pmax_w[self._module]), most).tolist()
        self._strings = search.max_strings(self._module, self._inverter).tolist()
        self._shortest, self._longest = self._limits.shortest.tolist(), self._limits.longest.tolist()
        pairs = zip(self._module.tolist(), self._inverter.tolist(), strict=True)
        self._position = {pair: k for k, pair in enumerate(pairs)}
        self._asked: dict[tuple[int, int, int, int], int] = {}

    def strings(self, m: int, i: int, length: int) -> int:
        """Strings of one length [modules in series] that a unit takes at most."""
        k = self._position[m, i]
        if not self._shortest[k] <= length <= self._longest[k]:
            return 0
        return min(self._strings[k], self._most[k] // length)

    def ways(self, m: int, i: int) -> dict[int, int]:
        """Exact number of arrangements by module count, of the counts that can be reached."""
        k = self._position[m, i]
        found: dict[int, int] = {}
        for length in range(self._shortest[k], min(self._longest[k], self._most[k]) + 1):
            for strings in range(1, self.strings(m, i, length) + 1):
                found[strings * length] = found.get(strings * length, 0) + 1
        return found

    def sets_of_lengths(self, m: int, i: int, modules: int) -> list[tuple[tuple[int, ...], bool]]:
        """String lengths that a unit with so many modules can have, and whether they leave a rating to confirm."""
        k = self._position[m, i]
        limits, unsure = self._limits, bool(np.isnan(self._search.inverters.max_isc_a[i]))
        return [
            ((n,), unsure or not limits.sure_from[k] <= n <= limits.sure_to[k])
            for n in range(self._shortest[k], min(self._longest[k], modules) + 1)
            if modules % n == 0 and modules // n <= self.strings(m, i, n)
        ]

    def ask(self, m: int, i: int, modules: int, lengths: tuple[int, ...] | None = None) -> int:
        """Ask for the best option with so many modules, of one string length if given; its row in `table`."""
        k = self._position[m, i]
        shortest, longest = (self._shortest[k], self._longest[k]) if lengths is None else (lengths[0], lengths[0])
        return self._asked.setdefault((k, modules, shortest, longest), len(self._asked))

    def table(self) -> Options:
        """The options that were asked for, one row each."""
        asked = np.array(list(self._asked), dtype=np.int64).reshape(-1, 4)
        pair, modules, shortest, longest = asked.T
        values = {
            name: getattr(self._limits, name)[pair] for name in ("sure_from", "sure_to", "voltage_limit_v")
        }
        limits = replace(
            self._limits, shortest=shortest, longest=longest, fewest=modules, most=modules, **values
        )
        options, of, _ = self._search.single_trackers(self._module[pair], self._inverter[pair], limits, every=False)
        assert len(of) == len(asked), "a module count that was asked for is not reachable"
        return options.take(np.argsort(of))
