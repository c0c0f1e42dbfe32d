"""The record types: one module type, one inverter type, one site.

This file is the single list of fields. The tables (`catalog.tables`), the plausibility check, the
import and export forms and the screens are all derived from it, so a field is added here and nowhere
else. A value that no source states is ``None``, never 0.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from enum import StrEnum
from functools import cache
from typing import Any


class Origin(StrEnum):
    """Where one value of a record came from."""

    STATED = "stated"  # a datasheet or table gives it
    ENTERED = "entered"  # a person typed it
    DERIVED = "derived"  # computed from other values
    ASSUMED = "assumed"  # a default stands in


@dataclass(frozen=True, slots=True)
class Source:
    """The document that values were read from: its name and its revision or date."""

    name: str
    revision: str = ""

    def __str__(self) -> str:
        return f"{self.name}, {self.revision}" if self.revision else self.name


@dataclass(frozen=True, slots=True)
class FieldSpec:
    """What is known of one field: its name, type, unit, meaning and the range that is possible at all."""

    name: str
    type: type
    unit: str
    meaning: str
    required: bool
    low: float | None = None
    high: float | None = None


def _value(
    meaning: str,
    type_: type = float,
    unit: str = "",
    *,
    required: bool = False,
    low: float | None = None,
    high: float | None = None,
) -> Any:
    """Declare a record field together with its specification."""
    meta = {"spec": (type_, unit, meaning, required, low, high)}
    return field(metadata=meta) if required else field(default=None, metadata=meta)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Sheet:
    """What modules and inverters have in common: a name, a source, an origin per value.

    ``origins`` lists only the values whose origin is not ``stated``; ``sources`` only those that were
    read from another document than ``source``.
    """

    maker: str = _value("maker", str, required=True)
    model: str = _value("model", str, required=True)
    id: int | None = None
    revision: int = 1
    source: Source = Source("unnamed source")
    origins: Mapping[str, Origin] = field(default_factory=dict)
    sources: Mapping[str, Source] = field(default_factory=dict)

    @property
    def name(self) -> str:
        """Full name, "Maker Model"."""
        return f"{self.maker} {self.model}"

    def origin(self, field_name: str) -> Origin | None:
        """Origin of one value; ``None`` where there is no value."""
        if getattr(self, field_name) is None:
            return None
        return self.origins.get(field_name, Origin.STATED)

    def source_of(self, field_name: str) -> Source:
        """Document that one value was read from."""
        return self.sources.get(field_name, self.source)


@dataclass(frozen=True, slots=True, kw_only=True)
class Module(_Sheet):
    """One module type. Electrical values at STC; temperature coefficients in % of the STC value per K.

    The last six fields are the parameters of the CEC single-diode model under their published names
    (De Soto 2006, doi:10.1016/j.solener.2005.06.010; Dobos 2012, doi:10.1115/1.4005759).
    """

    technology: str = _value("cell technology", str, required=True)
    cells_in_series: int | None = _value("cells in series", int, low=1, high=1000)
    bifacial: bool = _value("bifacial", bool, required=True)
    bifaciality: float | None = _value("rear to front power ratio", unit="1", low=0, high=1.2)
    pmax_w: float = _value("power at the maximum power point", unit="W", required=True, low=0.5, high=2000)
    voc_v: float = _value("open-circuit voltage", unit="V", required=True, low=0.3, high=400)
    isc_a: float = _value("short-circuit current", unit="A", required=True, low=0.05, high=60)
    vmp_v: float = _value("voltage at the maximum power point", unit="V", required=True, low=0.2, high=400)
    imp_a: float = _value("current at the maximum power point", unit="A", required=True, low=0.05, high=60)
    voc_coef_pct: float | None = _value("temperature coefficient of Voc", unit="%/K", low=-1.5, high=0.0)
    isc_coef_pct: float | None = _value("temperature coefficient of Isc", unit="%/K", low=-0.5, high=0.8)
    pmax_coef_pct: float | None = _value("temperature coefficient of Pmax", unit="%/K", low=-1.5, high=0.0)
    vmp_coef_pct: float | None = _value("temperature coefficient of Vmp", unit="%/K", low=-1.8, high=0.0)
    noct_c: float | None = _value("nominal operating cell temperature", unit="degC", low=30, high=80)
    max_system_voltage_v: float | None = _value("maximum system voltage", unit="V", low=10, high=3000)
    max_series_fuse_a: float | None = _value("maximum series fuse rating", unit="A", low=0.5, high=100)
    length_m: float | None = _value("length", unit="m", low=0.05, high=8)
    width_m: float | None = _value("width", unit="m", low=0.05, high=4)
    a_ref: float | None = _value("modified ideality factor", unit="V", low=0.0)
    I_L_ref: float | None = _value("light current", unit="A", low=0.0)
    I_o_ref: float | None = _value("diode reverse saturation current", unit="A", low=0.0)
    R_s: float | None = _value("series resistance", unit="ohm", low=0.0)
    R_sh_ref: float | None = _value("shunt resistance", unit="ohm", low=0.0)
    Adjust: float | None = _value("adjustment of the Isc coefficient", unit="%", low=-100, high=100)

    @property
    def crystalline(self) -> bool:
        """Whether the words of the technology name crystalline silicon cells and nothing else."""
        return _is_crystalline(self.technology)


_OTHER_CELLS = ("thin", "cdte", "cigs", "cis", "amorph", "a-si", "tandem", "organic", "perovskite", "gaas")
_CRYSTALLINE = ("c-si", "mono", "multi", "poly", "perc", "topcon", "crystal", "hjt", "heterojunction", "ibc")


@cache
def _is_crystalline(technology: str) -> bool:
    words = technology.casefold()
    return not any(w in words for w in _OTHER_CELLS) and any(w in words for w in _CRYSTALLINE)


def names_cells(technology: str) -> bool:
    """Whether the words of a technology name any kind of cell."""
    words = technology.casefold()
    return any(w in words for w in (*_OTHER_CELLS, *_CRYSTALLINE))


#: What a technology may say, for those who are asked; words such as PERC, TOPCon or half-cell may stand behind.
TECHNOLOGIES = ("Mono-c-Si", "Multi-c-Si", "Heterojunction", "CdTe", "CIGS", "Thin film")


@dataclass(frozen=True, slots=True, kw_only=True)
class Inputs:
    """A group of like trackers of one inverter. Currents and power are per tracker."""

    trackers: int = _value("like trackers (MPPT) in this group", int, required=True, low=1, high=200)
    strings_per_tracker: int | None = _value("strings that connect to one tracker", int, low=1, high=500)
    max_current_a: float | None = _value("maximum operating current of one tracker", unit="A", low=0.1, high=10000)
    max_isc_a: float | None = _value("maximum short-circuit current of one tracker", unit="A", low=0.1, high=20000)
    max_power_w: float | None = _value("maximum power of one tracker", unit="W", low=1, high=1e7)


@dataclass(frozen=True, slots=True, kw_only=True)
class Inverter(_Sheet):
    """One inverter type.

    The last nine fields are the parameters of the Sandia model under their published names
    (King et al. 2007, SAND2007-5036, doi:10.2172/920449).
    """

    ac_power_w: float = _value("rated AC power", unit="W", required=True, low=10, high=2e7)
    ac_voltage_v: float | None = _value("nominal AC voltage", unit="V", low=50, high=40000)
    phases: int | None = _value("AC phases", int, low=1, high=3)
    max_dc_voltage_v: float | None = _value("maximum DC input voltage", unit="V", low=10, high=3000)
    mppt_low_v: float = _value("lower end of the MPPT window", unit="V", required=True, low=1, high=3000)
    mppt_high_v: float = _value("upper end of the MPPT window", unit="V", required=True, low=2, high=3000)
    start_voltage_v: float | None = _value("start voltage", unit="V", low=1, high=3000)
    max_array_power_w: float | None = _value("maximum array power", unit="W", low=10, high=1e8)
    inputs: tuple[Inputs, ...] = (Inputs(trackers=1),)
    weighted_efficiency_pct: float | None = _value("weighted efficiency", unit="%", low=50, high=100)
    night_w: float | None = _value("power drawn at night", unit="W", low=0, high=1e5)
    operating_dc_current_a: float | None = _value(
        "DC current at rated power (Pdco / Vdco; an operating point, never a limit)", unit="A", low=0
    )
    Pso: float | None = _value("DC power to start inversion", unit="W", low=0)
    Paco: float | None = _value("maximum AC power of the model", unit="W", low=0)
    Pdco: float | None = _value("DC power at which Paco is reached", unit="W", low=0)
    Vdco: float | None = _value("DC voltage at which Paco is reached", unit="V", low=0)
    C0: float | None = _value("curvature of AC against DC power", unit="1/W")
    C1: float | None = _value("variation of Pdco with DC voltage", unit="1/V")
    C2: float | None = _value("variation of Pso with DC voltage", unit="1/V")
    C3: float | None = _value("variation of C0 with DC voltage", unit="1/V")
    Pnt: float | None = _value("night tare of the model", unit="W", low=0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Site:
    """Design temperatures of a place, how the array is mounted, and optionally where it stands and its weather."""

    name: str = _value("name of the site", str, required=True)
    design_low_c: float = _value("design low ambient temperature", unit="degC", required=True, low=-70, high=40)
    design_high_c: float = _value("design high ambient temperature", unit="degC", required=True, low=-20, high=60)
    mounting: str = "open-rack"
    voltage_cap_v: float | None = _value("cap on the DC voltage", unit="V", low=10, high=3000)
    rear_share: float | None = _value("rear irradiance as a share of the front", unit="1", low=0, high=1)
    lat: float | None = _value("latitude", unit="deg", low=-90, high=90)
    lon: float | None = _value("longitude", unit="deg", low=-180, high=180)
    tilt: float | None = _value("tilt from the horizontal", unit="deg", low=0, high=90)
    azimuth: float | None = _value("azimuth, clockwise from north", unit="deg", low=0, high=360)
    weather: str | None = _value("path of a weather file", str)


#: Stand-off adders to NOCT in K (Gilman 2015, the table that pvlib's ``noct_sam`` carries).
MOUNTINGS: Mapping[str, float] = {"open-rack": 0.0, "gap-roof": 2.0, "near-roof": 11.0, "integrated": 18.0}

SIX_PARAMETERS = ("a_ref", "I_L_ref", "I_o_ref", "R_s", "R_sh_ref", "Adjust")
SANDIA_PARAMETERS = ("Pso", "Paco", "Pdco", "Vdco", "C0", "C1", "C2", "C3")


@cache
def specs(record_type: type) -> Mapping[str, FieldSpec]:
    """Specifications of the value fields of a record type, by field name, in order."""
    found = {}
    for f in fields(record_type):
        if "spec" in f.metadata:
            type_, unit, meaning, required, low, high = f.metadata["spec"]
            found[f.name] = FieldSpec(f.name, type_, unit, meaning, required, low, high)
    return found
