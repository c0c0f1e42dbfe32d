"""From weather to a module's year and its classes: against pvlib, and against the entry-by-entry sums."""

from __future__ import annotations

from dataclasses import fields, replace
from pathlib import Path

import numpy as np
import pandas as pd
import pvlib
import pytest

from matcher.errors import MatcherError
from matcher.moduleyear import (
    ModuleYear,
    PlaneYear,
    condense,
    condense_plane,
    module_year,
    module_years,
    plane_year,
)
from matcher.singlediode import SixParameters
from matcher.weather import PlaneIrradiance, Weather, clear_sky_weather, read_weather

DATA = Path(pvlib.__file__).parent / "data"


@pytest.fixture(scope="module")
def tmy3() -> Weather:
    return read_weather(DATA / "723170TYA.CSV")


@pytest.fixture(scope="module")
def planes(tmy3: Weather) -> dict[str, PlaneYear]:
    """Unlike climates: warm and cloudy, cold and overcast, a clear sky south of the equator."""
    return {
        "Greensboro": plane_year(tmy3, 30.0, 180.0),
        "Sand Point": plane_year(read_weather(DATA / "703165TY.csv"), 40.0, 160.0),
        "clear sky": plane_year(clear_sky_weather(-23.0, 133.0, -2.0, 44.0), 10.0, 0.0),
    }


def parameters(rows: pd.DataFrame) -> SixParameters:
    return SixParameters(*(rows[f.name].to_numpy(float) for f in fields(SixParameters)))


def one(rows: pd.DataFrame, k: int) -> SixParameters:
    return SixParameters(*(float(rows[f.name].iloc[k]) for f in fields(SixParameters)))


# -- plane -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("tilt", "azimuth"), [(30.0, 180.0), (15.0, 270.0), (0.0, 0.0), (90.0, 90.0)])
def test_plane_year_agrees_with_pvlib(tmy3, tilt, azimuth):
    # Source: pvlib's solar position, Hay-Davies transposition and Faiman model, called one by one.
    data, meta = pvlib.iotools.read_tmy3(DATA / "723170TYA.CSV", coerce_year=2021)
    data.index = data.index - pd.Timedelta(minutes=30)
    place = pvlib.location.Location(meta["latitude"], meta["longitude"], altitude=meta["altitude"])
    sun = place.get_solarposition(data.index)
    poa = pvlib.irradiance.get_total_irradiance(
        tilt, azimuth, sun["apparent_zenith"], sun["azimuth"], data["dni"], data["ghi"], data["dhi"],
        dni_extra=pvlib.irradiance.get_extra_radiation(data.index), model="haydavies", albedo=0.2,
    )["poa_global"].fillna(0.0)  # fmt: skip
    cell = pvlib.temperature.faiman(poa, data["temp_air"], data["wind_speed"], u0=25.0, u1=6.84)
    lit = (poa > 0).to_numpy()
    ours = plane_year(tmy3, tilt, azimuth)
    np.testing.assert_array_equal(ours.rows, np.flatnonzero(lit))
    np.testing.assert_allclose(ours.irradiance, poa[lit], rtol=1e-4, atol=0.05)
    np.testing.assert_allclose(ours.cell_c, cell[lit], atol=0.01)
    assert ours.irradiation_kwh_m2 == pytest.approx(poa.sum() / 1000, rel=1e-5)


def test_plane_that_the_file_holds_and_another(tmy3):
    given = replace(
        tmy3, kind="PVGIS hourly", ghi=None, dni=None, dhi=None, plane=PlaneIrradiance(35.0, 170.0, tmy3.ghi)
    )
    same = plane_year(given, 35.2, 170.0)
    np.testing.assert_array_equal(same.irradiance, tmy3.ghi[tmy3.ghi > 0])
    with pytest.raises(MatcherError, match="tilt 35, azimuth 170 deg only"):
        plane_year(given, 35.0, 180.0)
    with pytest.raises(MatcherError, match="PVGIS hourly"):
        plane_year(given, 30.0, 170.0)
    flat = replace(given, plane=PlaneIrradiance(0.0, 180.0, tmy3.ghi))
    assert plane_year(flat, 0.0, 90.0).hours.size == same.hours.size  # the horizontal faces nowhere


