"""The oracle against cases worked by hand and figures from outside the project."""

from __future__ import annotations

import random
from collections import Counter
from dataclasses import replace
from pathlib import Path

import pvlib
import pytest

import handbook_values
import oracle
import oracle_year
from catalog.records import MOUNTINGS, Inputs, Inverter, Module, Site
from oracle import DOES_NOT_FIT, FAIL, FITS, NOT_ASKED, OPEN, PASS, TO_CONFIRM
from random_records import cec_module, cec_rows, fit_module, random_case

# Round numbers: Voc 44 V at -15 degC (+10 %), Vmp 25.6 V at 65 degC (-20 %), design Isc 12.5 A.
MODULE = Module(
    maker="Hand",
    model="H400",
    technology="Mono-c-Si",
    bifacial=False,
    pmax_w=400.0,
    voc_v=40.0,
    isc_a=10.0,
    vmp_v=32.0,
    imp_a=9.5,
    voc_coef_pct=-0.25,
    vmp_coef_pct=-0.5,
    noct_c=44.0,
    max_system_voltage_v=1000.0,
    max_series_fuse_a=20.0,
)
SITE = Site(name="Hand", design_low_c=-15.0, design_high_c=35.0)
INVERTER = Inverter(
    maker="Hand",
    model="I4",
    ac_power_w=4000.0,
    max_dc_voltage_v=600.0,
    mppt_low_v=120.0,
    mppt_high_v=500.0,
    start_voltage_v=150.0,
    inputs=(Inputs(trackers=2, strings_per_tracker=2, max_current_a=20.0, max_isc_a=25.0),),
)


# --- one module -----------------------------------------------------------------------------------


def test_points_by_hand():
    p = oracle.points(MODULE, SITE)
    assert p["t_hot"] == pytest.approx(35 + 30)  # (44 - 20) / 800 * 1000 = 30 K
    assert p["voc_cold"] == pytest.approx(44.0)  # 40 K below 25 at -0.25 %/K: +10 %
    assert p["voc_hot"] == pytest.approx(36.0)
    assert p["vmp_hot"] == pytest.approx(25.6)  # 40 K above 25 at -0.5 %/K: -20 %
    assert p["vmp_25"] == 32.0
    assert p["vmp_cold"] == pytest.approx(38.4)
    assert p["isc_design"] == pytest.approx(12.5)


def test_noct_is_45_where_unstated_and_mounting_adds():
    module = replace(MODULE, noct_c=None)
    assert oracle.points(module, replace(SITE, mounting="near-roof"))["t_hot"] == pytest.approx(35 + 36 / 0.8)


@pytest.mark.parametrize("mounting", MOUNTINGS)
def test_mounting_adders_are_those_of_gilman(mounting):
    # pvlib.temperature.noct_sam carries the table of Gilman 2015; at zero efficiency the difference of two
    # stand-offs is that of their adders, up to one factor for the wind.
    inches, adder = handbook_values.GILMAN_2015[mounting]

    def cell(standoff):
        return pvlib.temperature.noct_sam(800, 20, 1, 45, 1e-9, mount_standoff=standoff)

    scale = (cell(0.25) - cell(4.0)) / 18.0
    assert (cell(inches) - cell(4.0)) / scale == pytest.approx(adder)
    assert oracle.MOUNT_K[mounting] == MOUNTINGS[mounting] == adder


@pytest.mark.parametrize(("warmest", "coldest", "factor"), handbook_values.NEC_690_7_A)
def test_nec_table_covers_each_band_to_both_edges(warmest, coldest, factor):
    # NFPA 70 (NEC) Table 690.7(A), from memory.
    assert oracle.cold_factor(warmest) == oracle.cold_factor(coldest) == factor
    assert oracle.cold_factor(warmest + 0.5) == factor  # between two bands: the colder one


def test_nec_table_ends():
    assert oracle.cold_factor(25) == oracle.cold_factor(31.5) == 1.0
    assert oracle.cold_factor(-40) == 1.25
    assert oracle.cold_factor(-40.01) is None


def test_without_coefficient_of_voc_the_table_or_nothing():
    module = replace(MODULE, voc_coef_pct=None)
    p = oracle.points(module, SITE)
    assert p["voc_cold"] == pytest.approx(40 * 1.16)
    assert p["voc_hot"] is None
    with pytest.raises(oracle.CannotMatch):
        oracle.points(replace(module, technology="CdTe"), SITE)
    with pytest.raises(oracle.CannotMatch):
        oracle.points(module, replace(SITE, design_low_c=-41.0))


