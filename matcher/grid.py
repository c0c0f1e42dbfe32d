"""Every module of a list against every inverter of another: which go together, for how many modules, how well."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from catalog.records import Inverter, Module
from matcher import reach
from matcher.arrangements import Space
from matcher.checks import Verdict
from matcher.columns import InverterColumns
from matcher.electrical import design_points
from matcher.fit import Fit, Option, Totals
from matcher.moduleyear import ModuleYear, PlaneYear
from matcher.multipairs import MultiPairs
from matcher.near import Rejection
from matcher.options import join
from matcher.request import Request
from matcher.search import Search
from matcher.shelf import Shelf


@dataclass(frozen=True, slots=True)
class GridPair:
    """A module and an inverter that go together.

    ``fewest``, ``most`` and ``counts`` tell the module counts of one inverter that have the verdict of ``best``: the
    lowest, the highest, and how many there are. ``best`` is the first option in the order of the request.
    """

    module: int
    inverter: int
    verdict: Verdict
    fewest: int
    most: int
    counts: int
    best: Option


@dataclass(eq=False)
class Grid:
    """What goes together, by (module, inverter), and what goes with nothing."""

    fit: Fit
    pairs: dict[tuple[int, int], GridPair]

    @property
    def modules(self) -> tuple[Module, ...]:
        """Rows of the grid."""
        return self.fit.modules

    @property
    def inverters(self) -> tuple[Inverter, ...]:
        """Columns of the grid."""
        return self.fit.inverters

    @cached_property
    def lone_modules(self) -> list[tuple[int, int, Rejection]]:
        """Modules that go with no inverter: index, the inverter that comes nearest, and what stops the two."""
        paired = {m for m, _ in self.pairs}
        return [self._nearest(m, None) for m in range(len(self.modules)) if m not in paired]

    @cached_property
    def lone_inverters(self) -> list[tuple[int, int, Rejection]]:
        """Inverters that go with no module: index, the module that comes nearest, and what stops the two."""
        paired = {i for _, i in self.pairs}
        return [self._nearest(None, i) for i in range(len(self.inverters)) if i not in paired]

    def _nearest(self, m: int | None, i: int | None) -> tuple[int, int, Rejection]:
        others = range(len(self.inverters if i is None else self.modules))
        found = [(o, self.fit.rejection(m if m is not None else o, i if i is not None else o)) for o in others]
        other, reason = min(found, key=lambda entry: entry[1].distance)
        return (m if m is not None else i), other, reason  # type: ignore[return-value]


def grid(
    modules: Sequence[Module],
    inverters: Sequence[Inverter],
    request: Request,
    year: ModuleYear | None = None,
    plane: PlaneYear | None = None,
    shelf: Shelf | None = None,
) -> Grid:
    """Try every module on one unit of every inverter.

    Parameters
    ----------
    request : Request
        Site, rules and wishes; for one unit, without strings.
    year : ModuleYear, optional
        Condensed years of all modules, (modules, classes).
    plane, shelf
        As of `matcher.fit.fit`.
    """
    points = design_points(modules, request.site, request.rules, plane)
    search = Search(tuple(modules), InverterColumns.of(inverters), request, points, year, shelf)
    singles = np.flatnonzero(search.inverters.single)
    m, i = np.repeat(np.arange(len(modules)), len(singles)), np.tile(singles, len(modules))
    table, _, sizes = search.single_trackers(m, i, search.limits(m, i), every=False)
    several = np.flatnonzero(~search.inverters.single)
    m, i = np.repeat(np.arange(len(modules)), len(several)), np.tile(several, len(modules))
    tables, some = MultiPairs(search, m, i).bests()
    parts, arrangements = [table, *tables], int(sizes.sum()) + sum(some)
    table = join(parts)
    table = table.take(search.rank(table))
    found = np.isin(np.arange(len(inverters)), table.inverter)
    totals = Totals(len(inverters), int(found.sum()), arrangements)
    fit = Fit(tuple(modules), tuple(inverters), request, points, year, totals, True, found, table, [], search)
    pairs = {}
    for row in range(len(table)):
        option = fit.option(table, row, row + 1)
        counts = _counts(search.space(option.module, option.inverter), option.verdict)
        pairs[option.module, option.inverter] = GridPair(
            option.module, option.inverter, option.verdict, counts[0], counts[-1], len(counts), option
        )
    return Grid(fit, pairs)


def _counts(space: Space, verdict: Verdict) -> list[int]:
    """Module counts of a space that have a verdict, in which there are some."""
    every = reach.members(reach.one_unit(space) >> space.fewest << space.fewest)
    if verdict is not Verdict.FITS:
        return every
    groups = tuple(g for g in space.groups if not g.to_confirm)
    shortest, longest = max(space.shortest, space.sure_from), min(space.longest, space.sure_to)
    sure = replace(space, groups=groups, shortest=shortest, longest=longest)
    return reach.members(reach.one_unit(sure) >> space.fewest << space.fewest)
