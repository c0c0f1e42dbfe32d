"""The best option of every module on every inverter.

The work on one pair is that of `matcher.search`. What many pairs have in common is done once: records that
differ in nothing but their names are twins, and in the public tables most records have some.
"""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from catalog.records import Inverter, Module, specs
from matcher.columns import InverterColumns
from matcher.electrical import design_points, diodes_of
from matcher.moduleyear import ModuleYear, PlaneYear, module_years
from matcher.multipairs import MultiPairs
from matcher.options import Options, join
from matcher.request import Request
from matcher.search import Search

#: Pairs gone through at once; bounds the memory.
_PAIRS = 20_000


@dataclass(frozen=True, slots=True, eq=False)
class Bests:
    """Best options of pairs: ``options`` of unlike pairs, and which of them belongs to which pair.

    ``rows`` has shape (modules, inverters); -1 where a pair has no option. The indices inside ``options``
    are those of one of the twins.
    """

    options: Options
    rows: np.ndarray


@dataclass(frozen=True, slots=True, eq=False)
class Takers:
    """The inverters of a sweep: those that differ as columns, and which of them each one is, shape (n,)."""

    distinct: InverterColumns
    of: np.ndarray

    @classmethod
    def of_records(cls, inverters: Sequence[Inverter]) -> Takers:
        """Of a list of inverters."""
        of, firsts = _twins(inverters)
        return cls(InverterColumns.of([inverters[k] for k in firsts]), of)


def years_of(modules: Sequence[Module], plane: PlaneYear, dc_loss_pct: float) -> ModuleYear:
    """Years of several modules on one condensed plane, shape (modules, classes); NaN where there is no model."""
    year = module_years(diodes_of(modules), plane, dc_loss_pct)
    # Without a model there is no power, which is not the same as none.
    unknown = ~(year.power_w > 0).any(axis=1)
    year.power_w[unknown] = np.nan
    return year


def bests(
    modules: Sequence[Module],
    inverters: Takers,
    request: Request,
    plane: PlaneYear | None,
    dc_loss_pct: float,
    hourly: PlaneYear | None = None,
) -> Bests:
    """The first option of every pair in the order of the request, one unit each.

    Parameters
    ----------
    modules
        Of one part of the sweep: memory grows with them.
    plane
        Condensed year on the site's array; without it there is no clipping figure.
    dc_loss_pct
        DC losses from the modules to the inverter [% of power].
    hourly
        The year on the site's array hour by hour, for rule sets that take the cold voltage from it.
    """
    request = replace(request, every=False)
    module_of, distinct_modules = _twins(modules)
    modules = [modules[k] for k in distinct_modules]
    columns = inverters.distinct
    year = None if plane is None else years_of(modules, plane, dc_loss_pct)
    points = design_points(modules, request.site, request.rules, hourly)
    search = Search(tuple(modules), columns, request, points, year)

    tables: list[Options] = []
    rows = np.full((len(modules), len(columns.records)), -1, dtype=np.int64)

    def add(options: Options) -> None:
        rows[options.module, options.inverter] = np.arange(len(options)) + sum(len(t) for t in tables)
        tables.append(options)

    single, several = np.flatnonzero(columns.single), np.flatnonzero(~columns.single)
    step = max(1, _PAIRS // max(1, len(single)))
    for first in range(0, len(modules), step):
        lines = np.arange(first, min(first + step, len(modules)))
        m, i = np.repeat(lines, len(single)), np.tile(single, len(lines))
        add(search.single_trackers(m, i, search.limits(m, i), every=False)[0])
    m, i = np.repeat(np.arange(len(modules)), len(several)), np.tile(several, len(modules))
    for table in MultiPairs(search, m, i).bests()[0]:
        add(table)
    return Bests(join(tables), rows[module_of[:, None], inverters.of[None, :]])


def _twins(records: Sequence[Module] | Sequence[Inverter]) -> tuple[np.ndarray, list[int]]:
    """Which distinct record each record is, shape (n,), and a record of each kind: alike in all but the names."""
    names = [name for name in specs(type(records[0])) if name not in ("maker", "model")]
    names += ["inputs"] * isinstance(records[0], Inverter)
    seen: dict[Hashable, int] = {}
    firsts: list[int] = []
    of = np.empty(len(records), dtype=np.int64)
    for k, record in enumerate(records):
        number = seen.setdefault(tuple(getattr(record, name) for name in names), len(firsts))
        if number == len(firsts):
            firsts.append(k)
        of[k] = number
    return of, firsts
