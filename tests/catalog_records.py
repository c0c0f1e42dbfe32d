"""Invented records that store tests share."""

from __future__ import annotations

from catalog.records import Inputs, Inverter, Module, Origin, Site, Source

SHEET = Source("Alderfell datasheet", "rev B")
TABLE_2019 = Source("Harbour table", "2019-03-05")
TABLE_2024 = Source("Harbour table", "2024-01-10")
REV_C = Source("datasheet rev C, page 2")

MODULE = Module(
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
    noct_c=45.0,
    source=TABLE_2019,
)
GLASS = Module(
    maker="Alderfell Solar",
    model="AF9B-440",
    technology="Mono-c-Si",
    bifacial=True,
    bifaciality=0.7,
    pmax_w=440.0,
    voc_v=49.5,
    isc_a=11.3,
    vmp_v=41.4,
    imp_a=10.63,
    max_system_voltage_v=1500.0,
    max_series_fuse_a=20.0,
    source=SHEET,
    origins={"bifaciality": Origin.ASSUMED},
)
INVERTER = Inverter(
    maker="Quillon",
    model="QN-5000 [240V]",
    ac_power_w=5000.0,
    ac_voltage_v=240.0,
    phases=1,
    mppt_low_v=150.0,
    mppt_high_v=480.0,
    weighted_efficiency_pct=97.0,
    source=TABLE_2019,
    origins={"inputs": Origin.ASSUMED},
)
TWO_GROUPS = Inverter(
    maker="Quillon",
    model="QN-8000 Duo",
    ac_power_w=8000.0,
    phases=3,
    max_dc_voltage_v=1000.0,
    mppt_low_v=200.0,
    mppt_high_v=850.0,
    start_voltage_v=180.0,
    inputs=(
        Inputs(trackers=1, strings_per_tracker=2, max_current_a=22.0, max_isc_a=30.0),
        Inputs(trackers=2, strings_per_tracker=1, max_current_a=11.0, max_isc_a=15.0, max_power_w=4000.0),
    ),
    source=SHEET,
    sources={"start_voltage_v": REV_C},
)
MODULES = [MODULE, GLASS]
INVERTERS = [INVERTER, TWO_GROUPS]
SITE = Site(name="Low Wharf", design_low_c=-12.0, design_high_c=36.0, mounting="near-roof", lat=52.1, lon=4.3)
