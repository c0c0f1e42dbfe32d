"""Energy wanted: the fewest modules that yield it, and the chain of efficiencies, against searches of their own."""

from __future__ import annotations

import json
import random
from dataclasses import replace
from pathlib import Path

import numpy as np
import pvlib
import pytest

import matcher.fit
import matcher.search
import oracle
import oracle_year
from catalog.errors import CatalogError
from catalog.records import Inputs, Inverter, Site
from catalog_records import MODULE
from cli.wanted import energy_wanted, sun_hours_site_year
from matcher.energy import chain, fewest_modules, sun_hours_year
from matcher.errors import MatcherError
from matcher.fit import Request, fit
from matcher.moduleyear import ModuleYear, condense, module_year, plane_year
from matcher.singlediode import six_parameters
from matcher.weather import read_weather
from random_records import Case, random_case
from test_engine_properties import random_year

TMY3 = Path(pvlib.__path__[0]) / "data" / "723170TYA.CSV"
SITE = Site(name="Hand", design_low_c=-10.0, design_high_c=35.0)


def box(**change: object) -> Inverter:
    """One tracker; a constant efficiency."""
    values = dict(
        maker="Quillon", model="QN-5", ac_power_w=5000.0, max_dc_voltage_v=1000.0, mppt_low_v=150.0,
        mppt_high_v=800.0, weighted_efficiency_pct=96.0,
        inputs=(Inputs(trackers=1, strings_per_tracker=2, max_isc_a=40.0),),
    )  # fmt: skip
    return Inverter(**(values | change))


def most_by_count(case: Case, year: ModuleYear, low: float, high: float) -> dict[int, float]:
    """The most energy [kWh] of each module count, over every arrangement, by the oracle."""
    found: dict[int, float] = {}
    arrangements = oracle.arrangements(case.module, case.inverter, case.site, low, high, None, case.combiner, most=1_000)
    for arrangement in arrangements:
        _, kwh = oracle_year.clipping(case.inverter, arrangement, year.power_w, year.vmp_v)
        count = oracle.modules_of(arrangement)
        found[count] = max(found.get(count, 0.0), kwh)
    return found


def test_the_smallest_count_is_the_smallest(monkeypatch):
    """Of every arrangement of every count; also where the engine goes through them best first."""
    tried = refused = 0
    for seed in range(80):
        case, rng = random_case(random.Random(seed)), random.Random(seed)
        year = random_year(case.module, rng)
        try:
            most = most_by_count(case, year, 0.5, 1.6)
        except oracle.TooMany:
            continue
        if not most:
            continue
        wanted = rng.choice((rng.choice(list(most.values())), rng.uniform(0.5, 1.2) * max(most.values())))
        enough = [count for count, kwh in most.items() if kwh >= wanted * (1 - 1e-9)]
        request = Request(case.site, ratio=(0.5, 1.6), combiner=case.combiner)
        for whole in (matcher.search.WHOLE, 0):
            with monkeypatch.context() as patch:
                patch.setattr(matcher.search, "WHOLE", whole)
                patch.setattr(matcher.fit, "WHOLE_EVERY", min(whole, matcher.fit.WHOLE_EVERY))
                if not enough:
                    with pytest.raises(MatcherError, match="no option yields"):
                        fewest_modules([case.module], [case.inverter], request, year, wanted)
                    refused += 1
                    continue
                found = fewest_modules([case.module], [case.inverter], request, year, wanted)
            assert found.modules == min(enough), f"seed {seed}"
            assert found.best.modules == found.modules
            assert found.best.yearly_kwh == pytest.approx(most[found.modules], rel=1e-9), f"seed {seed}"
            tried += 1
    assert tried > 50
    assert refused > 2


def test_the_verdict_of_the_best_is_its_own(monkeypatch):
    """Also where the search goes by energy alone: here a to-confirm tracker, there none."""
    monkeypatch.setattr(matcher.search, "WHOLE", 0)
    monkeypatch.setattr(matcher.fit, "WHOLE_EVERY", 0)
    module = replace(MODULE, max_system_voltage_v=1000.0)
    year = random_year(module, random.Random(3))
    for limit, verdict in ((20.0, "fits"), (None, "to-confirm")):
        inverter = box(inputs=(Inputs(trackers=2, strings_per_tracker=1, max_isc_a=limit),))
        found = fewest_modules([module], [inverter], Request(SITE), year, 20 * year.energy_kwh * 0.95)
        assert found.best.verdict == verdict


