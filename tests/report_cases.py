"""Small invented results for the tests of workbooks and reports."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from catalog.records import Inputs, Inverter, Module, Origin, Site
from cli.years import SiteYear
from matcher.fit import Fit, Request, fit
from matcher.moduleyear import ModuleYear

#: Names that would do harm where text is taken for markup or for a formula.
HOSTILE_MAKER = "=HYPERLINK(\"https://example.invalid/\",1)<script>alert('x')</script>"
HOSTILE_MODEL = "<img src=https://example.invalid/x.png onerror=alert(1)> & 'co' \"quoted\""

SITE = Site(name="Low Wharf", design_low_c=-12.0, design_high_c=36.0, mounting="gap-roof", lat=52.1, lon=4.3)

MODULE = Module(
    id=1,
    maker="Alderfell Solar",
    model="AF6K-270P",
    technology="Multi-c-Si",
    bifacial=False,
    cells_in_series=60,
    pmax_w=270.0,
    voc_v=38.2,
    isc_a=9.2,
    vmp_v=31.1,
    imp_a=8.68,
    voc_coef_pct=-0.31,
    isc_coef_pct=0.05,
    pmax_coef_pct=-0.41,
    vmp_coef_pct=-0.42,
    noct_c=45.0,
    max_system_voltage_v=1000.0,
    max_series_fuse_a=15.0,
)

#: Every rating is on record, two unlike groups of inputs.
DUO = Inverter(
    id=1,
    maker="Quillon",
    model="QN-8000 Duo",
    ac_power_w=8000.0,
    phases=3,
    max_dc_voltage_v=850.0,
    mppt_low_v=200.0,
    mppt_high_v=800.0,
    start_voltage_v=180.0,
    max_array_power_w=12000.0,
    weighted_efficiency_pct=97.4,
    inputs=(
        Inputs(trackers=1, strings_per_tracker=2, max_current_a=22.0, max_isc_a=30.0),
        Inputs(trackers=1, strings_per_tracker=1, max_current_a=11.0, max_isc_a=15.0),
    ),
)

#: What a public table tells: no currents, no maximum DC voltage, one tracker assumed.
TABLED = Inverter(
    id=2,
    maker="Wold & Tarn",
    model="WT 5.0 [240V]",
    ac_power_w=5000.0,
    mppt_low_v=150.0,
    mppt_high_v=480.0,
    weighted_efficiency_pct=96.5,
    origins={"inputs": Origin.ASSUMED},
)

HOSTILE = replace(TABLED, id=3, maker=HOSTILE_MAKER, model=HOSTILE_MODEL, ac_power_w=4000.0)

#: Takes nothing: its window is above what its maximum voltage lets a string reach.
NARROW = Inverter(
    id=4,
    maker="Quillon",
    model="QN-2000 Narrow",
    ac_power_w=2000.0,
    max_dc_voltage_v=250.0,
    mppt_low_v=230.0,
    mppt_high_v=245.0,
    inputs=(Inputs(trackers=1, max_isc_a=12.0),),
    weighted_efficiency_pct=95.0,
)

INVERTERS = (DUO, TABLED, HOSTILE, NARROW)

#: Five classes of a year: power and voltage of one module, hours.
YEAR = ModuleYear(
    power_w=np.array([30.0, 90.0, 150.0, 210.0, 255.0]),
    vmp_v=np.array([29.0, 29.5, 29.8, 29.5, 29.0]),
    hours=np.array([1400.0, 1100.0, 800.0, 500.0, 150.0]),
)

SITE_YEAR = SiteYear(YEAR, "invented year", ("Weather: an invented year of five classes.",))
NO_YEAR = SiteYear(None, why_not="the site has no place: give --lat and --lon, or a --weather file")


def listing(*, year: bool = True, inverters: tuple[Inverter, ...] = INVERTERS) -> Fit:
    """The inverters that take the module."""
    return fit([MODULE], inverters, Request(SITE), YEAR if year else None)


def pair(inverter: Inverter = DUO, module: Module = MODULE, **wishes: object) -> Fit:
    """Every arrangement of one module on one inverter."""
    return fit([module], [inverter], Request(SITE, every=True, **wishes), YEAR)  # type: ignore[arg-type]
