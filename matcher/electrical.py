"""Voltages and currents of one module at the design temperatures.

All functions take several modules at once; a quantity that cannot be known is NaN, and a module that
cannot be matched at all carries the reason.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

import numpy as np

from catalog.records import MOUNTINGS, SIX_PARAMETERS, Module, Site
from matcher.columns import column
from matcher.errors import MatcherError
from matcher.rules import RuleSet, cold_factor
from matcher.singlediode import (
    FITTED_FROM, SixParameters, at_conditions, fit_six_parameters, max_power_point, open_circuit_voltage,
    six_parameters,
)  # fmt: skip

if TYPE_CHECKING:
    from matcher.moduleyear import PlaneYear

#: NOCT [degC] that stands in where a record has none.
ASSUMED_NOCT_C = 45.0


@dataclass(frozen=True, slots=True, eq=False)
class Points:
    """Design values of n modules; every array has shape (n,).

    Voltages in V and currents in A per module. ``voc_hot_v`` is NaN where the record has no coefficient
    of Voc. ``reasons`` holds, per module, why it cannot be matched, or ``None``.
    """

    cell_cold_c: np.ndarray
    cell_hot_c: np.ndarray
    voc_cold_v: np.ndarray
    voc_hot_v: np.ndarray
    vmp_hot_v: np.ndarray
    vmp_25_v: np.ndarray
    vmp_cold_v: np.ndarray
    isc_design_a: np.ndarray
    imp_a: np.ndarray
    pmax_w: np.ndarray
    reasons: tuple[str | None, ...]

    def take(self, m: int) -> Points:
        """The values of one module."""
        return Points(*(getattr(self, f.name)[m : m + 1] for f in fields(self)))


def hot_adder(module: Module, site: Site) -> float:
    """Rise of the cell over ambient [K] at 1000 W/m2: NOCT, and the adder of the mounting.

    References
    ----------
    Ross 1980; P. Gilman, "SAM Photovoltaic Model Technical Reference", 2015, NREL/TP-6A20-64102.
    """
    noct = ASSUMED_NOCT_C if module.noct_c is None else module.noct_c
    return (noct + MOUNTINGS[site.mounting] - 20.0) / 800.0 * 1000.0


def uses_cold_table(module: Module, rules: RuleSet) -> bool:
    """Whether the cold Voc comes from NEC Table 690.7(A) and not from the datasheet's coefficient."""
    return module.voc_coef_pct is None or (rules.cold_voltage == "table" and module.crystalline)


def diode_parameters(module: Module) -> SixParameters | None:
    """Six-parameter model of a module; ``None`` where the record does not allow one."""
    try:
        return six_parameters(module)
    except MatcherError:
        return None


def vmp(module: Module, cell_c: np.ndarray | float, diode: SixParameters | None) -> np.ndarray | None:
    """Voltage at the maximum power point [V] at 1000 W/m2 and the given cell temperatures [degC].

    From the coefficient of Vmp where it is stated, else from the six-parameter model, else from the
    coefficients of Pmax and Isc; ``None`` where none of these can be had. Never from the coefficient of
    Voc, which reads high in the heat.
    """
    t = np.asarray(cell_c, dtype=float)
    if module.vmp_coef_pct is not None:
        return module.vmp_v * (1.0 + module.vmp_coef_pct / 100.0 * (t - 25.0))
    if diode is not None:
        return np.asarray(max_power_point(diode, np.full_like(t, 1000.0), t)[0])
    if module.pmax_coef_pct is not None and module.isc_coef_pct is not None:
        return module.vmp_v * (1.0 + (module.pmax_coef_pct - module.isc_coef_pct) / 100.0 * (t - 25.0))
    return None


