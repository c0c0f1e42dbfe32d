"""What can be had at most, and what it costs: bounds and prices of the records of a search."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from matcher.limits import UNLIMITED
from matcher.request import Request

#: One lot: pieces, and the price of a piece; ``None`` where it is not known.
Lot = tuple[int, float | None]


@dataclass(frozen=True, slots=True, eq=False)
class Lots:
    """Pieces (records, lots) and their prices (records, lots), the cheapest lot of a record first.

    A price is NaN where it is not known. What goes beyond all lots has the price of the last one.
    """

    pieces: np.ndarray
    prices: np.ndarray

    @classmethod
    def of(cls, lots: Sequence[Sequence[Lot]]) -> Lots:
        """Lots of each record, in any order; none where no price is known at all."""
        width = max((len(some) for some in lots), default=0) or 1
        pieces = np.zeros((len(lots), width), dtype=np.int64)
        prices = np.full((len(lots), width), np.nan)
        for record, some in enumerate(lots):
            known = sorted((price, n) for n, price in some if price is not None)
            ordered = [*known, *((np.nan, n) for n, price in some if price is None)]
            for lot, (price, n) in enumerate(ordered):
                pieces[record, lot], prices[record, lot] = n, price
            if ordered:
                prices[record, len(ordered) :] = ordered[-1][0]
        pieces[:, -1] = UNLIMITED
        return cls(pieces, prices)

    def cost(self, record: np.ndarray, number: np.ndarray) -> np.ndarray:
        """Cost of so many pieces of each record, taken from the cheapest lots; arrays (n,); NaN where unknown."""
        left = np.asarray(number, dtype=np.int64)
        total = np.zeros(left.shape)
        for lot in range(self.pieces.shape[1]):
            taken = np.minimum(left, self.pieces[record, lot])
            total += np.where(taken > 0, taken * self.prices[record, lot], 0.0)
            left = left - taken
        return total


@dataclass(frozen=True, slots=True, eq=False)
class Shelf:
    """How many of each record can be had, and at what price.

    ``modules_at_most`` (modules,) and ``inverters_at_most`` (inverters,) are `UNLIMITED` where nothing bounds them. All
    prices are in ``currency``.
    """

    modules_at_most: np.ndarray
    inverters_at_most: np.ndarray
    modules: Lots
    inverters: Lots
    currency: str | None = None

    def cost(self, module: np.ndarray, inverter: np.ndarray, modules: np.ndarray, units: np.ndarray) -> np.ndarray:
        """Cost of so many modules and units of pairs, arrays (n,); NaN where a price is not known."""
        return self.modules.cost(module, modules) + self.inverters.cost(inverter, units)

    def bounded(self, request: Request, m: int, i: int) -> Request:
        """The request, asking no more of a pair than can be had."""
        modules, inverters = int(self.modules_at_most[m]), int(self.inverters_at_most[i])
        units = (request.units[0], max(request.units[0], min(request.units[1], inverters)))
        if request.strings is not None or modules == UNLIMITED:
            return replace(request, units=units)
        low, high = request.counts or (1, modules)
        return replace(request, units=units, counts=(low, max(low, min(high, modules))))
