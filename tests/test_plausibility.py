"""The impossible is refused, the odd is flagged, and real tables are neither refused nor drowned in flags."""

from __future__ import annotations

import time
from dataclasses import replace

import pytest

from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.plausibility import by_severity, findings, findings_of
from catalog.records import SANDIA_PARAMETERS, SIX_PARAMETERS, Inputs, Inverter, Module, specs

MODULE = Module(
    maker="Paper Sun",
    model="P-400",
    technology="Mono-c-Si",
    cells_in_series=66,
    bifacial=False,
    pmax_w=400.0,
    voc_v=45.6,
    isc_a=11.2,
    vmp_v=37.9,
    imp_a=10.56,
    voc_coef_pct=-0.27,
    isc_coef_pct=0.05,
    pmax_coef_pct=-0.35,
    vmp_coef_pct=-0.40,
    noct_c=44.0,
    max_system_voltage_v=1500.0,
    max_series_fuse_a=20.0,
    length_m=1.9,
    width_m=1.05,
)
INVERTER = Inverter(
    maker="Paper Grid",
    model="G-10",
    ac_power_w=10000.0,
    ac_voltage_v=400.0,
    phases=3,
    max_dc_voltage_v=1000.0,
    mppt_low_v=180.0,
    mppt_high_v=850.0,
    start_voltage_v=200.0,
    max_array_power_w=15000.0,
    inputs=(Inputs(trackers=2, strings_per_tracker=2, max_current_a=26.0, max_isc_a=32.0),),
    weighted_efficiency_pct=97.5,
    night_w=2.0,
    Pso=40.0,
    Paco=10000.0,
    Pdco=10250.0,
    Vdco=600.0,
    C0=-1e-6,
    C1=1e-5,
    C2=1e-4,
    C3=1e-4,
)


@pytest.fixture(scope="module")
def table():
    return read_cec_modules() + read_cec_inverters()


@pytest.fixture(scope="module")
def found_in_table(table):
    return findings_of(table)


def test_sound_records_have_no_findings():
    assert findings(MODULE) == []
    assert findings(INVERTER) == []


@pytest.mark.parametrize(
    ("changes", "field", "severity", "says"),
    [
        ({"vmp_v": 45.6, "voc_v": 37.9}, "vmp_v", "impossible", "swapped"),
        ({"vmp_v": 45.6}, "vmp_v", "impossible", "45.6 V is not below voc_v 45.6 V"),
        ({"imp_a": 11.2, "isc_a": 10.56}, "imp_a", "impossible", "swapped"),
        ({"pmax_w": 299.0}, "pmax_w", "impossible", "STC column"),
        ({"pmax_w": 385.0}, "pmax_w", "odd", "4.0 % apart"),
        ({"voc_v": 390.0}, "voc_v", "impossible", "straight line"),
        ({"isc_a": 15.2}, "voc_v", "odd", "fill factor"),
        ({"voc_coef_pct": 0.27}, "voc_coef_pct", "impossible", "minus sign"),
        ({"voc_coef_pct": -123.0}, "voc_coef_pct", "impossible", "not in mV"),
        ({"voc_coef_pct": -0.123}, "voc_coef_pct", "odd", "divided by voc_v"),
        ({"isc_coef_pct": -0.01}, "isc_coef_pct", "odd", "check the sign"),
        ({"pmax_coef_pct": -0.7}, "pmax_coef_pct", "odd", "unusual for Mono-c-Si"),
        ({"vmp_coef_pct": -0.25}, "vmp_coef_pct", "odd", "falls faster"),
        ({"noct_c": 25.0}, "noct_c", "impossible", "below 30 degC"),
        ({"noct_c": 60.0}, "noct_c", "odd", "unusual"),
        ({"cells_in_series": 132}, "cells_in_series", "odd", "in series only (66)"),
        ({"bifacial": True, "bifaciality": 70.0}, "bifaciality", "impossible", "not percent"),
        ({"bifaciality": 0.7}, "bifaciality", "odd", "not marked bifacial"),
        ({"max_system_voltage_v": 40.0}, "max_system_voltage_v", "impossible", "whole string"),
        ({"max_series_fuse_a": 10.0}, "max_series_fuse_a", "odd", "melts"),
        ({"length_m": 1900.0}, "length_m", "impossible", "not mm"),
        ({"length_m": 0.7}, "length_m", "impossible", "efficiency"),
        ({"length_m": 1.3}, "length_m", "odd", "29.3 % efficiency"),
        ({"length_m": 0.0}, "length_m", "impossible", "leave it blank"),
        ({"maker": " "}, "maker", "impossible", "blank"),
        ({"pmax_w": float("nan")}, "pmax_w", "impossible", "no number"),
        ({"R_s": float("inf")}, "R_s", "impossible", "no number"),
        ({"a_ref": 1.6, "R_s": 0.2}, "a_ref", "odd", "I_L_ref, I_o_ref, R_sh_ref, Adjust missing"),
        ({"I_o_ref": 0.0}, "I_o_ref", "impossible", "above 0"),
    ],
)
def test_module(changes, field, severity, says):
    found = findings(replace(MODULE, **changes))
    assert [f for f in found if f.field == field and f.severity == severity and says in f.message], found


