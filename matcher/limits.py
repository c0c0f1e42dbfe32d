"""The checks of `matcher.checks` solved for string length, strings and module count.

What is here bounds the search; it decides nothing that the checks would not. A limit that is met to within
`TOLERANCE` (relative) is met, so that rounding in the last digit of a float never turns a pair down.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from catalog.records import Site
from matcher.columns import InverterColumns
from matcher.electrical import Points
from matcher.rules import RuleSet

TOLERANCE = 1e-9

#: Stands for "no limit stated" where an integer is needed; the ratio window bounds the search then.
UNLIMITED = 2**31 - 1


def at_most(limit: np.ndarray, each: np.ndarray) -> np.ndarray:
    """Largest whole n with ``n * each <= limit``; `UNLIMITED` where either is unknown (NaN)."""
    with np.errstate(invalid="ignore", divide="ignore"):
        n = np.floor(limit / each * (1.0 + TOLERANCE))
    # fmin and fmax pass over NaN.
    return np.fmax(np.fmin(n, UNLIMITED), 0).astype(np.int64)


def at_least(limit: np.ndarray, each: np.ndarray) -> np.ndarray:
    """Smallest whole n with ``n * each >= limit``; 0 where either is unknown (NaN)."""
    with np.errstate(invalid="ignore", divide="ignore"):
        n = np.ceil(limit / each * (1.0 - TOLERANCE))
    return np.fmin(np.fmax(n, 0), UNLIMITED).astype(np.int64)


def voltage_cap(site: Site, rules: RuleSet) -> float:
    """Cap on the DC voltage [V], the lower one of site and rule set; NaN where none is set."""
    caps = [cap for cap in (site.voltage_cap_v, rules.voltage_cap_v) if cap is not None]
    return min(caps, default=np.nan)


@dataclass(frozen=True, slots=True, eq=False)
class PairLimits:
    """Bounds for n pairs of a module and an inverter; every array has shape (n,).

    String lengths run from ``shortest`` to ``longest`` [modules in series]; those from ``sure_from`` to
    ``sure_to`` leave no voltage to confirm. Module counts of one inverter run from ``fewest`` to ``most``.
    ``voltage_limit_v`` is the lowest maximum that is known (max DC voltage, or the top of the MPPT window
    in its place; system voltage; cap), to which the cold-voltage margin refers.
    """

    shortest: np.ndarray
    longest: np.ndarray
    sure_from: np.ndarray
    sure_to: np.ndarray
    fewest: np.ndarray
    most: np.ndarray
    voltage_limit_v: np.ndarray


def pair_limits(
    points: Points,
    inverters: InverterColumns,
    module: np.ndarray,
    inverter: np.ndarray,
    system_voltage_v: np.ndarray,
    site: Site,
    rules: RuleSet,
    ratio: tuple[float, float],
    counts: tuple[int, int] | None,
) -> PairLimits:
    """Bounds for the pairs ``(module[j], inverter[j])``, both index arrays of shape (n,).

    ``system_voltage_v`` is the modules' maximum system voltage [V], NaN where it is not stated.
    """
    voc_cold, vmp_hot = points.voc_cold_v[module], points.vmp_hot_v[module]
    voc_hot, vmp_25 = points.voc_hot_v[module], points.vmp_25_v[module]
    pmax = points.pmax_w[module]
    max_dc, high = inverters.max_dc_voltage_v[inverter], inverters.mppt_high_v[inverter]
    start = inverters.start_voltage_v[inverter]
    system = system_voltage_v[module]
    cap = np.full(len(module), voltage_cap(site, rules))

    longest = np.minimum.reduce(
        [at_most(max_dc, voc_cold), at_most(system, voc_cold), at_most(cap, voc_cold), at_most(high, vmp_25)]
    )
    shortest = np.maximum(np.maximum(at_least(inverters.mppt_low_v[inverter], vmp_hot), at_least(start, voc_hot)), 1)

    # A max DC voltage that nobody states is at least the top of the MPPT window (the one inference allowed).
    sure_to = np.where(np.isnan(max_dc), at_most(high, voc_cold), longest)
    sure_to = np.where(np.isnan(system), 0, np.minimum(sure_to, longest))
    # Voc in the heat is above Vmp in the heat, also where no coefficient of Voc is stated.
    sure_from = np.where(np.isnan(voc_hot), np.maximum(at_least(start, vmp_hot), shortest), shortest)

    ac = inverters.ac_power_w[inverter]
    fewest = np.maximum(at_least(ratio[0] * ac, pmax), 1)
    most = np.minimum(at_most(ratio[1] * ac, pmax), at_most(inverters.max_array_power_w[inverter], pmax))
    if counts is not None:
        fewest, most = np.maximum(fewest, counts[0]), np.minimum(most, counts[1])

    reasonless = np.array([r is None for r in points.reasons], dtype=bool)[module]
    longest = np.where(reasonless, longest, 0)
    ceiling = np.fmin(np.fmin(np.where(np.isnan(max_dc), high, max_dc), system), cap)
    return PairLimits(shortest, longest, sure_from, sure_to, fewest, most, ceiling)