# -- module ----------------------------------------------------------------------------------------------


def test_module_year_agrees_with_pvlib(planes, cec_modules_csv):
    # Source: pvlib.singlediode.bishop88_mpp on pvlib.pvsystem.calcparams_cec.
    plane, params = planes["Greensboro"], one(cec_modules_csv, 9000)
    order = ("alpha_sc", "a_ref", "I_L_ref", "I_o_ref", "R_sh_ref", "R_s", "Adjust")
    curve = pvlib.pvsystem.calcparams_cec(
        plane.irradiance, plane.cell_c, *(getattr(params, n) for n in order)
    )
    _, vmp, pmp = pvlib.singlediode.bishop88_mpp(*curve)
    year = module_year(params, plane, dc_loss_pct=3.0)
    np.testing.assert_allclose(year.power_w, 0.97 * pmp, rtol=1e-8)
    np.testing.assert_allclose(year.vmp_v, vmp, rtol=1e-8)
    assert year.energy_kwh == pytest.approx(0.97 * pmp.sum() / 1000)


def test_an_entry_without_a_maximum_counts_as_no_power(cec_modules_csv):
    plane = PlaneYear(
        np.array([500.0, np.nan, 800.0]), np.array([20.0, 20.0, np.nan]), np.ones(3), np.arange(3)
    )
    year = module_year(one(cec_modules_csv, 0), plane)
    assert year.power_w[0] > 0 and list(year.power_w[1:]) == [0, 0]
    assert condense(year).hours.sum() == 1


# -- classes ---------------------------------------------------------------------------------------------


def losses(
    year: ModuleYear, inverter: pd.Series, in_series: int, strings: int, max_current_a: float = np.inf
) -> tuple[float, float]:
    """Clipping loss [%] and AC energy [Wh] by the Sandia model (King et al. 2007, SAND2007-5036)."""
    dc, volts = in_series * strings * year.power_w, in_series * year.vmp_v
    off = volts - inverter.Vdco
    a = inverter.Pdco * (1 + inverter.C1 * off)
    b = inverter.Pso * (1 + inverter.C2 * off)
    c = inverter.C0 * (1 + inverter.C3 * off)

    def ac(power: np.ndarray) -> np.ndarray:
        return np.maximum((inverter.Paco / (a - b) - c * (a - b)) * (power - b) + c * (power - b) ** 2, 0.0)

    free = ac(dc) @ year.hours
    kept = np.minimum(ac(np.minimum(dc, max_current_a * volts)), inverter.Paco) @ year.hours
    return 100 * (1 - kept / free), kept


def pairs(modules: pd.DataFrame, inverters: pd.DataFrame, n: int):
    """Random pairs with one string length in the window and string counts of DC/AC ratio 0.5 to 2.5."""
    rng = np.random.default_rng(11)
    while n:
        k = int(rng.integers(len(modules)))
        module, inverter = modules.iloc[k], inverters.iloc[rng.integers(len(inverters))]
        lengths = [
            s for s in range(1, 60) if inverter.Mppt_low < 0.9 * s * module.V_mp_ref < inverter.Mppt_high
        ]
        if not lengths:
            continue
        in_series = int(rng.choice(lengths))
        ratio = in_series * module.STC / inverter.Paco
        counts = {max(1, round(aim / ratio)) for aim in (0.5, 0.9, 1.1, 1.4, 1.9, 2.5)}
        counts = [s for s in counts if 0.5 <= s * ratio <= 2.5]
        if counts:
            n -= 1
            yield k, inverter, in_series, counts, float(rng.uniform(0.5, 1.05)) * module.I_mp_ref


