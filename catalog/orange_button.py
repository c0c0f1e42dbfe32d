"""Names, units and words of the open data standard Orange Button, as far as a datasheet needs them.

References
----------
SunSpec Alliance, Orange Button taxonomy, OpenAPI definition version 1.1.7 (Apache-2.0): the objects ``ProdModule``
and ``ProdInverter`` with the ``Product`` that both extend, ``ModuleElectRating``, ``DCInput``, ``MPPT``, ``ACOutput``,
``InverterEfficiency``, ``Dimension`` and ``ProdSpecification``. A value is ``{"Value": ..., "Unit": ...}``.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

#: The type of product (``ProdType``) by kind of record; also the name of its object.
PRODUCTS: Mapping[str, str] = MappingProxyType({"module": "ProdModule", "inverter": "ProdInverter"})

#: Path in the object by field. A list is entered at its first element; of ``ModuleElectRatings`` at that for STC.
MODULE: Mapping[str, tuple[str, ...]] = MappingProxyType({
    "maker": ("ProdMfr",),
    "model": ("ProdName",),
    "technology": ("ProdCell", "CellTechnologyType"),
    "cells_in_series": ("CellsInSeries",),
    "bifacial": ("IsBifacial",),
    "pmax_w": ("PowerSTC",),
    "voc_v": ("ModuleElectRatings", "VoltageOpenCircuit"),
    "isc_a": ("ModuleElectRatings", "CurrentShortCircuit"),
    "vmp_v": ("ModuleElectRatings", "VoltageAtMaximumPower"),
    "imp_a": ("ModuleElectRatings", "CurrentAtMaximumPower"),
    "voc_coef_pct": ("TemperatureCoefficientOpenCircuitVoltage",),
    "isc_coef_pct": ("TemperatureCoefficientShortCircuitCurrent",),
    "pmax_coef_pct": ("TemperatureCoefficientMaximumPower",),
    "vmp_coef_pct": ("TemperatureCoefficientMaxPowerVoltage",),
    "noct_c": ("TemperatureNOCT",),
    "max_system_voltage_v": ("VoltageMaximumSystem",),
    "max_series_fuse_a": ("FuseSeriesRating",),
    "length_m": ("Dimension", "Length"),
    "width_m": ("Dimension", "Width"),
})  # fmt: skip
INVERTER: Mapping[str, tuple[str, ...]] = MappingProxyType({
    "maker": ("ProdMfr",),
    "model": ("ProdName",),
    "ac_power_w": ("ACOutputs", "PowerACNom"),
    "ac_voltage_v": ("ACOutputs", "VoltageACNom"),
    "phases": ("ACOutputs", "PowerPhaseType"),
    "max_dc_voltage_v": ("DCInput", "VoltageDCMax"),
    "start_voltage_v": ("VoltageDCInverterStart",),
    "max_array_power_w": ("DCInput", "PowerDCContinuousMax"),
    "weighted_efficiency_pct": ("InverterEfficiency", "InverterEfficiencyCEC"),
    "night_w": ("NightTare",),
})  # fmt: skip
FIELDS: Mapping[str, Mapping[str, tuple[str, ...]]] = MappingProxyType(
    {"module": MODULE, "inverter": INVERTER}
)

#: Where a field is taken from when its own place is empty: the maximum continuous AC power, power among the ratings.
ELSEWHERE: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "pmax_w": ("ModuleElectRatings", "PowerDC"),
        "ac_power_w": ("ACOutputs", "PowerACMax"),
        "model": ("ProdCode",),
    }
)

#: One tracker, an element of ``DCInput.MPPTs``.
TRACKER: Mapping[str, str] = MappingProxyType(
    {
        "strings_per_tracker": "MPPTInputStrings",
        "max_current_a": "CurrentDCMax",
        "max_isc_a": "CurrentShortCircuitMax",
    }
)
WINDOW: Mapping[str, str] = MappingProxyType(
    {"mppt_low_v": "VoltageMPPTMin", "mppt_high_v": "VoltageMPPTMax"}
)

#: Units of the standard in the spelling of `catalog.units`.
UNITS: Mapping[str, str] = MappingProxyType({
    "V": "V", "kV": "kV", "A": "A", "W": "W", "kW": "kW", "MW": "MW", "VA": "VA", "kVA": "kVA", "MVA": "MVA",
    "m": "m", "mm": "mm", "cm": "cm", "dm": "dm", "in": "in", "ft": "ft",
    "Cel": "degC", "K": "K", "F": "degF", "decimal_percent": "fraction",
    "percent_per_Cel": "%/K", "pu_per_Cel": "1/K", "V_per_Cel": "V/K", "A_per_Cel": "A/K", "W_per_Cel": "W/K",
})  # fmt: skip
#: And the other way: the unit in which a field is written.
WRITTEN: Mapping[str, str] = MappingProxyType(
    {"V": "V", "A": "A", "W": "W", "m": "m", "degC": "Cel", "%/K": "percent_per_Cel", "%": "decimal_percent"}
)

#: Words for the technology of cells (``CellTechnologyItemType``).
TECHNOLOGIES: Mapping[str, str] = MappingProxyType({
    "MonoSi": "Mono-c-Si", "PolySi": "Multi-c-Si", "HJT": "Heterojunction silicon", "ASi": "Amorphous silicon thin film",
    "ASi_tandem": "Amorphous silicon tandem", "ThinFilm": "Thin film", "CIGS": "CIGS", "CdTe": "CdTe", "Other": "Other",
})  # fmt: skip
#: Phases (``PowerPhaseTypeItemType``); a split phase is a kind of single phase.
PHASES: Mapping[str, int] = MappingProxyType({"Single": 1, "Split": 1, "Two": 2, "Three": 3})
