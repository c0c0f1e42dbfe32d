"""From an energy that is wanted to the smallest number of modules that yields it, and the chain behind it."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from catalog.records import Inverter, Module
from matcher.errors import MatcherError
from matcher.fit import Fit, Option, fit
from matcher.moduleyear import ModuleYear
from matcher.order import Order
from matcher.request import Request

#: Shares of the least conceivable count up to which counts are tried, one after the other.
_REACHES = (1.1, 1.3, 2.0)


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


def counts_for_energy(
    modules: Sequence[Module], inverters: Sequence[Inverter], request: Request, year: ModuleYear, yearly_kwh: float
) -> int:
    """Smallest number of modules with which some option yields at least ``yearly_kwh`` a year.

    Parameters
    ----------
    request
        Without a module count.
    year
        Of the modules: (classes,) or (modules, classes).

    Raises
    ------
    MatcherError
        Where no option reaches it.
    """
    best_dc_kwh = float(np.nanmax(year.power_w @ year.hours if year.power_w.ndim == 1
                                  else (year.power_w * year.hours).sum(axis=-1))) / 1000.0  # fmt: skip
    # An inverter gives no more than it takes: with fewer modules than this nothing reaches the energy.
    least = max(1, math.ceil(yearly_kwh / best_dc_kwh * (1.0 - 1e-9)))
    tried = least - 1
    for reach in _REACHES:
        upto = max(tried + 1, math.ceil(least * reach))
        asked = replace(request, counts=(tried + 1, upto), order=Order.ENERGY, every=True)
        enough = [m for m, kwh in _yields(fit(modules, inverters, asked, year)) if kwh >= yearly_kwh * (1.0 - 1e-9)]
        if enough:
            return min(enough)
        tried = upto
    raise MatcherError(
        f"no option yields {yearly_kwh:,.0f} kWh a year: with {least} to {tried} modules the ratings, the DC/AC"
        " window or the units leave none; widen --ratio or allow more --units"
    )


def _yields(found: Fit) -> Iterator[tuple[int, float]]:
    """Module counts and the most energy [kWh] that an option of each has."""
    table = found.table
    for modules in np.unique(table.modules).tolist():
        yield modules, float(np.nanmax(table.yearly_kwh[table.modules == modules], initial=0.0))
    if found.lazy:
        for m, i in {(m, i) for m in range(len(found.modules)) for i in np.flatnonzero(~found.search.inverters.single)}:
            space = found.search.space(m, int(i))
            for count in space.reachable:
                best = found.search.best_of_count(m, int(i), space, count)
                yield count, float(np.nan_to_num(best.yearly_kwh[0]))


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
