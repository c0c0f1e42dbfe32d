"""Options of many pairs whose inverter has one tracker: all of them, or the best of each pair."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from matcher.clipping import Losses
from matcher.options import Options, build, join
from matcher.order import Order
from matcher.shortlist import Estimates, can_estimate, candidates, margin
from matcher.singlelosses import single_losses

if TYPE_CHECKING:
    from matcher.limits import PairLimits
    from matcher.search import Search
    from matcher.singles import Expansion

#: Options worked out at once.
_PART = 400_000
#: Options, or string lengths with an estimate, among which the best of each pair are sought at once, and the
#: modules that they may have: bounds memory, and keeps the work in the processor's cache.
_PART_OF_BESTS = 40_000
_MODULES_OF_BESTS = 2_000

#: Options, and the pair of each.
Paired = tuple[Options, np.ndarray]


@dataclass(frozen=True, slots=True, eq=False)
class SinglePairs:
    """Pairs ``(module[j], inverter[j])`` of a search, and their limits; arrays of shape (pairs,)."""

    search: Search
    module: np.ndarray
    inverter: np.ndarray
    limits: PairLimits

    def every(self, lines: Expansion) -> Paired:
        """All options of some lines."""
        return _joined([self._worked_out(part, *part.options()) for part in lines.parts(_PART)])

    def bests(self, lines: Expansion) -> Paired:
        """The best option of each pair of some lines."""
        if self.search.request.order is not Order.LEAST_INVERTER:
            return self._best_of_all(lines)
        # Where there is an estimate few options of a line are worked out, else all.
        quick = can_estimate(self.search.inverters)[self.inverter[lines.pair]]
        weight = np.where(quick, 1, lines.ways)
        per_module = int(weight.sum()) // max(1, len(np.unique(self.module)))
        size = min(_PART_OF_BESTS, _MODULES_OF_BESTS * max(1, per_module))
        return _joined([found for part in lines.parts(size, weight) for found in self._short_listed(part)])

    def _best_of_all(self, lines: Expansion) -> Paired:
        """The best option of each pair, all of them worked out."""
        return _joined([self._first(*self._worked_out(part, *part.options())) for part in lines.parts(_PART_OF_BESTS)])

    def _short_listed(self, lines: Expansion) -> list[Paired]:
        """The best option of each pair, those worked out that can be it by an estimate of their losses."""
        cap = self.search.request.clip_cap_pct
        most = lines.from_strings + lines.ways - 1
        estimates = self._estimates(lines, most)
        # Without losses only the most strings of a length can be the first.
        first, last = (most, most) if estimates is None else estimates.near(cap, lines.from_strings, most)
        near = replace(lines, from_strings=first, ways=last - first + 1)
        line, strings = near.options()
        clipping = np.zeros(len(line)) if estimates is None else estimates.loss_pct(line, strings)
        sure = ~self._unsure(lines.pair, lines.in_series)
        chosen = candidates(lines.pair[line], strings * lines.in_series[line], clipping, sure[line], cap)
        options, pair = self._worked_out(lines, line[chosen], strings[chosen])
        off = np.abs(options.clipping_pct - clipping[chosen]) > margin(clipping[chosen]) / 2
        if not off.any():
            return [self._first(options, pair)]
        # Inverters for which the estimate is no good.
        wrong = np.zeros(len(lines.sizes), dtype=bool)
        wrong[pair[off]] = True
        right = ~wrong[pair]
        return [self._first(options.take(right), pair[right]), self._best_of_all(lines.take(wrong[lines.pair]))]

    def _estimates(self, lines: Expansion, most: np.ndarray) -> Estimates | None:
        """Of the clipping losses of lines with up to so many strings; ``None`` where they are not known."""
        search = self.search
        module, inverter = self.module[lines.pair], self.inverter[lines.pair]
        known = search.heads(module)
        if known is None:
            return None
        heads, at = known
        found = Estimates.of(heads, search.inverters, at, inverter, lines.in_series, most * lines.in_series)
        return replace(found, wild=found.wild | ~can_estimate(search.inverters)[inverter])

    def _worked_out(self, lines: Expansion, line: np.ndarray, strings: np.ndarray) -> Paired:
        """Options by the number of their line and their strings, arrays (n,)."""
        search, pair, in_series = self.search, lines.pair[line], lines.in_series[line]
        m, i = self.module[pair], self.inverter[pair]
        if search.year is None:
            losses = Losses.unknown(len(m))
        else:
            years = m if search.year.power_w.ndim == 2 else None
            losses = single_losses(search.year, search.inverters, i, strings, in_series, years)
        options = build(
            m.astype(np.int32), i.astype(np.int32), self._unsure(pair, in_series),
            strings[:, None].astype(np.int32), in_series[:, None].astype(np.int32),
            np.zeros((len(m), 1), dtype=np.int16),
            pmax_w=search.points.pmax_w[m], ac_power_w=search.inverters.ac_power_w[i],
            voc_cold_v=search.points.voc_cold_v[m], voltage_limit_v=self.limits.voltage_limit_v[pair], losses=losses,
        )  # fmt: skip
        return options, pair

    def _unsure(self, pair: np.ndarray, in_series: np.ndarray) -> np.ndarray:
        """Whether a safety rating is missing for strings of some length on some pairs, shape (n,)."""
        limits = self.limits
        unsure = (in_series < limits.sure_from[pair]) | (in_series > limits.sure_to[pair])
        return unsure | np.isnan(self.search.inverters.max_isc_a[self.inverter[pair]])

    def _first(self, options: Options, pair: np.ndarray) -> Paired:
        """The first option of each pair in the order of the request."""
        order = self.search.rank(options)
        found, at = np.unique(pair[order], return_index=True)
        return options.take(order[at]), found


def _joined(parts: Sequence[Paired]) -> Paired:
    tables, pairs = zip(*parts, strict=True)
    return join(tables), np.concatenate(pairs)
