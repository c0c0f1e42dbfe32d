"""How energy, clipping and worth run with the number of modules on one inverter.

No tariff is assumed: what a kWh is worth, whether surplus is paid and at what price are the user's to say.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from matcher.fit import Fit, Option
from matcher.order import Order


@dataclass(frozen=True, slots=True)
class Worth:
    """What energy and modules cost, in one currency.

    Attributes
    ----------
    energy_price
        Worth of a kWh that is used on the spot or netted against purchases.
    own_use_kwh
        Yearly energy that is; ``None``: all of it (net metering without end).
    export_price
        Worth of a kWh beyond it, 0 where surplus is not paid.
    module_price
        Price of one module more, with what belongs to it.
    years
        Over which a module must earn its price.
    """

    energy_price: float
    own_use_kwh: float | None = None
    export_price: float = 0.0
    module_price: float | None = None
    years: float = 20.0

    def yearly(self, kwh: float) -> float:
        """Worth of a year's energy."""
        own = kwh if self.own_use_kwh is None else min(kwh, self.own_use_kwh)
        return own * self.energy_price + (kwh - own) * self.export_price


@dataclass(frozen=True, slots=True)
class Step:
    """The best option of one module count, and what it brings over the count before.

    ``added_kwh`` and ``added_worth`` are per year; ``net`` is the worth over the years less the price of the
    added modules, ``None`` where no price says so.
    """

    option: Option
    added_modules: int
    added_kwh: float | None
    worth: float | None
    added_worth: float | None
    net: float | None

    @property
    def pays(self) -> bool | None:
        """Whether the added modules earn their price."""
        return None if self.net is None else self.net >= 0


def growth(fit: Fit, worth: Worth | None = None) -> list[Step]:
    """Steps of a pair by rising module count; of each count the best option, by verdict, then energy.

    Parameters
    ----------
    fit : Fit
        Of one module and one inverter, on one unit.
    worth : Worth, optional
        Prices; without them there is no worth.
    """
    steps: list[Step] = []
    modules, last = 0, 0.0
    for option in _best_of_each_count(fit):
        kwh = option.yearly_kwh
        more = option.modules - modules
        added = value = gain = net = None
        if kwh is not None:
            added = kwh - last
            if worth is not None:
                value = worth.yearly(kwh)
                gain = value - worth.yearly(last)
                if worth.module_price is not None:
                    net = gain * worth.years - more * worth.module_price
            last = kwh
        steps.append(Step(option, more, added, value, gain, net))
        modules = option.modules
    return steps


def last_that_pays(steps: Sequence[Step]) -> Step | None:
    """The step with the largest net worth of all modules up to it: one more no longer pays.

    ``None`` where no price is known, or where not even the first step pays.
    """
    best, most, net = None, 0.0, 0.0
    for step in steps:
        if step.net is None:
            return None
        net += step.net
        if net >= most:
            best, most = step, net
    return best


def _best_of_each_count(fit: Fit) -> Iterator[Option]:
    search = replace(fit.search, request=replace(fit.request, order=Order.ENERGY, every=True))
    if search.inverters.single[0]:
        pair = np.zeros(1, dtype=np.int64)
        table, _, _ = search.single_trackers(pair, pair, search.limits(pair, pair), every=True)
        table = table.take(search.rank(table))
        _, first = np.unique(table.modules, return_index=True)
        rows = [table.take(slice(k, k + 1)) for k in first]
    else:
        space = search.space(0, 0)
        rows = [search.best_of_count(0, 0, space, count) for count in space.reachable]
    for number, row in enumerate(rows, start=1):
        yield fit.option(row, 0, number)