@pytest.mark.parametrize("whole", [matcher.search.WHOLE, 0], ids=["listed", "best first"])
def test_what_fits_is_told_apart_from_what_is_to_confirm(monkeypatch, whole):
    """The 97 % inverter does not state its current and gets by with 20 modules, the 95 % one fits with 21."""
    monkeypatch.setattr(matcher.search, "WHOLE", whole)
    monkeypatch.setattr(matcher.fit, "WHOLE_EVERY", min(whole, matcher.fit.WHOLE_EVERY))
    module = replace(MODULE, max_system_voltage_v=1000.0)
    year = random_year(module, random.Random(3))

    def made(efficiency: float, max_isc_a: float | None) -> Inverter:
        inputs = (Inputs(trackers=2, strings_per_tracker=1, max_isc_a=max_isc_a),)
        return box(ac_power_w=9000.0, weighted_efficiency_pct=efficiency, model=f"QN {efficiency}", inputs=inputs)

    request, wanted = Request(SITE, ratio=(0.3, 1.5)), 20 * year.energy_kwh * 0.96
    unsure, sure = made(97.0, None), made(95.0, 40.0)
    found = fewest_modules([module], [unsure, sure], request, year, wanted)
    assert (found.modules, found.best.verdict, found.best.inverter) == (20, "to-confirm", 0)
    assert found.proven is not None
    assert (found.proven.modules, found.proven.verdict, found.proven.inverter) == (21, "fits", 1)
    assert found.proven.yearly_kwh >= wanted
    assert fewest_modules([module], [unsure], request, year, wanted).proven is None
    found = fewest_modules([module], [sure], request, year, wanted)
    assert found.proven is found.best and found.modules == 21


def test_of_several_inverters_the_one_that_gets_by_with_fewest():
    """95 % and 97 %: for 20 modules' DC energy times 0.96, 21 modules on the one, 20 on the other."""
    year = random_year(MODULE, random.Random(3))
    wanted = 20 * year.energy_kwh * 0.96
    boxes = [box(ac_power_w=9000.0, weighted_efficiency_pct=e, model=f"QN {e}") for e in (95.0, 97.0)]
    request = Request(SITE, ratio=(0.3, 1.5))
    assert fewest_modules([MODULE], boxes[:1], request, year, wanted).modules == 21
    found = fewest_modules([MODULE], boxes, request, year, wanted)
    assert (found.modules, found.best.inverter) == (20, 1)


def test_several_units_share_the_energy():
    year = random_year(MODULE, random.Random(3))
    # 5 kW take 27 modules at most (1.5 * 5000 / 270); 40 need two.
    wanted = 40 * year.energy_kwh * 0.96 * 0.999
    low = replace(year, power_w=year.power_w * 0.5)
    with pytest.raises(MatcherError, match="--units"):
        fewest_modules([MODULE], [box()], Request(SITE), year, wanted)
    found = fewest_modules([MODULE], [box()], Request(SITE, units=(1, 3)), low, wanted / 2)
    assert (found.modules, found.best.units) == (40, 2)


def test_an_energy_far_above_the_first_counts_is_still_found():
    """Nothing between 28 and 370 modules can be wired here; the large inverter takes the rest."""
    year = random_year(MODULE, random.Random(3))
    large = box(
        model="QN-100", ac_power_w=100_000.0, mppt_low_v=500.0,
        inputs=(Inputs(trackers=1, strings_per_tracker=40, max_isc_a=800.0),),
    )  # fmt: skip
    request = Request(SITE, ratio=(1.0, 1.5))
    found = fewest_modules([MODULE], [box(), large], request, year, 60 * year.energy_kwh)
    counts = {n * s for n in range(19, 24) for s in range(1, 41) if 1.0 <= n * s * 270 / 100_000 <= 1.5}
    assert found.modules == min(counts)