def test_vmp_by_difference_of_coefficients_where_nothing_can_be_fitted():
    module = replace(MODULE, vmp_coef_pct=None, voc_coef_pct=None, pmax_coef_pct=-0.4, isc_coef_pct=0.05)
    assert oracle.points(module, SITE)["vmp_hot"] == pytest.approx(32 * (1 - 0.0045 * 40))
    with pytest.raises(oracle.CannotMatch):
        oracle.points(replace(module, isc_coef_pct=None), SITE)


@pytest.mark.parametrize("example", handbook_values.GSES_2011)
def test_gses_worked_examples(example):
    # Global Sustainable Energy Solutions, "Calculating Module Voltages", 2011.
    quantity, at_stc, per_kelvin, cell_c, expected = example
    module, site = handbook_values.gses_question(quantity, at_stc, per_kelvin, cell_c)
    p = oracle.points(module, site)
    assert p["t_cold" if quantity == "voc" else "t_hot"] == pytest.approx(cell_c)
    assert p["voc_cold" if quantity == "voc" else "vmp_hot"] == pytest.approx(expected, abs=0.005)


def test_rear_share_raises_the_design_current():
    # NEC 690.8(A)(1): 1.25.
    site = replace(SITE, rear_share=0.1)
    module = replace(MODULE, bifacial=True, bifaciality=0.7)
    assert oracle.points(module, site)["isc_design"] == pytest.approx(12.5 * 1.07)
    assert oracle.points(MODULE, site)["isc_design"] == pytest.approx(12.5)
    assert oracle.points(replace(module, bifaciality=None), site)["isc_design"] is None
    assert oracle.points(replace(module, bifaciality=None), SITE)["isc_design"] == pytest.approx(12.5)


@pytest.mark.parametrize("row", cec_rows()[::10], ids=lambda row: row["Name"])
def test_model_gives_the_rated_point_of_the_cec_table(row):
    # CEC module table of 2019-03-05, as pvlib installs it: its parameters give its rated Vmp.
    module = cec_module(row)
    p = oracle.points(module, SITE)
    assert p["vmp_25"] == pytest.approx(module.vmp_v, rel=0.02)
    assert p["vmp_hot"] < p["vmp_25"] < p["vmp_cold"]


@pytest.mark.parametrize("seed", range(3))
def test_fitted_parameters_meet_the_rated_point(seed):
    # Batzelis 2016, doi:10.1109/TSTE.2015.2503435: the fit passes through the rated point.
    module = fit_module(random.Random(seed))
    v, i = oracle.model_mpp(oracle.six_parameters(module), 1000, 25)
    assert v == pytest.approx(module.vmp_v, rel=0.02)
    assert v * i == pytest.approx(module.vmp_v * module.imp_a, rel=0.01)


# --- checks ---------------------------------------------------------------------------------------


def test_everything_passes():
    found = oracle.checks(MODULE, INVERTER, SITE, (((2, 10),),))
    expected = dict.fromkeys(oracle.STOPS + oracle.NOTES, PASS)
    expected |= {"voltage-cap": NOT_ASKED, "array-power": NOT_ASKED}
    assert found == expected
    assert oracle.verdict(found) == FITS


@pytest.mark.parametrize(
    ("change", "arrangement", "check"),
    [
        ({}, (((1, 14),),), "max-dc-voltage"),  # 14 * 44 = 616 > 600
        ({"module": {"max_system_voltage_v": 439.0}}, (((1, 10),),), "system-voltage"),
        ({"site": {"voltage_cap_v": 439.0}}, (((1, 10),),), "voltage-cap"),
        ({}, (((1, 4),),), "mppt-low"),  # 4 * 25.6 = 102.4 < 120
        ({"inverter": {"mppt_high_v": 319.0}}, (((1, 10),),), "mppt-high"),
        ({"inverter": {"start_voltage_v": 181.0}}, (((1, 5),),), "start"),  # 5 * 36 = 180
        ({}, (((3, 10),),), "short-circuit"),  # 37.5 > 25
        ({}, (((3, 10),),), "string-inputs"),
        ({"inverter": {"max_array_power_w": 7999.0}}, (((1, 10), (1, 10)),), "array-power"),
        ({}, (((2, 10), (1, 4)),), "mppt-low"),  # one bad tracker is enough
    ],
)
def test_each_stop(change, arrangement, check):
    module = replace(MODULE, **change.get("module", {}))
    inverter = replace(INVERTER, **change.get("inverter", {}))
    site = replace(SITE, **change.get("site", {}))
    found = oracle.checks(module, inverter, site, arrangement)
    assert found[check] == FAIL
    assert oracle.verdict(found) == DOES_NOT_FIT


