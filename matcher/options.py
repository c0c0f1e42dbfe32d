"""Options as columns: hundreds of thousands of them are a few arrays, not as many objects."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np

from matcher.checks import Tracker
from matcher.clipping import Losses


@dataclass(frozen=True, slots=True, eq=False)
class Options:
    """n options; arrays of shape (n,) unless said otherwise.

    ``module`` and ``inverter`` index the records of the search. ``to_confirm`` tells the verdict apart
    (False: fits). Losses are NaN where they cannot be known. The last six have shape (n, trackers), with 0
    strings where a tracker is empty or there is none. With several units the trackers of each different
    unit stand one after the other: ``kind`` tells these apart, ``copies`` is how many are wired alike.
    ``face`` numbers the faces of the request from 1; 0 where all strings face the same way.
    """

    module: np.ndarray
    inverter: np.ndarray
    units: np.ndarray
    modules: np.ndarray
    ratio: np.ndarray
    to_confirm: np.ndarray
    clipping_pct: np.ndarray
    current_clipping_pct: np.ndarray
    yearly_kwh: np.ndarray
    lengths: np.ndarray
    margin_pct: np.ndarray
    strings: np.ndarray
    in_series: np.ndarray
    inputs: np.ndarray
    copies: np.ndarray
    kind: np.ndarray
    face: np.ndarray

    def __len__(self) -> int:
        return len(self.module)

    def take(self, index: np.ndarray | slice) -> Options:
        """The options at these positions, in this order."""
        return Options(*(getattr(self, f.name)[index] for f in fields(self)))

    def wired(self, k: int) -> tuple[Unit, ...]:
        """The different units of option k, each with what its trackers in use carry."""
        found: dict[int, list[Tracker]] = {}
        copies: dict[int, int] = {}
        columns = (self.kind[k], self.copies[k], self.inputs[k], self.strings[k], self.in_series[k], self.face[k])
        for kind, times, group, s, n, face in zip(*(c.tolist() for c in columns), strict=True):
            if s:
                found.setdefault(kind, []).append(Tracker(group, s, n, face))
                copies[kind] = times
        return tuple(Unit(copies[kind], tuple(trackers)) for kind, trackers in found.items())


@dataclass(frozen=True, slots=True)
class Unit:
    """Inverters wired alike: how many, and what the trackers in use of each carry."""

    copies: int
    trackers: tuple[Tracker, ...]

    @property
    def modules(self) -> int:
        """Modules on one of them."""
        return sum(t.strings * t.in_series for t in self.trackers)

    @property
    def label(self) -> str:
        """Like ``2x11 | 1x12``: strings x modules in series, trackers parted by a bar."""
        return " | ".join(t.label for t in self.trackers)


def label(wired: Sequence[Unit]) -> str:
    """Like ``2x11 | 1x12``; where units are unlike, each kind with its number, joined by a plus."""
    if len(wired) == 1:
        return wired[0].label
    return " + ".join(f"{u.copies} of ({u.label})" for u in wired)


def build(
    module: np.ndarray,
    inverter: np.ndarray,
    to_confirm: np.ndarray,
    strings: np.ndarray,
    in_series: np.ndarray,
    inputs: np.ndarray,
    *,
    pmax_w: np.ndarray,
    ac_power_w: np.ndarray,
    voc_cold_v: np.ndarray,
    voltage_limit_v: np.ndarray,
    losses: Losses,
    face: np.ndarray | None = None,
) -> Options:
    """Options of one unit each, with the columns that follow from the others; arrays (n,) or (n, trackers)."""
    modules = (strings * in_series).sum(axis=1)
    ordered = np.sort(in_series, axis=1)
    lengths = (np.diff(ordered, axis=1, prepend=0) > 0).sum(axis=1)
    limit = voltage_limit_v
    return Options(
        module=module,
        inverter=inverter,
        units=np.ones(len(module), dtype=np.int32),
        modules=modules,
        ratio=modules * pmax_w / ac_power_w,
        to_confirm=to_confirm,
        clipping_pct=losses.total_pct,
        current_clipping_pct=losses.current_pct,
        yearly_kwh=losses.yearly_kwh,
        lengths=lengths,
        margin_pct=(limit - in_series.max(axis=1) * voc_cold_v) / limit * 100.0,
        strings=strings,
        in_series=in_series,
        inputs=inputs,
        copies=np.broadcast_to(np.ones(1, dtype=np.int32), strings.shape),
        kind=np.broadcast_to(np.zeros(1, dtype=np.int16), strings.shape),
        face=np.broadcast_to(np.zeros(1, dtype=np.int16), strings.shape) if face is None else face,
    )


def join(parts: Sequence[Options]) -> Options:
    """All options of several tables in one."""
    if len(parts) == 1:
        return parts[0]

    def joined(arrays: Sequence[np.ndarray]) -> np.ndarray:
        width = max((a.shape[1] for a in arrays if a.ndim == 2), default=0)
        if all(a.ndim == 1 or a.shape[1] == width for a in arrays):
            return np.concatenate(arrays)
        out = np.zeros((sum(map(len, arrays)), width), dtype=arrays[0].dtype)
        end = 0
        for a in arrays:
            start, end = end, end + len(a)
            out[start:end, : a.shape[1]] = a
        return out

    return Options(*(joined([getattr(p, f.name) for p in parts]) for f in fields(Options)))
