"""Inverter records turned into arrays, once, so that the engine works on all of them together."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from catalog.records import SANDIA_PARAMETERS, Inverter


def column(records: Sequence[object], name: str) -> np.ndarray:
    """One field of all records as floats, shape (n,); NaN where it is not stated."""
    return np.array([getattr(r, name) for r in records], dtype=float)


@dataclass(frozen=True, slots=True, eq=False)
class InverterColumns:
    """Ratings of k inverters; every array has shape (k,), ``sandia`` (k, 8); NaN where not stated.

    ``single`` marks the inverters with one tracker in all; the last three arrays are the ratings of the
    first group of inputs, which for these is the whole inverter.
    """

    records: tuple[Inverter, ...]
    ac_power_w: np.ndarray
    max_dc_voltage_v: np.ndarray
    mppt_low_v: np.ndarray
    mppt_high_v: np.ndarray
    start_voltage_v: np.ndarray
    max_array_power_w: np.ndarray
    weighted_efficiency_pct: np.ndarray
    sandia: np.ndarray
    single: np.ndarray
    strings_per_tracker: np.ndarray
    max_current_a: np.ndarray
    max_isc_a: np.ndarray

    @classmethod
    def of(cls, inverters: Sequence[Inverter]) -> InverterColumns:
        """Columns of a list of inverters."""
        scalars = (
            "ac_power_w", "max_dc_voltage_v", "mppt_low_v", "mppt_high_v", "start_voltage_v",
            "max_array_power_w", "weighted_efficiency_pct",
        )  # fmt: skip
        first = [i.inputs[0] for i in inverters]
        sandia = np.array([[getattr(i, p) for p in SANDIA_PARAMETERS] for i in inverters], dtype=float)
        sandia = sandia.reshape(len(inverters), len(SANDIA_PARAMETERS))
        # A set with a gap is no model: the whole row is then unknown.
        sandia[np.isnan(sandia).any(axis=1)] = np.nan
        return cls(
            records=tuple(inverters),
            sandia=sandia,
            single=np.array([len(i.inputs) == 1 and i.inputs[0].trackers == 1 for i in inverters], dtype=bool),
            **{name: column(inverters, name) for name in scalars},
            **{name: column(first, name) for name in ("strings_per_tracker", "max_current_a", "max_isc_a")},
        )