def test_energy_without_a_model_is_refused():
    year = random_year(MODULE, random.Random(3))
    with pytest.raises(MatcherError, match="no efficiency"):
        fewest_modules([MODULE], [box(weighted_efficiency_pct=None)], Request(SITE), year, 1000.0)
    dark = replace(year, power_w=np.full_like(year.power_w, np.nan))
    with pytest.raises(MatcherError, match="power"):
        fewest_modules([MODULE], [box()], Request(SITE), dark, 1000.0)


# --- the chain -----------------------------------------------------------------------------------------


def test_the_chain_multiplies_to_the_energy():
    """System efficiency times STC power times irradiation is the energy: a TMY3 file that pvlib installs."""
    plane = plane_year(read_weather(TMY3), 30.0, 180.0)
    year = condense(module_year(six_parameters(MODULE), plane, 3.0))
    for option in fit([MODULE], [box(ac_power_w=4000.0)], Request(SITE, every=True), year).options(full=False):
        links = chain(option, MODULE, year, plane.irradiation_kwh_m2, 3.0)
        assert links is not None
        product = links.module * links.dc_wiring * links.inverter * links.clipping
        assert product == pytest.approx(links.system, rel=1e-12)
        stc_kw = option.modules * MODULE.pmax_w / 1000
        assert product * stc_kw * plane.irradiation_kwh_m2 == pytest.approx(option.yearly_kwh, rel=1e-6)
        assert links.dc_wiring == pytest.approx(0.97)
        assert links.clipping == pytest.approx(1 - option.clipping_loss_pct / 100)
        assert links.inverter == pytest.approx(0.96, rel=1e-6)  # the constant efficiency
        assert 0.8 < links.module < 1.0


def test_the_chain_against_pvlib_hour_by_hour():
    """The module's own efficiency against STC: the single-diode model of pvlib over all hours of the file."""
    weather, meta = oracle_year.read_tmy3_mid_interval(str(TMY3))
    poa, cell = oracle_year.plane(weather, meta["latitude"], meta["longitude"], meta["altitude"], 30.0, 180.0)
    power, _ = oracle_year.module_year(MODULE_WITH_SIX, poa, cell, dc_loss_pct=0.0)
    plane = plane_year(read_weather(TMY3), 30.0, 180.0)
    year = condense(module_year(six_parameters(MODULE), plane, 2.0))
    (option, *_) = fit([MODULE], [box()], Request(SITE, every=True), year).options(full=False)
    links = chain(option, MODULE, year, plane.irradiation_kwh_m2, 2.0)
    assert links is not None
    assert links.irradiation_kwh_m2 == pytest.approx(poa.sum() / 1000, rel=1e-4)
    assert links.module == pytest.approx(power.sum() / MODULE.pmax_w / (poa.sum() / 1000), rel=1e-3)


def _with_six() -> object:
    six = six_parameters(MODULE)
    assert six is not None
    return replace(MODULE, **{n: float(getattr(six, n)) for n in ("a_ref", "I_L_ref", "I_o_ref", "R_s", "R_sh_ref", "Adjust")})


MODULE_WITH_SIX = _with_six()


# --- sun hours -----------------------------------------------------------------------------------------


