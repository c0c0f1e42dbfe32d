"""The climate window of an option: the checks solved for ambient temperature."""

from __future__ import annotations

import numpy as np

from catalog.records import Inverter, Module, Site
from matcher.checks import ModulePoints
from matcher.electrical import diode_parameters, hot_adder, uses_cold_table, vmp
from matcher.limits import TOLERANCE, voltage_cap
from matcher.rules import RuleSet, coldest_for_factor

#: Cell temperatures [degC] beyond the design hot point at which Vmp is tabulated; 0.5 K apart, linear between.
HOTTEST_CELL_C = 150.0
_STEP_K = 0.5

#: No ambient temperature is lower.
ABSOLUTE_ZERO_C = -273.15


class ClimateWindow:
    """Climate windows of one module under one site and rule set, for any inverter and string length."""

    def __init__(self, module: Module, points: ModulePoints, site: Site, rules: RuleSet) -> None:
        self._module, self._points, self._site, self._rules = module, points, site, rules
        self._adder = hot_adder(module, site)
        self._cell = np.arange(points.cell_hot_c, max(HOTTEST_CELL_C, points.cell_hot_c + 1.0), _STEP_K)
        self._vmp: np.ndarray | None = None

    def coldest(self, inverter: Inverter, longest: int) -> float | None:
        """Coldest ambient [degC] at which every voltage maximum that is known still holds.

        An unstated max DC voltage counts as the top of the MPPT window where the option relies on that
        inference, and not at all where the option is to be confirmed anyway. ``None``: nothing known bounds it,
        or the cold voltage comes from hourly weather and not from a temperature.
        """
        if self._rules.cold_voltage == "hourly":
            return None
        known = self.known_maxima(inverter, longest)
        if not known:
            return None
        allowed = min(known) / (longest * self._module.voc_v)
        if uses_cold_table(self._module, self._rules):
            return coldest_for_factor(allowed * (1.0 + TOLERANCE))
        coefficient = self._module.voc_coef_pct
        if not coefficient:
            return None
        coldest = 25.0 + (allowed - 1.0) / (coefficient / 100.0)
        return coldest if coldest > ABSOLUTE_ZERO_C else None

    def known_maxima(self, inverter: Inverter, longest: int) -> list[float]:
        """Voltage maxima of strings up to this length that are on record or may be inferred [V]."""
        cap = voltage_cap(self._site, self._rules)
        known = [v for v in (inverter.max_dc_voltage_v, self._module.max_system_voltage_v) if v is not None]
        if cap == cap:
            known.append(cap)
        if inverter.max_dc_voltage_v is None:
            inferred = inverter.mppt_high_v
            if longest * self._points.voc_cold_v <= inferred * (1.0 + TOLERANCE):
                known.append(inferred)
        return known

    def cold_is_open(self, inverter: Inverter, longest: int) -> bool:
        """Whether a voltage maximum that is not on record may bound the cold end more narrowly than `coldest`."""
        if self._module.max_system_voltage_v is None:
            return True
        beyond = longest * self._points.voc_cold_v > inverter.mppt_high_v * (1.0 + TOLERANCE)
        return inverter.max_dc_voltage_v is None and beyond

    def heat_is_open(self, inverter: Inverter) -> bool:
        """Whether a coefficient that is not on record may bound the hot end more narrowly than `hottest`."""
        return inverter.start_voltage_v is not None and self._module.voc_coef_pct is None

    def hottest(self, inverter: Inverter, shortest: int) -> float | None:
        """Hottest ambient [degC] at which mppt-low and start still hold; ``None``: none up to 150 degC of the cell."""
        cell = [self._hottest_vmp(inverter.mppt_low_v / shortest)]
        start, coefficient = inverter.start_voltage_v, self._module.voc_coef_pct
        if start is not None and coefficient:
            cell.append(25.0 + (start / (shortest * self._module.voc_v) - 1.0) / (coefficient / 100.0))
        elif start is not None and coefficient is None:
            # Vmp stands in for the unknown Voc where it alone already proves the start.
            if shortest * self._points.vmp_hot_v >= start * (1.0 - TOLERANCE):
                cell.append(self._hottest_vmp(start / shortest))
        bounds = [c for c in cell if c is not None and c <= HOTTEST_CELL_C]
        return min(bounds) - self._adder if bounds else None

    def _hottest_vmp(self, volts: float) -> float | None:
        if self._vmp is None:
            stated = self._module.vmp_coef_pct is not None
            table = vmp(self._module, self._cell, None if stated else diode_parameters(self._module))
            assert table is not None  # a module without Vmp in the heat is never matched
            self._vmp = table
        below = np.flatnonzero(~(self._vmp >= volts))
        if not len(below):
            return None
        k = int(below[0])
        if k == 0:
            return float(self._cell[0])
        high, low = self._vmp[k - 1], self._vmp[k]
        return float(self._cell[k - 1] + (high - volts) / (high - low) * _STEP_K)