@pytest.mark.parametrize(
    ("change", "arrangement", "check"),
    [
        ({"inverter": {"mppt_high_v": 380.0}}, (((1, 10),),), "cold-tracking"),  # 384 V at -15 degC
        ({"inputs": {"max_current_a": 18.9}}, (((2, 10),),), "input-current"),
        # 2 * 12.5 A back into the third string, over the fuse rating of 20 A
        ({"inputs": {"max_isc_a": 40.0, "strings_per_tracker": 3}}, (((3, 10),),), "string-fuse"),
    ],
)
def test_notes_change_no_verdict(change, arrangement, check):
    inverter = replace(INVERTER, **change.get("inverter", {}))
    inverter = replace(inverter, inputs=(replace(inverter.inputs[0], **change.get("inputs", {})),))
    found = oracle.checks(MODULE, inverter, SITE, arrangement)
    assert found[check] == FAIL
    assert oracle.verdict(found) == FITS


def test_limits_met_exactly_pass():
    module = replace(MODULE, max_system_voltage_v=440.0)
    inverter = replace(
        INVERTER,
        max_dc_voltage_v=10 * 40 * 1.1,
        mppt_low_v=10 * 25.6,
        mppt_high_v=320.0,
        start_voltage_v=360.0,
        max_array_power_w=8000.0,
        inputs=(Inputs(trackers=1, strings_per_tracker=2, max_current_a=19.0, max_isc_a=25.0),),
    )
    found = oracle.checks(module, inverter, replace(SITE, voltage_cap_v=440.0), (((2, 10),),))
    assert all(found[name] == PASS for name in oracle.STOPS)


def test_unstated_limits():
    inverter = replace(INVERTER, max_dc_voltage_v=None, start_voltage_v=None, inputs=(Inputs(trackers=1),))
    found = oracle.checks(replace(MODULE, max_system_voltage_v=None), inverter, SITE, (((1, 12),),))
    assert found["max-dc-voltage"] == OPEN  # 528 V, above the 500 V that the window proves
    assert found["system-voltage"] == found["short-circuit"] == OPEN
    assert found["start"] == found["string-inputs"] == NOT_ASKED
    assert oracle.verdict(found) == TO_CONFIRM
    shorter = oracle.checks(MODULE, replace(inverter, inputs=INVERTER.inputs), SITE, (((1, 11),),))
    assert shorter["max-dc-voltage"] == PASS  # 484 V
    assert oracle.verdict(shorter) == FITS


def test_a_combiner_waives_string_inputs():
    inverter = replace(INVERTER, inputs=(replace(INVERTER.inputs[0], max_isc_a=40.0),))
    assert oracle.checks(MODULE, inverter, SITE, (((3, 10),),))["string-inputs"] == FAIL
    assert oracle.checks(MODULE, inverter, SITE, (((3, 10),),), combiner=True)["string-inputs"] == NOT_ASKED


def test_unknown_rear_gain_is_no_pass():
    module, site = replace(MODULE, bifacial=True), replace(SITE, rear_share=0.1)
    assert oracle.checks(module, INVERTER, site, (((2, 10),),))["short-circuit"] == OPEN
    assert oracle.checks(module, INVERTER, site, (((3, 10),),))["short-circuit"] == FAIL


# --- arrangements ---------------------------------------------------------------------------------


