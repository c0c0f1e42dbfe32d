"""Modules of which some can stand in for those of an array that are to be replaced, the others staying.

Whether such an array is safe is asked of the checks, with the sums of each mixed string; what it costs is asked of
the six-parameter model, at standard test conditions and in the heat.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from catalog.records import Inverter, Module, Site
from matcher.bench import with_diode
from matcher.checks import Confirm, Pair, Verdict, to_confirm, verdict
from matcher.electrical import design_points
from matcher.errors import MatcherError
from matcher.fit import module_points
from matcher.mixing import Mismatch, MixedTracker, Mixer, gathered, mixed_checks, spread
from matcher.moduleyear import PlaneYear
from matcher.options import Unit
from matcher.rules import RuleSet

#: Candidates next in current and voltage that are worked out; unlike modules further off cost more.
NEAREST = 150

ORDER = (
    "what gives power before what gives none; then what fits before what is to be confirmed; then by what wiring unlike modules together costs, the larger of the"
    " losses at standard test conditions and in the heat"
)


@dataclass(frozen=True, slots=True)
class PartSwap:
    """One candidate: where the new modules go, what it costs, and what is to be confirmed.

    ``stc`` and ``hot`` are losses with the new modules gathered, ``spread_stc`` with one in each string in turn;
    ``None`` where a record allows no model. ``idle``: the array gives no more than the old modules that stay would.
    """

    index: int
    verdict: str
    trackers: tuple[MixedTracker, ...]
    confirm: tuple[Confirm, ...]
    stc: Mismatch | None
    hot: Mismatch | None
    spread_stc: Mismatch | None
    idle: bool = False

    @property
    def loss_pct(self) -> float:
        """The larger loss; infinite where it is not known, which puts it last."""
        return np.inf if self.stc is None or self.hot is None else max(self.stc.loss_pct, self.hot.loss_pct)


@dataclass(frozen=True, slots=True)
class PartSwaps:
    """Candidates in order, and how many records were gone through, looked at closely and stopped."""

    found: tuple[PartSwap, ...]
    considered: int
    looked_at: int

    def __len__(self) -> int:
        return len(self.found)


def swap_part(
    old: Module, inverter: Inverter, wired: Sequence[Unit], part: int, modules: Sequence[Module], site: Site,
    rules: RuleSet, combiner: bool = False, plane: PlaneYear | None = None, nearest: int = NEAREST,
) -> PartSwaps:  # fmt: skip
    """Modules of which ``part`` can replace as many of the old ones in this wiring.

    Raises
    ------
    MatcherError
        Where the old module cannot be matched.
    """
    trackers = [t for unit in wired for _ in range(unit.copies) for t in unit.trackers]
    place = {m.name: k for k, m in enumerate(modules)}
    others = [m for m in modules if m.name != old.name]
    old = with_diode(old, always=True)
    near = [with_diode(m, always=True) for m in _nearest(old, others, nearest)]
    own = design_points([old], site, rules, plane)
    if own.reasons[0] is not None:
        raise MatcherError(f"{old.name} cannot be matched: {own.reasons[0]}")
    points = design_points(near, site, rules, plane)
    old_points = module_points(own, 0)
    pair = Pair(old, old_points, inverter, site, rules, combiner)
    together, apart = gathered(trackers, part), spread(trackers, part)
    # The trackers of one inverter after those of the other: checks are held inverter by inverter.
    sizes = [len(unit.trackers) for unit in wired for _ in range(unit.copies)]
    found = []
    for k, new in enumerate(near):
        if points.reasons[k] is not None:
            continue
        new_points = module_points(points, k)
        stc = Mixer.at(old, new, 1000.0, 25.0, 25.0)
        hot = Mixer.at(old, new, 1000.0, old_points.cell_hot_c, new_points.cell_hot_c)
        checks = [
            c for some in _parted(together, sizes) for c in mixed_checks(pair, new, new_points, some, hot)
        ]
        outcome = verdict(checks)
        if outcome is Verdict.DOES_NOT_FIT:
            continue
        lost = stc and stc.mismatch(together)
        found.append(
            PartSwap(
                place[new.name], str(outcome), together, tuple(dict.fromkeys(to_confirm(checks))),
                lost, hot and hot.mismatch(together), stc and stc.mismatch(apart),
                lost is not None and lost.together_w <= lost.apart_w - part * new.pmax_w,
            )  # fmt: skip
        )
    found.sort(key=lambda c: (c.idle, c.verdict != "fits", round(c.loss_pct, 6), modules[c.index].name))
    return PartSwaps(tuple(found), len(others), len(near))


def _nearest(old: Module, modules: Sequence[Module], number: int) -> list[Module]:
    """The modules whose current and voltage are nearest: those that cost least beside the old one."""

    def distance(m: Module) -> float:
        pairs = ((m.imp_a, old.imp_a), (m.isc_a, old.isc_a), (m.vmp_v, old.vmp_v), (m.voc_v, old.voc_v))
        return sum(abs(a / b - 1.0) for a, b in pairs)

    return sorted(modules, key=lambda m: (distance(m), m.name))[:number]


def _parted(trackers: Sequence[MixedTracker], sizes: Sequence[int]) -> list[list[MixedTracker]]:
    parts, start = [], 0
    for size in sizes:
        parts.append(list(trackers[start : start + size]))
        start += size
    return parts