def test_condensed_year_clips_like_the_year_itself(planes, cec_modules_csv, cec_inverters_csv):
    drawn = list(pairs(cec_modules_csv, cec_inverters_csv, 9))
    seen = []
    for plane in planes.values():
        for k, inverter, in_series, counts, current in drawn:
            year = module_year(one(cec_modules_csv, k), plane)
            both, power_only = condense(year), condense(year, current_limits=False)
            assert power_only.hours.size < 250 and both.hours.size < 900
            for short in (both, power_only):
                assert short.energy_kwh == pytest.approx(year.energy_kwh, rel=1e-12)
                assert short.hours.sum() == pytest.approx(year.hours.sum())
            for strings in counts:
                loss, energy = losses(year, inverter, in_series, strings)
                for short in (both, power_only):
                    found, found_energy = losses(short, inverter, in_series, strings)
                    assert found == pytest.approx(loss, abs=0.0065)
                    assert found_energy == pytest.approx(energy, rel=1e-3)
                limited, _ = losses(year, inverter, in_series, strings, strings * current)
                found, _ = losses(both, inverter, in_series, strings, strings * current)
                assert found == pytest.approx(limited, abs=0.01)
                seen.append((loss, limited))
    power, limited = np.array(seen).T
    assert np.ptp(power) > 20 and np.median(limited) > 1  # the comparison had something to compare


def test_a_tighter_bound_takes_more_classes_and_holds(planes, cec_modules_csv):
    # The bound itself, for power limits: sum of what lies above a limit, entry by entry and in classes.
    year = module_year(one(cec_modules_csv, 500), planes["Greensboro"])
    sizes = []
    for bound in (0.02, 0.005, 0.001, 0.0002):
        short = condense(year, bound, current_limits=False)
        sizes.append(short.hours.size)
        limits = np.linspace(0.35, 1.0, 300) * year.power_w.max()
        cut = np.array([year.hours @ np.maximum(year.power_w - t, 0) for t in limits])
        cut_short = np.array([short.hours @ np.maximum(short.power_w - t, 0) for t in limits])
        assert np.max(np.abs(cut - cut_short)) * 100 <= bound * (year.hours @ year.power_w)
        assert np.all(cut_short <= cut + 1e-6)  # Jensen: never more than the entries
    assert sizes == sorted(sizes) and sizes[-1] > sizes[0]


def test_years_too_small_to_condense():
    tiny = ModuleYear(np.array([100.0, 50.0, 0.0]), np.array([30.0, 29.0, 0.0]), np.array([1.0, 2.0, 5.0]))
    short = condense(tiny)
    assert list(short.power_w) == [100, 50] and list(short.hours) == [1, 2]
    dark = condense(ModuleYear(np.zeros(2), np.zeros(2), np.ones(2)))
    assert dark.power_w.size == 0
    same = condense(ModuleYear(np.full(900, 80.0), np.full(900, 30.0), np.ones(900)))
    assert same.hours.sum() == 900 and np.all(same.power_w == 80)


# -- many modules ----------------------------------------------------------------------------------------


def test_many_modules_on_common_classes(planes, cec_modules_csv, cec_inverters_csv):
    drawn = list(pairs(cec_modules_csv, cec_inverters_csv, 25))
    chosen = parameters(cec_modules_csv.iloc[[k for k, *_ in drawn]])
    for plane in planes.values():
        short = condense_plane(plane)
        assert short.hours.size < 600
        assert short.hours.sum() == pytest.approx(plane.hours.sum())
        assert short.irradiation_kwh_m2 == pytest.approx(plane.irradiation_kwh_m2)
        many = module_years(chosen, short)
        assert many.power_w.shape == (25, short.hours.size)
        for line, (k, inverter, in_series, counts, current) in enumerate(drawn):
            year = module_year(one(cec_modules_csv, k), plane)
            common = ModuleYear(many.power_w[line], many.vmp_v[line], many.hours)
            assert common.energy_kwh == pytest.approx(year.energy_kwh, rel=1e-3)
            for strings in counts:
                loss, energy = losses(year, inverter, in_series, strings)
                found, found_energy = losses(common, inverter, in_series, strings)
                assert found == pytest.approx(loss, abs=0.01)
                assert found_energy == pytest.approx(energy, rel=1e-3)
                limited, _ = losses(year, inverter, in_series, strings, strings * current)
                found, _ = losses(common, inverter, in_series, strings, strings * current)
                assert found == pytest.approx(limited, abs=0.01)