def test_sun_hours_by_hand():
    """4 h of full sun a day: modules * hot power * 0.98 * 0.96 * 4 * 365; 7,300 kWh need 23.8, so 24 modules.

    Power at 35 + 25 * 1.25 = 66.25 degC by the coefficient: 270 W * (1 - 0.0041 * 41.25) = 224.3 W.
    """
    by_coefficient = 270 * (1 - 0.0041 * 41.25)
    site_year = sun_hours_site_year(MODULE, SITE, 4.0)
    year = site_year.year
    assert year is not None
    assert year.energy_kwh == pytest.approx(by_coefficient * 0.98 * 4 * 365 / 1000, rel=0.005)
    assert site_year.irradiation_kwh_m2 == pytest.approx(4 * 365)
    each = year.energy_kwh * 0.96
    found = fewest_modules([MODULE], [box()], Request(SITE), year, 20 * 365)
    assert found.modules == 24 == -(-7300 // each)
    assert found.best.clipping_loss_pct is None  # sun hours show no clipping
    assert found.best.yearly_kwh == pytest.approx(24 * each)


def test_sun_hours_are_a_year_of_energy():
    year = sun_hours_year(vmp_hot_v=26.0, pmax_hot_w=200.0, sun_hours=5.0, dc_loss_pct=2.0)
    assert year.energy_kwh == pytest.approx(0.2 * 0.98 * 5 * 365)
    assert not year.shows_clipping


@pytest.mark.parametrize(
    ("values", "message"),
    [
        ((9000.0, 20.0, None), "once"),
        ((None, None, 4.0), "--daily-kwh"),
        ((0.0, None, None), "above 0"),
        ((None, -3.0, None), "above 0"),
        ((float("nan"), None, None), "above 0"),
        ((None, 20.0, 0.0), "--sun-hours"),
        ((None, 20.0, 13.0), "--sun-hours"),
    ],
)
def test_energies_that_are_none_are_refused(values, message):
    with pytest.raises(CatalogError, match=message):
        energy_wanted(*values)


def test_a_daily_energy_is_the_mean_of_the_year():
    wanted = energy_wanted(None, 20.0, None)
    assert wanted is not None and wanted.yearly_kwh == pytest.approx(7300)


# --- on the command line ---------------------------------------------------------------------------------

FIT = ("fit", "--module", "AF6K-270P", "--inverter", "QN-5000", "--low", "-12", "--high", "38")
PLACE = ("--lat", "52", "--lon", "4")


def test_fit_prints_count_chain_and_options(small_catalog, ferrule):
    ran = ferrule(*FIT, *PLACE, "--yearly-kwh", "8000")
    assert ran.status == 0, ran.err
    assert "modules are the fewest that yield it" in ran.out
    assert "DC wiring 98.0%, inverter 97.0%" in ran.out
    assert "by falling yearly energy" in ran.out
    said = " ".join(ran.out.split())
    assert "to-confirm); nothing that fits yields so much." in said
    assert "reaches %: of the 8,000 kWh wanted, in a year without clouds; less than 100 falls short." in said
    # Without clouds it takes the fewest that it ever could, and the first sentence says so.
    assert said.startswith("8,000 kWh a year, in a year without clouds and so at least: ")
    assert "give a weather file (--weather), or --sun-hours" in said
    energy = json.loads(ferrule(*FIT, *PLACE, "--yearly-kwh", "8000", "--json").out)["energy"]
    assert (energy["verdict"], energy["fits"]) == ("to-confirm", None)


@pytest.mark.parametrize(
    ("more", "words"),
    [
        (("--yearly-kwh", "8000", *PLACE, "--count", "20"), "--count"),
        (("--yearly-kwh", "8000", *PLACE, "--strings", "2x10"), "--strings"),
        (("--yearly-kwh", "8000"), "--sun-hours"),
        (("--daily-kwh", "20", "--sun-hours", "4", *PLACE), "leave one of them away"),
        (("--yearly-kwh", "800000", *PLACE), "no option yields 800,000 kWh"),
    ],
)
def test_fit_refuses_in_one_line(small_catalog, ferrule, more, words):
    ran = ferrule(*FIT, *more)
    assert ran.status == 2
    assert words in ran.err
    assert ran.err.count("\n") == 1 and not ran.out


@pytest.mark.parametrize("ending", ["html", "xlsx"])
def test_page_and_workbook_keep_the_question_of_an_energy(small_catalog, ferrule, tmp_path, ending):
    from openpyxl import load_workbook

    out = tmp_path / f"energy.{ending}"
    ran = ferrule(*FIT, *PLACE, "--yearly-kwh", "8000", "--out", str(out))
    assert ran.status == 0, ran.err
    if ending == "html":
        text = out.read_text("utf-8")
        assert "In short: #1, " in text and "a year without clouds" in text
    else:
        lines = load_workbook(out)["Assumptions"].iter_rows(values_only=True)
        text = "\n".join(str(cell) for line in lines for cell in line)
    assert "8,000 kWh a year, in a year without clouds and so at least: " in text
    assert "are the fewest that yield it" in text and "The chain: " in text
