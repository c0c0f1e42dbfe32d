"""From an energy that is wanted to the smallest number of modules that yields it, and the chain behind it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from catalog.records import Inverter, Module
from matcher.checks import Verdict, check_option, verdict
from matcher.clipping import has_model
from matcher.columns import InverterColumns
from matcher.errors import MatcherError
from matcher.fit import Fit, Option, fit
from matcher.moduleyear import ModuleYear, PlaneYear
from matcher.options import Options
from matcher.order import Order
from matcher.request import Request


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
    """The fewest modules that yield an energy, and the option of theirs that yields most, whatever its verdict."""

    modules: int
    best: Option


def fewest_modules(
    modules: Sequence[Module],
    inverters: Sequence[Inverter],
    request: Request,
    year: ModuleYear,
    yearly_kwh: float,
    plane: PlaneYear | None = None,
) -> Enough:
    """Smallest number of modules with which some option yields at least ``yearly_kwh`` a year.

    Parameters
    ----------
    request
        Without a module count.
    year
        Of the modules: (classes,) or (modules, classes).
    plane
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
    tried = least - 1
    step = _step(least)
    while tried < ceiling:
        upto = min(tried + step, ceiling)
        asked = replace(request, counts=(tried + 1, upto), order=Order.ENERGY, every=True)
        try:
            found = fit(modules, inverters, asked, year, plane)
        except MatcherError:
            if step == 1:
                raise
            step = max(1, step // 4)  # more options than can be listed at once
            continue
        enough = _first_with(found, yearly_kwh * (1.0 - 1e-9))
        if enough is not None:
            return enough
        tried = upto
        step = _step(tried)
    raise MatcherError(
        f"no option yields {yearly_kwh:,.0f} kWh a year: that takes {least:,} modules or more, and the ratings, the"
        " DC/AC window and the units allow none that reach it; widen --ratio or allow more --units"
    )


def _step(modules: int) -> int:
    """How many module counts are tried at once."""
    return max(3, modules // 10)


def _first_with(found: Fit, yearly_kwh: float) -> Enough | None:
    """The smallest module count of a search of which some option yields so much."""
    table = found.table
    kwh = np.nan_to_num(table.yearly_kwh)
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
        for count in space.reachable:
            if best is not None and count > best[0]:
                break
            row = search.best_of_count(m, i, replace(space, sure_to=0), count)
            most = float(np.nan_to_num(row.yearly_kwh[0]))
            if most >= yearly_kwh and (best is None or (count, -most) < (best[0], -best[1])):
                outcome = verdict(check_option(found.pair(m, i), row.wired(0)[0].trackers))
                best = count, most, replace(row, to_confirm=np.array([outcome is Verdict.TO_CONFIRM]))
    return None if best is None else Enough(best[0], found.option(best[2], 0, 1, full=False))


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
