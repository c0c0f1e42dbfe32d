"""What hourly means hide: clipping of minutes that are known lies between that of the hours and the stated most."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pvlib
import pytest
from pvlib.location import Location

from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.records import Site
from matcher.fit import Request, fit
from matcher.moduleyear import module_year, plane_year
from matcher.peaks import clipping_pct, sun_or_cloud
from matcher.singlediode import six_parameters
from matcher.weather import Weather

PLACE = Location(52.0, 13.0, altitude=40.0)


def weather_of(times: pd.DatetimeIndex, sky: pd.DataFrame, hours: float) -> Weather:
    n = len(times)
    return Weather(
        kind="made up", name="Weir", latitude=52.0, longitude=13.0, altitude=40.0, times=times, hours=np.full(n, hours),
        interval_hours=hours, ghi=sky["ghi"].to_numpy(), dni=sky["dni"].to_numpy(), dhi=sky["dhi"].to_numpy(),
        temp_air=np.full(n, 15.0), wind_speed=np.full(n, 2.0),
    )  # fmt: skip


def minutes_and_hours(cloudiness: float) -> tuple[Weather, Weather]:
    """Ten days of June in minutes, a clear sky behind random clouds of some minutes each, and its hourly means."""
    times = pd.date_range("2021-06-10 00:00:30", periods=10 * 1440, freq="min", tz="UTC")
    sky = PLACE.get_clearsky(times, model="ineichen")
    rng = np.random.default_rng(7)
    passing = np.repeat(rng.random(10 * 1440) < cloudiness, rng.integers(2, 25, 10 * 1440))[: len(times)]
    sky = sky.mul(np.where(passing, rng.uniform(0.2, 0.5), 1.0), axis=0)
    hourly = sky.groupby(sky.index.floor("h")).mean()
    return weather_of(times, sky, 1 / 60), weather_of(hourly.index + pd.Timedelta(minutes=30), hourly, 1.0)


@pytest.mark.parametrize("cloudiness", [0.0, 0.3, 0.6])
def test_the_truth_lies_between_the_means_and_the_most(cloudiness):
    module = next(m for m in read_cec_modules() if m.model == "CS6K-270P")
    inverter = next(i for i in read_cec_inverters() if 4_900 < i.ac_power_w < 5_100 and i.mppt_low_v < 250)
    minutes, hours = minutes_and_hours(cloudiness)
    six = six_parameters(module)
    years = [
        module_year(six, plane, 2.0)
        for plane in (plane_year(hours, 30.0, 180.0), plane_year(minutes, 30.0, 180.0), sun_or_cloud(hours, 30.0, 180.0))
    ]
    found = fit([module], [inverter], Request(Site(name="Weir", design_low_c=-15.0, design_high_c=38.0), ratio=(1.0, 1.8), every=True), years[0])
    clipping = 0
    for option in found.options(12):
        by_means, true, most = (clipping_pct(found, option, year) for year in years)
        assert option.clipping_loss_pct == pytest.approx(by_means, abs=1e-6)
        assert by_means <= true + 0.05 and true <= most + 0.05
        if cloudiness and by_means > 0.5:
            clipping += 1
            assert by_means < true < most
    assert clipping or not cloudiness
    # A clear hour hides little: only the ramp within it.
    if not cloudiness:
        assert most - by_means < 0.35 * by_means + 0.5


def test_energy_on_the_plane_stays():
    _, hours = minutes_and_hours(0.4)
    plain, bright = plane_year(hours, 30.0, 180.0), sun_or_cloud(hours, 30.0, 180.0)
    assert bright.irradiation_kwh_m2 == pytest.approx(plain.irradiation_kwh_m2, rel=1e-12)
    assert (bright.irradiance >= plain.irradiance).all() and (bright.hours <= plain.hours).all()
    still = sun_or_cloud(replace(hours, interval_hours=1.0), 30.0, 180.0)
    np.testing.assert_array_equal(still.irradiance, bright.irradiance)


def test_fit_with_peaks(ferrule, demo_catalog):
    weather = Path(pvlib.__file__).parent / "data" / "723170TYA.CSV"
    place = ("--low", "-12", "--high", "38", "--weather", weather)
    ran = ferrule("fit", "--module", "klassik 270p", *place, "--peaks", "--json")
    assert ran.status == 0, ran.err
    document = json.loads(ran.out)
    assert 0 < len(document["peaks"]) <= 8
    for peak in document["peaks"]:
        option = document["options"][peak["rank"] - 1]
        assert peak["clipping_loss_pct"] == option["clipping_loss_pct"] <= peak["clipping_at_most_pct"]
    ran = ferrule("fit", "--module", "klassik 270p", *place, "--peaks")
    assert "part full sun and part dark" in ran.out
    ran = ferrule("fit", "--module", "klassik 270p", "--low", "-12", "--high", "38", "--peaks")
    assert ran.status == 2 and "--weather" in ran.err and ran.err.count("\n") == 1
