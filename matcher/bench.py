"""One module at one site on any of a list of inverters: the parts of the engine made ready for many questions.

`matcher.fit` answers one question about many records; here many questions, each about one pair and one module
count, share what they have in common. The DC/AC ratio plays no part.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import astuple, dataclass, field, replace
from itertools import combinations

import numpy as np

from catalog.records import SIX_PARAMETERS, Module, Site
from matcher import reach
from matcher.arrangements import Space, distinct_lengths
from matcher.checks import Pair, Tracker, Verdict
from matcher.columns import InverterColumns
from matcher.electrical import design_points, diode_parameters
from matcher.fit import Fit, Option, Totals
from matcher.limits import UNLIMITED
from matcher.moduleyear import ModuleYear, PlaneYear
from matcher.options import Options, Unit, join
from matcher.request import Request
from matcher.rules import RuleSet
from matcher.search import Search
from matcher.several import together
from matcher.shared import free_space

#: A window of DC/AC ratios that shuts nothing out: what the ratio is worth is for the reader to decide.
ANY_RATIO = (1e-9, 1e9)


def with_diode(module: Module, always: bool = False) -> Module:
    """The module with the six parameters that its values give, so that they are fitted once only.

    Where a coefficient of Vmp is stated, voltages need no model, and it is fitted only if ``always``.
    """
    if module.a_ref is not None or (module.vmp_coef_pct is not None and not always):
        return module
    diode = diode_parameters(module)
    if diode is None:
        return module
    six = dict(zip(SIX_PARAMETERS, astuple(diode)[1:], strict=True))
    return replace(module, **{name: float(value) for name, value in six.items()})


@dataclass(eq=False)
class Bench:
    """A module at a site, and inverters by their index."""

    fit: Fit
    _spaces: dict[int, Space] = field(default_factory=dict)
    _counts: dict[tuple[int, int], tuple[int, int]] = field(default_factory=dict)

    @classmethod
    def of(
        cls, module: Module, inverters: InverterColumns, site: Site, rules: RuleSet,
        combiner: bool = False, year: ModuleYear | None = None,
        plane: PlaneYear | None = None,
    ) -> Bench:  # fmt: skip
        """A bench; `reason` tells where the module cannot be matched at all."""
        request = Request(site, rules, ANY_RATIO, combiner=combiner)
        points = design_points([module], site, rules, plane)
        search = Search((module,), inverters, request, points, year)
        none = np.zeros(0, dtype=np.int64)
        nothing = search.single_trackers(none, none, search.limits(none, none), every=True)[0]
        found = np.zeros(len(inverters.records), dtype=bool)
        return cls(
            Fit((module,), inverters.records, request, points, year, Totals(0, 0, 0), True, found, nothing, [], search)
        )

    @property
    def reason(self) -> str | None:
        """Why the module cannot be matched at this site; ``None`` where it can."""
        return self.fit.points.reasons[0]

    def pair(self, i: int) -> Pair:
        """What the checks need to know of the module and inverter i."""
        return self.fit.pair(0, i)

    def space(self, i: int) -> Space:
        """What the ratings of inverter i allow, whatever the count."""
        if i not in self._spaces:
            self._spaces[i] = free_space(self.fit.search, 0, i, UNLIMITED)
        return self._spaces[i]

    def counts(self, i: int, most: int) -> int:
        """Module counts that one unit takes, as bits, at least up to ``most``."""
        held, bits = self._counts.get((i, 1), (-1, 0))
        if held < most:
            # Asked again and again with another count: worked out some way ahead.
            space = self.space(i)
            bits = reach.one_unit(replace(space, fewest=1, most=max(0, min(space.most, most + most // 2))))
            held = most + most // 2
            self._counts[i, 1] = (held, bits)
        return bits

    def takes(self, i: int, total: int, units: int) -> bool:
        """Whether the units of inverter i take exactly this many modules together."""
        return self.split(i, total, units) is not None

    def split(self, i: int, total: int, units: int) -> tuple[int, ...] | None:
        """Modules of each unit, as even as can be; ``None`` where they cannot be wired."""
        if total < units:
            return None
        bits = self.counts(i, total)
        if units == 1:
            return (total,) if bits >> total & 1 else None
        whole, rest = divmod(total, units)
        if bits >> whole & 1 and (not rest or bits >> (whole + 1) & 1):
            return tuple([whole + 1] * rest + [whole] * (units - rest))
        return reach.split(bits, total, units)

    def around(self, i: int, total: int, units: int) -> tuple[int | None, int | None]:
        """Module counts next below and next above ``total`` that the units take."""
        most = total + units * max(self.space(i).longest, 1) * 2
        bits = reach.on_units(self.counts(i, most), units, most) if units > 1 else self.counts(i, most)
        return reach.below(bits, total), reach.above(bits, total)

    def best(self, i: int, total: int, units: int) -> Option | None:
        """The best way to wire this many modules on the units; ``None`` where there is none."""
        split = self.split(i, total, units)
        if split is None:
            return None
        copies = {c: split.count(c) for c in dict.fromkeys(split)}
        rows = [self._best_unit(i, c) for c in copies]
        return self._option(i, rows, list(copies.values()))

    def option_of(self, i: int, wired: Sequence[Unit], outcome: Verdict) -> Option:
        """An arrangement whose verdict is known, as an option."""
        rows = [self._row(i, unit.trackers, outcome is Verdict.TO_CONFIRM) for unit in wired]
        return self._option(i, rows, [unit.copies for unit in wired])

    def _option(self, i: int, rows: list[Options], copies: list[int]) -> Option:
        table = join(rows)
        if sum(copies) > 1:
            search = self.fit.search
            table = together(table, copies, float(search.points.pmax_w[0]), float(search.inverters.ac_power_w[i]))
        return self.fit.option(table, 0, 1)

    def _row(self, i: int, trackers: Sequence[Tracker], unsure: bool) -> Options:
        inputs = self.fit.inverters[i].inputs
        block = np.zeros((1, sum(g.trackers for g in inputs), 2), dtype=np.int64)
        starts = np.cumsum([0, *(g.trackers for g in inputs)])
        taken = [0] * len(inputs)
        for t in trackers:
            block[0, starts[t.inputs] + taken[t.inputs]] = t.strings, t.in_series
            taken[t.inputs] += 1
        return self.fit.search.table(0, i, block, unsure)

    def _best_unit(self, i: int, modules: int) -> Options:
        search, space = self.fit.search, replace(self.space(i), fewest=modules, most=modules)
        if self.fit.year is None:
            # Without losses the order of one count is: verdict, number of lengths, longest string.
            for unsure in (False, True):
                for block in _in_order(space, modules, unsure):
                    return search.table(0, i, block[:1], unsure)
        return search.best_of_count(0, i, space, modules)


#: String lengths in one arrangement that are tried one set after the other.
_MOST_LENGTHS = 2


def _in_order(space: Space, modules: int, unsure: bool) -> Iterator[np.ndarray]:
    """Arrangements with one or two string lengths: one before two, then by the longest string."""
    accepted = np.zeros(modules + 1, dtype=bool)
    accepted[modules] = True
    held = sum(g.trackers * g.max_strings for g in space.groups)
    lengths = range(space.shortest, min(space.longest, modules) + 1)
    if not unsure and (space.sure_from > space.sure_to or all(g.to_confirm for g in space.groups)):
        return
    for k in range(1, _MOST_LENGTHS + 1):
        for some in sorted(combinations(lengths, k), key=lambda c: (c[-1], c)):
            if not _adds_up(some, modules, held):
                continue
            for block in space.listing(accepted, unsure, some):
                block = block[distinct_lengths(block) == k]
                if len(block):
                    yield block


def _adds_up(lengths: tuple[int, ...], modules: int, held: int) -> bool:
    """Whether one or more strings of each length, ``held`` at most in all, can have this many modules."""
    *some, last = lengths
    if not some:
        return modules % last == 0 and modules // last <= held
    return any(
        _adds_up((last,), modules - strings * some[0], held - strings)
        for strings in range(1, min(held, (modules - last) // some[0] + 1))
    )
