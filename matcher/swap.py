"""What takes the place of a module or an inverter that cannot be had, with the wiring unchanged.

Same strings on the same number of trackers: every candidate is held against the engine's own bounds, all modules
of a catalog at once, and ranked by how little changes.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from catalog.records import Inverter, Module, Site
from matcher.bench import ANY_RATIO
from matcher.checks import Pair, Tracker, Verdict, check_option, verdict, worst_of_each
from matcher.columns import InverterColumns, column
from matcher.electrical import Points, design_points
from matcher.errors import MatcherError
from matcher.fit import module_points
from matcher.limits import at_most, pair_limits
from matcher.moduleyear import PlaneYear
from matcher.options import Unit
from matcher.rules import RuleSet
from matcher.vet import COMMON_RATIO
from matcher.wiring import place

ORDER = (
    "common DC/AC ratios before others; then what fits before what is to be confirmed; then by how little changes: the sum of the relative changes of power,"
    " voltage, current and size (a size that is not on record adds nothing)"
)
INVERTER_ORDER = (
    "common DC/AC ratios before others; then what fits before what is to be confirmed; then by how little changes: the sum of the relative changes of AC power"
    " and of both ends of the MPPT window"
)


@dataclass(frozen=True, slots=True, eq=False)
class Swaps:
    """Candidates in order. Arrays have shape (n,), NaN where not known.

    ``index`` points into the records gone through. ``changes`` holds relative changes in percent by name, new
    against old; ``size_mm`` the change of length and width, shape (n, 2). ``stopped`` counts the records that
    some check stops, ``unmatched`` those that lack a value to be matched at all. ``common`` are the DC/AC ratios that
    are common, widened to that of the array itself; ``odd`` tells which candidates lie outside.
    """

    index: np.ndarray
    to_confirm: np.ndarray
    changes: dict[str, np.ndarray]
    size_mm: np.ndarray
    ratio: np.ndarray
    considered: int
    stopped: int
    unmatched: int
    common: tuple[float, float]
    odd: np.ndarray
    points: Points | None = None
    wired: tuple[tuple[Unit, ...], ...] = ()

    def __len__(self) -> int:
        return len(self.index)


def swap_module(
    old: Module, inverter: Inverter, wired: Sequence[Unit], modules: Sequence[Module], site: Site, rules: RuleSet,
    combiner: bool = False, plane: PlaneYear | None = None,
) -> Swaps:  # fmt: skip
    """Modules that take the place of ``old`` in this wiring.

    Raises
    ------
    MatcherError
        Where the wiring does not suit the inverter whatever the module.
    """
    trackers = [t for unit in wired for t in unit.trackers]
    _check_wiring(inverter, trackers, combiner)
    points = design_points(modules, site, rules, plane)
    columns = InverterColumns.of([inverter])
    every = np.arange(len(modules))
    limits = pair_limits(
        points, columns, every, np.zeros_like(every), column(modules, "max_system_voltage_v"), site, rules, ANY_RATIO, None
    )
    shortest, longest = min(t.in_series for t in trackers), max(t.in_series for t in trackers)
    largest = max(unit.modules for unit in wired)
    sound = (limits.shortest <= shortest) & (longest <= limits.longest) & (largest <= limits.most)
    unsure = (shortest < limits.sure_from) | (longest > limits.sure_to)
    for t in trackers:
        limit = inverter.inputs[t.inputs].max_isc_a
        if limit is None:
            unsure[:] = True
        else:
            sound &= t.strings <= at_most(np.full(len(every), limit), points.isc_design_a)
    matched = np.array([r is None for r in points.reasons], dtype=bool)
    sound &= matched
    same = np.array([m.name == old.name for m in modules], dtype=bool)
    found = np.flatnonzero(sound & ~same)
    changes = {
        name: (column(modules, field)[found] / getattr(old, field) - 1.0) * 100.0
        for name, field in _MODULE_CHANGES.items()
    }
    size = np.full((len(found), 2), np.nan)
    for k, field in enumerate(("length_m", "width_m")):
        own = getattr(old, field)
        if own is not None:
            size[:, k] = (column(modules, field)[found] - own) * 1000.0
    total = sum(unit.copies * unit.modules for unit in wired)
    units = sum(unit.copies for unit in wired)
    ratio = total * points.pmax_w[found] / (units * inverter.ac_power_w)
    moved = np.zeros(len(found))
    for names in (("power",), ("vmp", "voc"), ("imp", "isc")):
        moved += np.max([np.abs(changes[n]) for n in names], axis=0)
    for k, field in enumerate(("length_m", "width_m")):
        if getattr(old, field) is not None:
            moved += np.nan_to_num(np.abs(size[:, k]) / getattr(old, field) / 10.0) / 2.0
    names = np.array([modules[k].name for k in found])
    common = _common(total * old.pmax_w / (units * inverter.ac_power_w))
    odd = _odd(ratio, common)
    order = np.lexsort((names, np.round(moved, 9), unsure[found], odd)) if len(found) else np.zeros(0, dtype=int)
    return Swaps(
        found[order], unsure[found][order], {n: v[order] for n, v in changes.items()}, size[order], ratio[order],
        len(modules) - int(same.sum()), int((matched & ~sound & ~same).sum()), int((~matched & ~same).sum()), common,
        odd[order], points,
    )  # fmt: skip


#: Changes that are told, and the field each is the change of.
_MODULE_CHANGES = {"power": "pmax_w", "vmp": "vmp_v", "voc": "voc_v", "imp": "imp_a", "isc": "isc_a"}


def _common(own: float) -> tuple[float, float]:
    """DC/AC ratios that are common, and that of the array itself."""
    low, high = COMMON_RATIO
    return min(low, round(own, 2)), max(high, round(own, 2))


def _odd(ratio: np.ndarray, common: tuple[float, float]) -> np.ndarray:
    shown = np.round(ratio, 2)
    return (shown < common[0]) | (shown > common[1])


def _check_wiring(inverter: Inverter, trackers: Sequence[Tracker], combiner: bool) -> None:
    """String inputs do not depend on the module."""
    for t in trackers:
        inputs = inverter.inputs[t.inputs].strings_per_tracker
        if inputs is not None and t.strings > inputs and not combiner:
            raise MatcherError(
                f"{t.label} has {t.strings} strings, and a tracker of {inverter.name} has {inputs} string inputs:"
                " no module changes that (--combiner, if they are paralleled in a box)"
            )


def swap_inverter(
    module: Module, old: Inverter, wired: Sequence[Unit], inverters: Sequence[Inverter], site: Site, rules: RuleSet,
    combiner: bool = False, plane: PlaneYear | None = None,
) -> Swaps:  # fmt: skip
    """Inverters that take the place of ``old``, each unit for a unit, with as many strings on as many trackers.

    Raises
    ------
    MatcherError
        Where the module cannot be matched.
    """
    points = design_points([module], site, rules, plane)
    if points.reasons[0] is not None:
        raise MatcherError(f"{module.name} cannot be matched: {points.reasons[0]}")
    columns = InverterColumns.of(inverters)
    every = np.arange(len(inverters))
    limits = pair_limits(
        points, columns, np.zeros_like(every), every, column([module], "max_system_voltage_v"), site, rules, ANY_RATIO,
        None,
    )  # fmt: skip
    trackers = [t for unit in wired for t in unit.trackers]
    shortest, longest = min(t.in_series for t in trackers), max(t.in_series for t in trackers)
    largest, most = max(unit.modules for unit in wired), max(len(unit.trackers) for unit in wired)
    held = np.array([sum(g.trackers for g in i.inputs) for i in inverters])
    same = np.array([i.name == old.name for i in inverters], dtype=bool)
    likely = (limits.shortest <= shortest) & (longest <= limits.longest) & (largest <= limits.most) & (held >= most)
    found, unsure, placed = [], [], []
    for k in np.flatnonzero(likely & ~same).tolist():
        pair = Pair(module, module_points(points, 0), inverters[k], site, rules, combiner)
        units = tuple(Unit(u.copies, place(pair, [(t.strings, t.in_series) for t in u.trackers])) for u in wired)
        outcome = verdict(worst_of_each([c for u in units for c in check_option(pair, u.trackers)]))
        if outcome is not Verdict.DOES_NOT_FIT:
            found.append(k)
            unsure.append(outcome is Verdict.TO_CONFIRM)
            placed.append(units)
    index, to_confirm = np.array(found, dtype=int), np.array(unsure, dtype=bool)
    changes = {
        name: (column(inverters, field)[index] / getattr(old, field) - 1.0) * 100.0
        for name, field in (("power", "ac_power_w"), ("mppt_low", "mppt_low_v"), ("mppt_high", "mppt_high_v"))
    }
    total = sum(unit.copies * unit.modules for unit in wired)
    count = sum(unit.copies for unit in wired)
    ratio = total * module.pmax_w / (count * columns.ac_power_w[index])
    moved = sum(np.abs(c) for c in changes.values())
    names = np.array([inverters[k].name for k in found])
    common = _common(total * module.pmax_w / (count * old.ac_power_w))
    odd = _odd(ratio, common)
    order = np.lexsort((names, np.round(moved, 9), to_confirm, odd)) if found else np.zeros(0, dtype=int)
    return Swaps(
        index[order], to_confirm[order], {n: v[order] for n, v in changes.items()}, np.full((len(found), 2), np.nan),
        ratio[order], len(inverters) - int(same.sum()), len(inverters) - int(same.sum()) - len(found), 0, common,
        odd[order], None, tuple(placed[k] for k in order),
    )  # fmt: skip