def test_arrangements_by_hand():
    # Two like trackers, lengths 10 and 11 only, one string each, any ratio: 10, 11, 10|10, 10|11, 11|11.
    inverter = replace(
        INVERTER,
        mppt_low_v=250.0,
        max_dc_voltage_v=500.0,
        inputs=(replace(INVERTER.inputs[0], strings_per_tracker=1),),
    )
    found = oracle.arrangements(MODULE, inverter, SITE, 0.0, 3.0)
    assert found == dict.fromkeys(
        [
            (((1, 10),),),
            (((1, 11),),),
            (((1, 10), (1, 10)),),
            (((1, 10), (1, 11)),),
            (((1, 11), (1, 11)),),
        ],
        FITS,
    )
    assert oracle.count_by_modules(MODULE, inverter, SITE, 0.0, 3.0) == {10: 1, 11: 1, 20: 1, 21: 1, 22: 1}
    # 0.80 to 1.50 of 4000 W at 400 W: 8 to 15 modules, both ends included.
    assert set(oracle.arrangements(MODULE, inverter, SITE, 0.8, 1.5)) == {(((1, 10),),), (((1, 11),),)}
    assert set(oracle.arrangements(MODULE, inverter, SITE, 1.0, 1.0)) == {(((1, 10),),)}
    assert set(oracle.arrangements(MODULE, inverter, SITE, 0.8, 3.0, counts={21})) == {(((1, 10), (1, 11)),)}
    # Unlike groups do not swap.
    unlike = replace(inverter, inputs=(Inputs(trackers=1, strings_per_tracker=1),) * 2)
    assert len(oracle.arrangements(MODULE, unlike, SITE, 0.0, 3.0)) == 8
    assert set(oracle.arrangements(MODULE, unlike, SITE, 0.0, 3.0).values()) == {TO_CONFIRM}


def test_strings_are_bounded_by_the_ratio_window_where_nothing_is_stated():
    inverter = replace(INVERTER, inputs=(Inputs(trackers=1),), mppt_low_v=128.0, max_dc_voltage_v=260.0)
    assert set(oracle.arrangements(MODULE, inverter, SITE, 0.8, 1.5)) == {(((2, 5),),), (((3, 5),),)}


def test_hosting_and_splits():
    inverter = replace(INVERTER, mppt_low_v=250.0, max_dc_voltage_v=500.0)
    found = oracle.arrangements(MODULE, inverter, SITE, 0.0, 9.0)
    assert oracle.hosting(found, Counter({10: 2, 11: 1})) == [(((1, 11), (2, 10)),)]
    assert sorted(oracle.hosting(found, Counter({10: 2}))) == [(((1, 10), (1, 10)),), (((2, 10),),)]
    assert oracle.hosting(found, Counter({10: 5})) == []
    assert oracle.smallest_spread({10, 11, 20, 21, 22}, 61, 3) == 1
    assert oracle.smallest_spread({10, 11, 20, 21, 22}, 31, 2) == 9  # 11 + 20
    assert oracle.smallest_spread({10, 11}, 23, 2) is None


def test_two_ways_of_counting_agree():
    rng = random.Random(11)
    walked = 0
    for _ in range(60):
        c = random_case(rng)
        question = (c.module, c.inverter, c.site, c.ratio_low, c.ratio_high, c.counts, c.combiner)
        try:
            found = oracle.arrangements(*question, most=5_000)
        except oracle.TooMany:
            continue
        walked += 1
        assert oracle.count_by_modules(*question) == dict(Counter(map(oracle.modules_of, found)))
    assert walked > 40


# --- climate and order ----------------------------------------------------------------------------


def test_climate_window_by_hand():
    # 12 * 40 V * (1 + 0.0025 * (25 - T)) = 600 V at T = -75; 12 * 32 V * (1 - 0.005 * (T - 25)) = 120 V at
    # 162.5 degC of the cell, 30 K less outside.
    coldest, hottest = oracle.climate_window(MODULE, INVERTER, SITE, (((1, 12),),))
    assert coldest == pytest.approx(-75)
    assert hottest == pytest.approx(132.5)


def test_climate_window_ends_at_the_band_of_the_table():
    module = replace(MODULE, voc_coef_pct=None)  # 40 V * 1.16 * 12 = 556.8 V at -15, 1.18: 566.4 V
    inverter = replace(INVERTER, max_dc_voltage_v=560.0, start_voltage_v=None)
    assert oracle.climate_window(module, inverter, SITE, (((1, 12),),))[0] == pytest.approx(-15)


def test_climate_window_without_a_stated_maximum():
    module = replace(MODULE, max_system_voltage_v=None)
    inverter = replace(INVERTER, max_dc_voltage_v=None)
    # 11 * 40 V, 1.1 V more per kelvin below 25: 500 V, as far as the window proves, is 60 V or 54.5 K away.
    # 12 * 44 = 528 V is open already and no colder day closes it.
    assert oracle.climate_window(module, inverter, SITE, (((1, 11),),))[0] == pytest.approx(25 - 60 / 1.1)
    assert oracle.climate_window(module, inverter, SITE, (((1, 12),),))[0] is None


