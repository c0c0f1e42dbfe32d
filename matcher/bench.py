"""One module at one site on any of a list of inverters: the parts of the engine made ready for many questions.

`matcher.fit` answers one question about many records; here many questions, each about one pair and one module
count, share what they have in common. The DC/AC ratio plays no part.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import astuple, dataclass, field, replace
from functools import lru_cache
from itertools import combinations

import numpy as np

from catalog.records import SIX_PARAMETERS, Module, Site
from matcher import reach
from matcher.arrangements import Space, distinct_lengths
from matcher.checks import Pair, Tracker, Verdict
from matcher.clipping import Losses
from matcher.columns import InverterColumns
from matcher.electrical import Points, design_points, diode_parameters
from matcher.fit import Fit, Option, Totals
from matcher.limits import UNLIMITED
from matcher.moduleyear import ModuleYear, PlaneYear
from matcher.options import Options, Unit, build, join
from matcher.order import ranked
from matcher.request import Request
from matcher.rules import RuleSet
from matcher.search import Search
from matcher.several import together
from matcher.shared import free_limits, free_space

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
    _counts: dict[int, tuple[int, int]] = field(default_factory=dict)
    _sure: dict[int, tuple[int, int]] = field(default_factory=dict)

    @classmethod
    def of(
        cls, module: Module, inverters: InverterColumns, site: Site, rules: RuleSet,
        combiner: bool = False, year: ModuleYear | None = None,
        plane: PlaneYear | None = None, points: Points | None = None,
    ) -> Bench:  # fmt: skip
        """A bench; `reason` tells where the module cannot be matched at all.

        ``points`` are the module's design values, where they have been worked out with those of others.
        """
        request = Request(site, rules, ANY_RATIO, combiner=combiner)
        if points is None:
            points = design_points([module], site, rules, plane)
        search = Search((module,), inverters, request, points, year)
        found = np.zeros(len(inverters.records), dtype=bool)
        return cls(
            Fit((module,), inverters.records, request, points, year, Totals(0, 0, 0), True, found, _no_options(), [], search)
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

    def likely(self, some: np.ndarray, total: int, units: int) -> tuple[np.ndarray, np.ndarray]:
        """Which of some inverters may take this many modules, and which of them with nothing to confirm.

        Two bool arrays; what is left out here cannot, what is left in is still to be asked of `outcome`.
        """
        limits = free_limits(self.fit.search, 0, some, UNLIMITED)
        takes = (limits.shortest <= limits.longest) & (units * limits.shortest <= total) & (total <= units * limits.most)
        single = self.fit.search.inverters.single[some]
        if units == 1 and (takes & single).any():
            # One tracker takes strings of one length: it divides the number of modules.
            strings = self.fit.search.max_strings(np.zeros_like(some), some)
            lengths = np.array([n for n in range(1, min(total, int(limits.longest.max())) + 1) if not total % n])
            fits = (limits.shortest[:, None] <= lengths) & (lengths <= limits.longest[:, None])
            takes &= ~single | (fits & (total // lengths <= strings[:, None])).any(axis=1)
        isc = [any(g.max_isc_a is not None for g in self.fit.inverters[i].inputs) for i in some.tolist()]
        return takes, takes & (limits.sure_from <= limits.sure_to) & np.array(isc, dtype=bool)

    def takes(self, i: int, total: int, units: int) -> bool:
        """Whether the units of inverter i take exactly this many modules together."""
        if total < units:
            return False
        whole, rest = divmod(total, units)
        if self._holds(i, whole) and (not rest or self._holds(i, whole + 1)):
            return True
        return units > 1 and reach.adds_up(self._bits(i, total), total, units)

    def split(self, i: int, total: int, units: int) -> tuple[int, ...] | None:
        """Modules of each unit, as even as can be; ``None`` where they cannot be wired."""
        if total < units:
            return None
        whole, rest = divmod(total, units)
        if self._holds(i, whole) and (not rest or self._holds(i, whole + 1)):
            return tuple([whole + 1] * rest + [whole] * (units - rest))
        return None if units == 1 else reach.split(self._bits(i, total), total, units)

    def outcome(self, i: int, total: int, units: int) -> Verdict | None:
        """The verdict of `best`, without working it out; ``None`` where there is no way."""
        split = self.split(i, total, units)
        if split is None:
            return None
        return Verdict.FITS if all(self._holds(i, c, sure=True) for c in set(split)) else Verdict.TO_CONFIRM

    def around(self, i: int, total: int, units: int) -> tuple[int | None, int | None]:
        """Module counts next below and next above ``total`` that the units take."""
        most = total + units * max(self.space(i).longest, 1) * 2
        bits = reach.on_units(self._bits(i, most), units, most) if units > 1 else self._bits(i, most)
        return reach.below(bits, total), reach.above(bits, total)

    def best(self, i: int, total: int, units: int) -> Option | None:
        """The best way to wire this many modules on the units; ``None`` where there is none."""
        split = self.split(i, total, units)
        if split is None:
            return None
        copies = {c: split.count(c) for c in dict.fromkeys(split)}
        rows = [self._best_unit(i, c) for c in copies]
        return self._option(i, rows, list(copies.values()))

    def _holds(self, i: int, modules: int, sure: bool = False) -> bool:
        """Whether one unit takes exactly this many modules, if ``sure`` with nothing to confirm."""
        space = self.space(i)
        if not self.fit.search.inverters.single[i]:
            return bool(self._bits(i, modules, sure) >> modules & 1)
        return modules <= space.most and any(not (sure and unsure) for *_, unsure in on_one_tracker(space, modules))

    def _bits(self, i: int, most: int, sure: bool = False) -> int:
        """Module counts that one unit takes, as bits, at least up to ``most``."""
        kept = self._sure if sure else self._counts
        held, bits = kept.get(i, (-1, 0))
        if held < most:
            # Asked again and again with another count: worked out some way ahead.
            held = most + most // 2
            space = self.space(i)
            if sure:
                groups = tuple(g for g in space.groups if not g.to_confirm)
                space = replace(space, groups=groups, shortest=max(space.shortest, space.sure_from),
                                longest=min(space.longest, space.sure_to))  # fmt: skip
            bits = reach.one_unit(replace(space, fewest=1, most=max(0, min(space.most, held))))
            kept[i] = (held, bits)
        return bits

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
        """The best way to wire this many modules on one unit, one row."""
        search, space = self.fit.search, replace(self.space(i), fewest=modules, most=modules)
        if search.inverters.single[i]:
            ways = sorted(on_one_tracker(space, modules), key=lambda way: (way[2], way[1]))
            first = self._within_cap(i, np.array([[ways[0][:2]]]), ways[0][2])
            if first is not None:
                return first
            options = search.table(0, i, np.array([[w[:2]] for w in ways]), np.array([w[2] for w in ways]))
            asked, nothing = search.request, np.full(len(options), np.nan)
            # All of one pair, so that names do not matter.
            order = ranked(options, asked.order, asked.clip_cap_pct, np.zeros(len(options), dtype=np.int64), nothing)
            return options.take(order[:1])
        unsure = not self._holds(i, modules, sure=True)
        block = next(_in_order(space, modules, unsure), None)
        first = None if block is None else self._within_cap(i, block[:1], unsure)
        return first if first is not None else search.best_of_count(0, i, space, modules)

    def _within_cap(self, i: int, first: np.ndarray, unsure: bool) -> Options | None:
        """The first of one count by verdict, number of lengths and longest string; ``None`` where losses outweigh these.

        The ratio of one count is one, so the order of the search differs only where the first clips too much.
        """
        options = self.fit.search.table(0, i, first, unsure)
        over = options.clipping_pct[0] > self.fit.request.clip_cap_pct  # False where it is not known
        return None if over else options


@lru_cache(1)
def _no_options() -> Options:
    """A table without rows."""
    none, wide = np.zeros(0), np.zeros((0, 1), dtype=np.int64)
    index = np.zeros(0, dtype=np.int64)
    return build(
        index, index, np.zeros(0, dtype=bool), wide, wide, wide, pmax_w=none, ac_power_w=none, voc_cold_v=none,
        voltage_limit_v=none, losses=Losses.unknown(0),
    )  # fmt: skip


#: String lengths in one arrangement that are tried one set after the other.
_MOST_LENGTHS = 2


def _in_order(space: Space, modules: int, unsure: bool) -> Iterator[np.ndarray]:
    """Arrangements with one or two string lengths: one before two, then by the longest string."""
    accepted = np.zeros(modules + 1, dtype=bool)
    accepted[modules] = True
    held = sum(g.trackers * g.max_strings for g in space.groups)
    lengths = range(space.shortest, min(space.longest, modules) + 1)
    for k in range(1, _MOST_LENGTHS + 1):
        for some in sorted(combinations(lengths, k), key=lambda c: (c[-1], c)):
            if not _adds_up(some, modules, held):
                continue
            for block in space.listing(accepted, unsure, some):
                block = block[distinct_lengths(block) == k]
                if len(block):
                    yield block


def on_one_tracker(space: Space, modules: int) -> Iterator[tuple[int, int, bool]]:
    """Arrangements of a single tracker: strings, modules in series, whether something is to be confirmed."""
    (group,) = space.groups
    for n in range(space.shortest, min(space.longest, modules) + 1):
        strings, rest = divmod(modules, n)
        if not rest and strings <= group.max_strings:
            yield strings, n, group.to_confirm or not space.sure_from <= n <= space.sure_to


def _adds_up(lengths: tuple[int, ...], modules: int, held: int) -> bool:
    """Whether one or more strings of each length, ``held`` at most in all, can have this many modules."""
    *some, last = lengths
    if not some:
        return modules % last == 0 and modules // last <= held
    return any(
        _adds_up((last,), modules - strings * some[0], held - strings)
        for strings in range(1, min(held, (modules - last) // some[0] + 1))
    )