def power_in_heat(module: Module, site: Site) -> tuple[float, float, float] | None:
    """Vmp [V] and power [W] at 1000 W/m2 and the hot design point, and its cell temperature [degC].

    ``None`` where the record allows neither the model nor the coefficient of Pmax.
    """
    cell = site.design_high_c + hot_adder(module, site)
    diode = diode_parameters(module)
    if diode is not None:
        volts, amps = max_power_point(diode, 1000.0, cell)
        return float(volts), float(volts * amps), cell
    volts_by_rule = vmp(module, cell, None)
    if module.pmax_coef_pct is None or volts_by_rule is None:
        return None
    return float(volts_by_rule), module.pmax_w * (1.0 + module.pmax_coef_pct / 100.0 * (cell - 25.0)), cell


def _cold_voc(module: Module, site: Site, rules: RuleSet) -> float | str:
    """Voc at the design low [V], or the reason why there is none."""
    if not uses_cold_table(module, rules):
        assert module.voc_coef_pct is not None
        return module.voc_v * (1.0 + module.voc_coef_pct / 100.0 * (site.design_low_c - 25.0))
    if not module.crystalline:
        return "voc_coef_pct is not stated, and no table replaces it for this technology"
    factor = cold_factor(site.design_low_c)
    if factor is None:
        return "voc_coef_pct is not stated, and NEC Table 690.7(A) ends at -40 degC"
    return module.voc_v * factor


def _isc_design(module: Module, site: Site, rules: RuleSet) -> float | str:
    """Design short-circuit current [A], or the reason why there is none."""
    current = module.isc_a * rules.isc_factor
    if module.bifacial and site.rear_share:
        if module.bifaciality is None:
            return "bifaciality is not stated, and the site gives a rear share"
        current *= 1.0 + module.bifaciality * site.rear_share
    return current


def diodes_of(modules: Sequence[Module]) -> SixParameters:
    """Six-parameter models of several modules as arrays, shape (modules,); NaN where there is none."""
    columns = {p: column(modules, p) for p in SIX_PARAMETERS}
    alpha = column(modules, "isc_coef_pct") / 100.0 * column(modules, "isc_a")
    columns["alpha_sc"] = alpha
    gaps = np.flatnonzero(np.isnan(np.array(list(columns.values()))).any(axis=0))
    if len(gaps):
        fitted = fit_six_parameters(*(column([modules[k] for k in gaps], name) for name in FITTED_FROM))
        for name, values in columns.items():
            values[gaps] = getattr(fitted, name)
    return SixParameters(**columns)


def _vmp_at(modules: Sequence[Module], temperatures: np.ndarray) -> np.ndarray:
    """Vmp [V] of n modules at their own temperatures, shape (n, 3); NaN rows where it cannot be had."""
    out = np.full(temperatures.shape, np.nan)
    stated = ~np.isnan(column(modules, "vmp_coef_pct"))
    modelled = np.flatnonzero(~stated)
    if len(modelled):
        diodes = diodes_of([modules[k] for k in modelled])
        for c in range(temperatures.shape[1]):
            t = temperatures[modelled, c]
            out[modelled, c] = max_power_point(diodes, np.full_like(t, 1000.0), t)[0]
    # What is left has a coefficient of Vmp, or no model and perhaps the coefficients of Pmax and Isc.
    for k in np.flatnonzero(stated | np.isnan(out).any(axis=1)):
        found = vmp(modules[k], temperatures[k], None)
        if found is not None:
            out[k] = found
    return out