@pytest.mark.parametrize(
    ("changes", "field", "severity", "says"),
    [
        ({"mppt_low_v": 850.0, "mppt_high_v": 180.0}, "mppt_low_v", "impossible", "swapped"),
        ({"max_dc_voltage_v": 800.0}, "mppt_high_v", "impossible", "above max_dc_voltage_v 800 V"),
        ({"start_voltage_v": 1100.0}, "start_voltage_v", "impossible", "check both"),
        ({"start_voltage_v": 900.0}, "start_voltage_v", "odd", "above the MPPT window"),
        ({"ac_power_w": 5.0}, "ac_power_w", "impossible", "not kW"),
        ({"max_array_power_w": 15.0}, "max_array_power_w", "impossible", "not kW"),
        ({"max_array_power_w": 9000.0}, "max_array_power_w", "odd", "unusual"),
        ({"weighted_efficiency_pct": 0.97}, "weighted_efficiency_pct", "impossible", "not a fraction"),
        ({"weighted_efficiency_pct": 80.0}, "weighted_efficiency_pct", "odd", "unusual"),
        ({"night_w": 900.0}, "night_w", "odd", "unit"),
        ({"phases": 4}, "phases", "impossible", "above 3"),
        ({"inputs": ()}, "inputs", "impossible", "at least one tracker"),
        ({"inputs": (Inputs(trackers=0),)}, "inputs", "impossible", "trackers 0"),
        ({"inputs": (Inputs(trackers=1, max_current_a=-1.0),)}, "inputs", "impossible", "max_current_a -1 A"),
        ({"inputs": (Inputs(trackers=1, max_current_a=13.0, max_isc_a=12.0),)}, "inputs", "odd", "swapped"),
        ({"inputs": (Inputs(trackers=1, max_current_a=9.0),)}, "inputs", "odd", "7650 W at most"),
        ({"inputs": (Inputs(trackers=1),) * 2}, "inputs", "odd", "one group of 2 trackers"),
        ({"inputs": (Inputs(trackers=1), Inputs(trackers=2))}, "inputs", "odd", "one group of 3 trackers"),
        ({"C2": None}, "Pso", "odd", "C2 missing"),
        ({"Paco": 10.0}, "Paco", "impossible", "both are in W"),
        ({"Paco": 9500.0}, "Paco", "odd", "5.0 % apart"),
        ({"Pdco": 9900.0}, "Pdco", "impossible", "more would come out"),
        ({"Pdco": 14000.0}, "Pdco", "odd", "71.4 % efficiency"),
        ({"Pso": 11000.0}, "Pso", "impossible", "small power"),
        ({"Pso": 1100.0}, "Pso", "odd", "10 %"),
        ({"Vdco": 1100.0}, "Vdco", "impossible", "no voltage"),
        ({"Vdco": 900.0}, "Vdco", "odd", "outside the MPPT window"),
        ({"C0": -2e-5}, "C0", "odd", "efficiency rises to 112.1 %"),
    ],
)
def test_inverter(changes, field, severity, says):
    found = findings(replace(INVERTER, **changes))
    assert [f for f in found if f.field == field and f.severity == severity and says in f.message], found


def test_thin_film_is_measured_by_its_own_bounds():
    film = replace(MODULE, technology="CdTe", cells_in_series=None, pmax_coef_pct=-0.21)
    assert findings(film) == []
    assert [f.field for f in findings(replace(film, technology="Mono-c-Si"))] == ["pmax_coef_pct"]


def test_unlike_groups_are_not_alike():
    unlike = (Inputs(trackers=1, max_current_a=22.0), Inputs(trackers=1, max_current_a=11.0))
    assert findings(replace(INVERTER, inputs=unlike)) == []


def test_values_of_zero_everywhere_are_findings_and_no_crash():
    zeros = {name: 0 for name, s in specs(Module).items() if s.type in (int, float)}
    assert {f.field for f in findings(replace(MODULE, **zeros))} >= {"pmax_w", "voc_v", "isc_a", "length_m"}
    zeros = {name: 0 for name, s in specs(Inverter).items() if s.type in (int, float)}
    assert {f.field for f in findings(replace(INVERTER, **zeros))} >= {"ac_power_w", "mppt_high_v"}


def test_impossible_comes_first():
    found = findings(replace(MODULE, noct_c=60.0, vmp_v=46.0))
    assert found[0].severity == "impossible" and found[-1].severity == "odd"


def test_parameters_of_another_type_are_noticed(table):
    small = next(r for r in table if isinstance(r, Module) and 150 < r.pmax_w < 200 and r.crystalline)
    other = {name: getattr(small, name) for name in SIX_PARAMETERS}
    assert any("another type" in f.message for f in findings(replace(MODULE, **other)))


def test_public_tables_hold_nothing_impossible(table, found_in_table):
    assert len(table) > 24000
    assert by_severity(found_in_table, "impossible") == []


def test_public_tables_are_seldom_odd(table, found_in_table):
    assert 223 <= len(found_in_table) < 0.05 * len(table)


def test_negative_isc_coefficients_of_the_public_table_are_all_odd(table, found_in_table):
    negative = {k for k, r in enumerate(table) if isinstance(r, Module) and (r.isc_coef_pct or 0) < 0}
    odd = {k for k, f in by_severity(found_in_table, "odd") if f.field == "isc_coef_pct"}
    assert len(negative) == 223
    assert negative <= odd


def test_single_and_bulk_say_the_same(table, found_in_table):
    for k in [*range(0, len(table), 997), *list(found_in_table)[::97]]:
        assert findings(table[k]) == found_in_table.get(k, [])


def test_a_whole_table_is_checked_at_once(table):
    start = time.perf_counter()
    findings_of(table)
    assert time.perf_counter() - start < 3.0


def test_sets_of_parameters_may_be_missing_whole():
    assert findings(replace(INVERTER, **dict.fromkeys(SANDIA_PARAMETERS))) == []