def test_order():
    def key(verdict=FITS, ratio=1.2, clip=0.5, lengths=1, margin=5.0, maker="A", model="A"):
        return oracle.order_key(verdict, ratio, clip, lengths, margin, maker, model)

    ranked = [
        key(ratio=1.3),
        key(ratio=1.3, lengths=2, margin=9.0),
        key(ratio=1.3, lengths=2),
        key(ratio=1.3, lengths=2, maker="B"),
        key(ratio=1.2, clip=2.0),
        key(ratio=1.1, clip=None),
        key(ratio=1.5, clip=2.1),
        key(ratio=1.6, clip=3.0),
        key(TO_CONFIRM, ratio=1.4),
    ]
    assert ranked == sorted(ranked)


def test_cold_margin():
    assert oracle.cold_margin(MODULE, INVERTER, SITE, (((1, 10), (1, 12)),)) == pytest.approx(100 * 72 / 600)


# --- the year -------------------------------------------------------------------------------------


def cec_inverter(inputs: tuple[Inputs, ...]) -> Inverter:
    """A 4 kW inverter with Sandia parameters of the usual size; the numbers are invented."""
    return replace(
        INVERTER,
        inputs=inputs,
        Pso=20.0,
        Paco=4000.0,
        Pdco=4180.0,
        Vdco=400.0,
        C0=-4e-6,
        C1=2e-5,
        C2=1e-3,
        C3=-3e-4,
        Pnt=1.0,
    )


@pytest.mark.parametrize("powers", [(1000.0, 500.0), (0.0, 900.0), (6.0, 6.0), (2000.0, 1900.0)])
def test_ac_power_is_that_of_pvlib_below_the_limit(powers):
    # King 2007 and Hansen 2022 as pvlib computes them.
    inverter = cec_inverter(INVERTER.inputs)
    parameters = {name: getattr(inverter, name) for name in (*oracle_year.SANDIA, "Pnt")}
    voltages = [310.0, 420.0]
    by_pvlib = pvlib.inverter.sandia_multi(voltages, list(powers), parameters)
    assert oracle_year.ac_power(voltages, list(powers), inverter) == pytest.approx(max(0.0, float(by_pvlib)))


def test_clipping_by_hand():
    # Constant efficiency 95 %: 10 modules of 500 W give 4750 W, 750 W over 4000 W; of 100 W, nothing over.
    inverter = replace(INVERTER, weighted_efficiency_pct=95.0, inputs=(Inputs(trackers=1),))
    loss, energy = oracle_year.clipping(inverter, (((1, 10),),), [500.0, 100.0, 0.0], [32.0, 34.0, 0.0])
    assert loss == pytest.approx(100 * 750 / (4750 + 950))
    assert energy == pytest.approx((4000 + 950) / 1000)


def test_current_limit_counts_as_clipping():
    # Two strings of 10 at 250 W and 30 V: 16.7 A; 10 A at 300 V is 3000 W of 5000 W.
    inputs = (Inputs(trackers=1, max_current_a=10.0),)
    inverter = replace(INVERTER, weighted_efficiency_pct=100.0, inputs=inputs)
    loss, energy = oracle_year.clipping(inverter, (((2, 10),),), [250.0], [30.0])
    assert (loss, energy) == (pytest.approx(40.0), pytest.approx(3.0))


def test_a_year_from_a_real_weather_file():
    # TMY3 723170 (Greensboro, North Carolina), installed with pvlib. NREL, Solar Radiation Data Manual for
    # Flat-Plate and Concentrating Collectors, 1994 (from memory): about 5 kWh/m2 a day on a south slope.
    path = Path(pvlib.__path__[0]) / "data" / "723170TYA.CSV"
    weather, meta = oracle_year.read_tmy3_mid_interval(str(path))
    place = (meta["latitude"], meta["longitude"], meta["altitude"])
    irradiance, cell = oracle_year.plane(weather, *place, tilt=36, azimuth=180)
    assert irradiance.sum() / 365e3 == pytest.approx(5.0, rel=0.06)
    module = cec_module(cec_rows()[5])
    power, voltage = oracle_year.module_year(module, irradiance, cell)
    # Common practice, no source: heat and 2 % of wiring leave 85 to 98 % of the rated DC yield.
    assert 0.85 < power.sum() / module.pmax_w / (irradiance.sum() / 1000) < 0.98
    assert len(power) == len(voltage) == (irradiance > 0).sum()
    assert 0.7 * module.vmp_v < voltage[power > 0.2 * module.pmax_w].min()