def hourly_voc(modules: Sequence[Module], plane: PlaneYear, rules: RuleSet) -> tuple[np.ndarray, np.ndarray]:
    """Highest modelled Voc over a year's sunlit hours with the rule set's margin [V], and its cell temperature.

    Shape (n,) each, NaN where a record does not allow the model. Only hours that no other one beats in both
    irradiance and cold can hold the highest Voc.

    References
    ----------
    T. Karin, A. Jain, "Photovoltaic String Sizing Using Site-Specific Modeling", IEEE J. Photovoltaics 2020,
    doi:10.1109/JPHOTOV.2020.2969788 (from memory; the margin is the user's).
    """
    order = np.lexsort((plane.cell_c, -plane.irradiance))
    cell = plane.cell_c[order]
    beaten = cell >= np.append(np.inf, np.minimum.accumulate(cell)[:-1])
    front = order[~beaten]
    diodes = diodes_of(modules)
    voc = open_circuit_voltage(at_conditions(diodes), plane.irradiance[front], plane.cell_c[front])
    voc[np.isnan(voc)] = -np.inf
    best = voc.argmax(axis=1)
    highest = voc[np.arange(len(modules)), best] * (1.0 + rules.cold_margin_pct / 100.0)
    return np.where(np.isfinite(highest), highest, np.nan), plane.cell_c[front][best]


def design_points(
    modules: Sequence[Module], site: Site, rules: RuleSet, plane: PlaneYear | None = None
) -> Points:
    """Voltages and currents of each module at the site's design temperatures.

    ``plane`` is the year on the site's array, which the cold-voltage method ``hourly`` needs.

    Raises
    ------
    MatcherError
        Where the rule set takes the cold voltage from hourly weather and there is none.

    References
    ----------
    NEC 690.7(A), 690.8(A)(1); IEC 62548 (K_I); De Soto et al. 2006, doi:10.1016/j.solener.2005.06.010;
    Dobos 2012, doi:10.1115/1.4005759.
    """
    n = len(modules)
    cold = np.full(n, site.design_low_c, dtype=float)
    hot = np.array([site.design_high_c + hot_adder(m, site) for m in modules], dtype=float)
    voc_cold, isc = np.full(n, np.nan), np.full(n, np.nan)
    voc_hot = np.full(n, np.nan)
    reasons: list[str | None] = [None] * n
    for k, module in enumerate(modules):
        if module.voc_coef_pct is not None:
            voc_hot[k] = module.voc_v * (1.0 + module.voc_coef_pct / 100.0 * (hot[k] - 25.0))
        wanted = [(isc, _isc_design(module, site, rules))]
        if rules.cold_voltage != "hourly":
            wanted.insert(0, (voc_cold, _cold_voc(module, site, rules)))
        for target, found in wanted:
            if isinstance(found, str):
                reasons[k] = reasons[k] or found
            else:
                target[k] = found
    if rules.cold_voltage == "hourly":
        if plane is None:
            raise MatcherError(
                f"rule set {rules.name} takes the cold voltage from hourly weather: give the site a weather file"
            )
        voc_cold, cold = hourly_voc(modules, plane, rules)
        for k in np.flatnonzero(np.isnan(voc_cold)):
            missing = [c for c in ("voc_coef_pct", "isc_coef_pct", "pmax_coef_pct") if getattr(modules[k], c) is None]
            named = f"needs {', '.join(missing)}, not stated" if missing else "needs a model, and none fits the record"
            reasons[k] = f"the hourly cold voltage {named}"
    vmps = _vmp_at(modules, np.column_stack([hot, np.full(n, 25.0), cold]))
    for k in np.flatnonzero(~(vmps > 0).all(axis=1)):
        missing = [c for c in ("isc_coef_pct", "pmax_coef_pct") if getattr(modules[k], c) is None]
        wanted = " and ".join(missing) if missing else "vmp_coef_pct"
        reasons[k] = reasons[k] or f"Vmp in the heat needs {wanted} (or vmp_coef_pct), not stated"
    return Points(
        cell_cold_c=cold,
        cell_hot_c=hot,
        voc_cold_v=voc_cold,
        voc_hot_v=voc_hot,
        vmp_hot_v=vmps[:, 0],
        vmp_25_v=vmps[:, 1],
        vmp_cold_v=vmps[:, 2],
        isc_design_a=isc,
        imp_a=np.array([m.imp_a for m in modules], dtype=float),
        pmax_w=np.array([m.pmax_w for m in modules], dtype=float),
        reasons=tuple(reasons),
    )
