"""From an energy that is wanted to the smallest number of modules that yields it, and the chain behind it."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np

from catalog.records import Inverter, Module
from matcher.arrangements import Space
from matcher.checks import Verdict, check_option, verdict
from matcher.clipping import has_model
from matcher.columns import InverterColumns
from matcher.errors import MatcherError
from matcher.fit import Fit, Option, fit
from matcher.moduleyear import ModuleYear, PlaneYear
from matcher.options import Options
from matcher.order import Order
from matcher.request import Request
from matcher.shelf import Shelf


@dataclass(frozen=True, slots=True)
class Chain:
    """Efficiencies from the irradiation on the array to the AC side; their product is the system's.

    ``module`` is the yield of the modules at their temperatures and irradiances against the same irradiation
    at STC; ``clipping`` is ``None`` where the loss is not known.
    """

    irradiation_kwh_m2: float
    module: float
    dc_wiring: float
    inverter: float
    clipping: float | None

    @property
    def system(self) -> float:
        """Product of the chain."""
        return self.module * self.dc_wiring * self.inverter * (1.0 if self.clipping is None else self.clipping)


@dataclass(frozen=True, slots=True)
class Enough:
    """The fewest modules that yield an energy, and the option of theirs that yields most, whatever its verdict.

    ``proven`` is the same among the options that fit, which may take more modules; ``None`` where none of them
    yields the energy.
    """

    modules: int
    best: Option
    proven: Option | None = None


def fewest_modules(
    modules: Sequence[Module],
    inverters: Sequence[Inverter],
    request: Request,
    year: ModuleYear,
    yearly_kwh: float,
    plane: PlaneYear | None = None,
    shelf: Shelf | None = None,
) -> Enough:
    """Smallest number of modules with which some option yields at least ``yearly_kwh`` a year.

    Parameters
    ----------
    request
        Without a module count.
    year
        Of the modules: (classes,) or (modules, classes).
    plane, shelf
        As for `matcher.fit.fit`.

    Raises
    ------
    MatcherError
        Where no option reaches it, or no energy is known.
    """
    each = np.atleast_1d((year.power_w * year.hours).sum(axis=-1)) / 1000.0
    if not (each > 0).any():
        raise MatcherError("no energy figure: the coefficients on record do not allow a model of the modules' power")
    if not has_model(InverterColumns.of(inverters)).any():
        raise MatcherError("no energy figure: no efficiency of the inverter is on record")
    # An inverter gives no more than it takes: with fewer modules than this nothing reaches the energy.
    least = math.ceil(yearly_kwh / float(np.nanmax(each)) * (1.0 - 1e-9))
    largest = request.units[1] * request.ratio[1] * max(i.ac_power_w for i in inverters)
    ceiling = math.floor(largest / min(m.pmax_w for m in modules) * (1.0 + 1e-9))
    asked = replace(request, order=Order.ENERGY)

    def searched(low: int, high: int, every: bool = True) -> Fit:
        return fit(modules, inverters, replace(asked, counts=(low, high), every=every), year, plane, shelf)

    best = _first(searched, least, ceiling, yearly_kwh, proven=False)
    if best is None:
        raise MatcherError(
            f"no option yields {yearly_kwh:,.0f} kWh a year: that takes {least:,} module{'s' if least != 1 else ''} or more, and the"
            " ratings, the DC/AC window and the units allow none that reach it; widen --ratio or allow more --units"
        )
    if best.verdict is Verdict.FITS:
        return Enough(best.modules, best, best)
    # Where nothing fits there is no need to go through all counts for it.
    upto = _most_proven(searched(best.modules, ceiling, every=False), ceiling)
    proven = _first(searched, best.modules, upto, yearly_kwh, proven=True)
    return Enough(best.modules, best, proven)


def _most_proven(found: Fit, ceiling: int) -> int:
    """The most modules that an option which fits can have; 0 where nothing fits."""
    of = np.flatnonzero(~found.table.to_confirm)
    inverters = {int(i) for i in found.table.inverter[of]} if found.lists_inverters else {0}
    if not len(of):
        return 0
    largest = max(found.inverters[i].ac_power_w for i in inverters) * found.request.units[1] * found.request.ratio[1]
    return min(ceiling, math.floor(largest / min(m.pmax_w for m in found.modules) * (1.0 + 1e-9)))


def _first(
    searched: Callable[[int, int], Fit], least: int, most: int, yearly_kwh: float, proven: bool
) -> Option | None:
    """Of the smallest module count of which some option yields so much, the option that yields most."""
    tried, step = least - 1, _step(least)
    while tried < most:
        upto = min(tried + step, most)
        try:
            found = searched(tried + 1, upto)
        except MatcherError:
            if step == 1:
                raise
            step = max(1, step // 4)  # more options than can be listed at once
            continue
        option = _first_with(found, yearly_kwh * (1.0 - 1e-9), proven)
        if option is not None:
            return option
        tried = upto
        step = _step(tried)
    return None


def _step(modules: int) -> int:
    """How many module counts are tried at once."""
    return max(3, modules // 10)


def _first_with(found: Fit, yearly_kwh: float, proven: bool) -> Option | None:
    """The first option of `_first` in a search; with ``proven`` of those that fit only."""
    table = found.table
    kwh = np.nan_to_num(table.yearly_kwh)
    if proven:
        kwh = np.where(table.to_confirm, 0.0, kwh)
    rows = np.flatnonzero(kwh >= yearly_kwh)
    best: tuple[int, float, Options] | None = None
    if len(rows):
        fewest = int(table.modules[rows].min())
        row = int(np.argmax(np.where(table.modules == fewest, kwh, 0.0)))
        best = fewest, float(kwh[row]), table.take(slice(row, row + 1))
    search = found.search
    for begin in found.lazy:
        m, i, space = begin.args
        # Energy decides, whatever the verdict: with everything to confirm there is but one.
        space = _proven_space(space) if proven else replace(space, sure_to=0)
        for count in space.reachable:
            if count < space.fewest:
                continue
            if best is not None and count > best[0]:
                break
            row = search.best_of_count(m, i, space, count)
            most = float(np.nan_to_num(row.yearly_kwh[0]))
            if most >= yearly_kwh and (best is None or (count, -most) < (best[0], -best[1])):
                outcome = verdict(check_option(found.pair(m, i), row.wired(0)[0].trackers))
                best = count, most, replace(row, to_confirm=np.array([outcome is Verdict.TO_CONFIRM]))
    return None if best is None else found.option(best[2], 0, 1, full=False)


def _proven_space(space: Space) -> Space:
    """The arrangements of a space that leave nothing to confirm."""
    groups = tuple(replace(g, max_strings=0) if g.to_confirm else g for g in space.groups)
    shortest, longest = max(space.shortest, space.sure_from), min(space.longest, space.sure_to)
    return replace(space, groups=groups, shortest=shortest, longest=longest)


def chain(
    option: Option, module: Module, year: ModuleYear, irradiation_kwh_m2: float, dc_loss_pct: float
) -> Chain | None:
    """Efficiencies of one option; ``None`` where its energy is not known.

    Parameters
    ----------
    year
        Of the option's module, after DC losses.
    irradiation_kwh_m2
        On the array, a year.
    """
    if option.yearly_kwh is None:
        return None
    after_wiring = option.modules * year.energy_kwh
    wiring = 1.0 - dc_loss_pct / 100.0
    clipping = None if option.clipping_loss_pct is None else 1.0 - option.clipping_loss_pct / 100.0
    return Chain(
        irradiation_kwh_m2=irradiation_kwh_m2,
        module=year.energy_kwh / wiring / (module.pmax_w / 1000.0 * irradiation_kwh_m2),
        dc_wiring=wiring,
        inverter=option.yearly_kwh / (clipping or 1.0) / after_wiring,
        clipping=clipping,
    )


def sun_hours_year(vmp_hot_v: float, pmax_hot_w: float, sun_hours: float, dc_loss_pct: float) -> ModuleYear:
    """A year of so many hours of full sun a day, spread at half power over twice the hours.

    The module stays at its hot design temperature, which is on the low side of its yield; at half power an
    inverter works as it mostly does (common practice: rated efficiency near half load), and nothing is
    clipped, so that no loss can be read off this year.
    """
    power = pmax_hot_w / 2.0 * (1.0 - dc_loss_pct / 100.0)
    return ModuleYear(np.array([power]), np.array([vmp_hot_v]), np.array([2.0 * sun_hours * 365.0]),
                      shows_clipping=False)  # fmt: skip
