"""Unlike modules wired together: I-V curves added in series and in parallel.

In a string the current is common, so voltages add, and the module with the weaker current limits the others
until its bypass diodes take over. Strings on one tracker have the voltage in common, so currents add, and the
string with the lower voltage pulls the others away from their best point.

References
----------
J. W. Bishop, "Computer simulation of the effects of electrical mismatches in photovoltaic cell interconnection
circuits", Solar Cells 25, 1988, doi:10.1016/0379-6787(88)90059-2 (the explicit curve; by pvlib).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from matcher.singlediode import SixParameters

#: Voltage of a module whose bypass diodes conduct [V]: three of half a volt (common practice, no source).
BYPASSED_V = -1.5

_POINTS = 3000


@dataclass(frozen=True, slots=True, eq=False)
class Curve:
    """An I-V curve: current [A] ascending, and the voltage [V] at each, descending."""

    current_a: np.ndarray
    voltage_v: np.ndarray

    def voltage_at(self, current_a: np.ndarray) -> np.ndarray:
        """Voltage [V] at given currents; beyond the curve its last value, that of conducting bypass diodes."""
        return np.interp(current_a, self.current_a, self.voltage_v)

    def current_at(self, voltage_v: np.ndarray) -> np.ndarray:
        """Current [A] at given voltages."""
        return np.interp(voltage_v, self.voltage_v[::-1], self.current_a[::-1])

    @property
    def best(self) -> tuple[float, float]:
        """Voltage [V] and current [A] of the point of most power."""
        k = int(np.argmax(self.current_a * self.voltage_v))
        return float(self.voltage_v[k]), float(self.current_a[k])

    @property
    def power_w(self) -> float:
        """Most power of the curve [W]."""
        v, i = self.best
        return v * i


def module_curve(params: SixParameters, irradiance: float, cell_c: float) -> Curve:
    """Curve of one module at an irradiance [W/m2] and a cell temperature [degC], bypass diodes included."""
    from pvlib.pvsystem import calcparams_cec
    from pvlib.singlediode import bishop88

    light, dark, series, shunt, a = calcparams_cec(
        irradiance, cell_c, params.alpha_sc, params.a_ref, params.I_L_ref, params.I_o_ref, params.R_sh_ref, params.R_s,
        params.Adjust,
    )  # fmt: skip
    # From beyond short circuit, where the bypass diodes conduct, to beyond open circuit.
    highest = a * np.log1p(light / dark)
    # Evenly spaced in current along the flat part, in voltage along the steep one.
    diode = np.concatenate(
        [np.linspace(BYPASSED_V - 0.1, 0.6 * highest, 500), np.linspace(0.6, 1.12, _POINTS)[1:] * highest]
    )
    current, voltage, _ = bishop88(diode, light, dark, series, shunt, a)
    order = np.argsort(current)
    current, voltage = current[order], np.maximum(voltage[order], BYPASSED_V)
    return Curve(np.append(current, current[-1] * 1.5), np.append(voltage, BYPASSED_V))


def in_series(parts: Sequence[tuple[Curve, int]]) -> Curve:
    """Curve of a string of some modules of each curve."""
    parts = [(c, n) for c, n in parts if n]
    current = np.unique(np.concatenate([c.current_a for c, _ in parts]))
    return Curve(current, sum(n * c.voltage_at(current) for c, n in parts))


def in_parallel(parts: Sequence[tuple[Curve, int]]) -> Curve:
    """Curve of a tracker with some strings of each curve."""
    parts = [(c, n) for c, n in parts if n]
    voltage = np.unique(np.concatenate([c.voltage_v for c, _ in parts]))[::-1]
    current = sum(n * c.current_at(voltage) for c, n in parts)
    return Curve(current, voltage)
