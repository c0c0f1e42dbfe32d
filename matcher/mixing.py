"""Part of an array replaced by another type of module: where the new ones go, what that costs, and whether it is safe."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from catalog.records import Module
from matcher.checks import Check, ModulePoints, Pair, Tracker, check_option, worst_of_each
from matcher.electrical import diode_parameters
from matcher.mismatch import Curve, in_parallel, in_series, module_curve

#: Old and new modules of one string.
String = tuple[int, int]


@dataclass(frozen=True, slots=True)
class MixedTracker:
    """One tracker: its group of inputs, and the old and new modules of each of its strings."""

    inputs: int
    strings: tuple[String, ...]

    @property
    def label(self) -> str:
        """Like ``1x(9 old + 2 new), 1x11 old``."""
        words = []
        for (old, new), times in Counter(self.strings).items():
            kind = f"({old} old + {new} new)" if old and new else f"{old or new} {'old' if old else 'new'}"
            words.append(f"{times}x{kind}")
        return ", ".join(words)


@dataclass(frozen=True, slots=True)
class Mismatch:
    """Power [W] of an array of unlike modules, of the same modules each at its own best, and the loss [%]."""

    together_w: float
    apart_w: float

    @property
    def loss_pct(self) -> float:
        """What wiring them together costs, in percent of what they give apart."""
        return max(0.0, (1.0 - self.together_w / self.apart_w) * 100.0)


def gathered(trackers: Sequence[Tracker], new: int) -> tuple[MixedTracker, ...]:
    """New modules gathered: whole trackers first, then whole strings, the rest in one string."""
    placed: dict[int, list[String]] = {k: [(t.in_series, 0)] * t.strings for k, t in enumerate(trackers)}
    by_size = sorted(range(len(trackers)), key=lambda k: -trackers[k].strings * trackers[k].in_series)
    for k in by_size:
        size = trackers[k].strings * trackers[k].in_series
        if size <= new:
            placed[k] = [(0, trackers[k].in_series)] * trackers[k].strings
            new -= size
    for k in by_size:
        n = trackers[k].in_series
        for s, (old, _) in enumerate(placed[k]):
            if old and n <= new:
                placed[k][s] = (0, n)
                new -= n
    for k in by_size:
        for s, (old, _) in enumerate(placed[k]):
            if new and old > new:
                placed[k][s] = (old - new, new)
                new = 0
    assert not new
    return tuple(MixedTracker(t.inputs, tuple(placed[k])) for k, t in enumerate(trackers))


def spread(trackers: Sequence[Tracker], new: int) -> tuple[MixedTracker, ...]:
    """New modules spread: one after the other to every string in turn."""
    strings = [[0] * t.strings for t in trackers]
    while new:
        for k, t in enumerate(trackers):
            for s in range(t.strings):
                if new and strings[k][s] < t.in_series:
                    strings[k][s] += 1
                    new -= 1
    return tuple(
        MixedTracker(t.inputs, tuple((t.in_series - n, n) for n in strings[k])) for k, t in enumerate(trackers)
    )


class Mixer:
    """An old and a new module at one irradiance and their cell temperatures."""

    def __init__(self, old: Curve, new: Curve) -> None:
        self._old, self._new = old, new
        self._strings: dict[String, Curve] = {}

    @classmethod
    def at(cls, old: Module, new: Module, irradiance: float, old_cell_c: float, new_cell_c: float) -> Mixer | None:
        """``None`` where one of the records allows no model."""
        first, second = diode_parameters(old), diode_parameters(new)
        if first is None or second is None:
            return None
        return cls(module_curve(first, irradiance, old_cell_c), module_curve(second, irradiance, new_cell_c))

    def string(self, string: String) -> Curve:
        """Curve of a string."""
        if string not in self._strings:
            old, new = string
            self._strings[string] = in_series([(self._old, old), (self._new, new)])
        return self._strings[string]

    def tracker(self, tracker: MixedTracker) -> Curve:
        """Curve of all strings of a tracker."""
        return in_parallel([(self.string(s), n) for s, n in Counter(tracker.strings).items()])

    def mismatch(self, trackers: Sequence[MixedTracker]) -> Mismatch:
        """Power of the trackers, each at its best point, against that of all modules apart."""
        together = sum(self.tracker(t).power_w for t in trackers)
        old = sum(o for t in trackers for o, _ in t.strings)
        new = sum(n for t in trackers for _, n in t.strings)
        return Mismatch(together, old * self._old.power_w + new * self._new.power_w)


def mixed_checks(
    pair: Pair, new: Module, new_points: ModulePoints, trackers: Sequence[MixedTracker], hot: Mixer | None
) -> list[Check]:
    """The checks of a mixed array: each string by its own sums, currents by the stronger module.

    ``pair`` is that of the old module. A limit that one of the modules does not state is not stated.
    """
    used = [t for t in trackers if t.strings]
    old, points = pair.module, pair.points
    both = replace(
        old,
        max_system_voltage_v=_least(old.max_system_voltage_v, new.max_system_voltage_v),
        max_series_fuse_a=_least(old.max_series_fuse_a, new.max_series_fuse_a),
    )
    found: list[Check] = []
    for t in used:
        p = _tracker_points(points, new_points, t, hot)
        length = max(o + n for o, n in t.strings)
        wired = [Tracker(t.inputs, len(t.strings), length)]
        found += [c for c in check_option(replace(pair, module=both, points=p), wired) if c.check != "array-power"]
    modules = sum(o + n for t in used for o, n in t.strings)
    power = sum(o * points.pmax_w + n * new_points.pmax_w for t in used for o, n in t.strings)
    whole = replace(pair, points=replace(points, pmax_w=power / modules))
    wired = [Tracker(t.inputs, 1, sum(o + n for o, n in t.strings)) for t in used]
    found += [c for c in check_option(whole, wired) if c.check == "array-power"]
    return worst_of_each(found)


def _least(a: float | None, b: float | None) -> float | None:
    return None if a is None or b is None else min(a, b)


def _tracker_points(old: ModulePoints, new: ModulePoints, tracker: MixedTracker, hot: Mixer | None) -> ModulePoints:
    """Design values per module that stand for the strings of one tracker: the worst of them for each check."""

    def mean(name: str) -> list[float] | None:
        a, b = getattr(old, name), getattr(new, name)
        if a is None or b is None:
            return None
        return [(o * a + n * b) / (o + n) for o, n in tracker.strings]

    def currents(name: str) -> float:
        a, b = getattr(old, name), getattr(new, name)
        # The bypass diodes let a string carry the current of its stronger modules.
        each = [max(a if o else 0.0, b if n else 0.0) for o, n in tracker.strings]
        return float(np.mean(each))

    def mean_of(name: str) -> list[float]:
        found = mean(name)
        assert found is not None
        return found

    vmp_hot = min(mean_of("vmp_hot_v"))
    if hot is not None:
        length = max(o + n for o, n in tracker.strings)
        vmp_hot = min(vmp_hot, hot.tracker(tracker).best[0] / length)
    voc_hot = mean("voc_hot_v")
    return replace(
        old,
        voc_cold_v=max(mean_of("voc_cold_v")),
        voc_hot_v=None if voc_hot is None else min(voc_hot),
        vmp_hot_v=vmp_hot,
        vmp_25_v=max(mean_of("vmp_25_v")),
        vmp_cold_v=max(mean_of("vmp_cold_v")),
        isc_design_a=currents("isc_design_a"),
        imp_a=currents("imp_a"),
        pmax_w=float(np.mean(mean_of("pmax_w"))),
    )
