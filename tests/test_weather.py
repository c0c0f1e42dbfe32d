"""Weather files of each format and the clear-sky year, against pvlib's readers, sun and clear sky."""

from __future__ import annotations

import shutil
from pathlib import Path

import numpy as np
import pandas as pd
import pvlib
import pytest

import weather_samples as samples
from matcher.errors import MatcherError
from matcher.weather import clear_sky_weather, read_weather
from weather_samples import NORTH_WEST, SOUTH_EAST

DATA = Path(pvlib.__file__).parent / "data"


def written(tmp_path: Path, text: str, name: str = "weather.bin") -> Path:
    """A file whose name says nothing of its format."""
    path = tmp_path / name
    path.write_bytes(text.encode())
    return path


def assert_sun_agrees(weather, sky: pd.DataFrame) -> None:
    """Irradiance and the sun of the same entry belong together: ghi = dni cos(zenith) + dhi."""
    np.testing.assert_allclose(weather.ghi, sky["ghi"], atol=1e-9)
    zenith = np.radians(weather.sun[0])
    closed = weather.dni * np.maximum(np.cos(zenith), 0) + weather.dhi
    high = weather.ghi > 100
    np.testing.assert_allclose(closed[high], weather.ghi[high], atol=2)
    assert weather.hours.sum() == pytest.approx(8760)


# -- the files that pvlib installs -----------------------------------------------------------------------


@pytest.mark.parametrize(("file", "city"), [("723170TYA.CSV", "Greensboro"), ("703165TY.csv", "Sand Point")])
def test_tmy3_file_of_pvlib(file, city, tmp_path):
    # Source: pvlib.iotools.read_tmy3 on the file; label at the end of the hour (Wilcox and Marion 2008).
    weather = read_weather(shutil.copy(DATA / file, tmp_path / "anything.dat"))
    theirs, meta = pvlib.iotools.read_tmy3(DATA / file)
    assert weather.kind == "TMY3" and city in weather.name
    assert (weather.latitude, weather.longitude) == (meta["latitude"], meta["longitude"])
    np.testing.assert_array_equal(weather.ghi, theirs["ghi"])
    np.testing.assert_array_equal(weather.temp_air, theirs["temp_air"])
    assert weather.times[0].strftime("%m-%d %H:%M") == "01-01 00:30"
    assert weather.times[-1].strftime("%m-%d %H:%M") == "12-31 23:30"
    assert weather.lowest_c == theirs["temp_air"].min() and weather.highest_c == theirs["temp_air"].max()
    assert weather.horizontal_kwh_m2 == pytest.approx(theirs["ghi"].sum() / 1000)
    assert np.all(weather.hours == 1.0)


def test_tmy2_file_of_pvlib():
    # Source: the columns of Table 3-2 of Marion and Urban 1995 (from memory): W/m2, tenths of degC, m/s.
    weather = read_weather(DATA / "12839.tm2")
    rows = (DATA / "12839.tm2").read_text().splitlines()[1:]

    def column(first: int, last: int) -> np.ndarray:
        return np.array([float(row[first - 1 : last]) for row in rows])

    assert weather.kind == "TMY2" and weather.name == "Miami"
    np.testing.assert_array_equal(weather.ghi, column(18, 21))
    np.testing.assert_array_equal(weather.dni, column(24, 27))
    np.testing.assert_array_equal(weather.dhi, column(30, 33))
    np.testing.assert_allclose(weather.temp_air, column(68, 71) / 10)
    np.testing.assert_allclose(weather.wind_speed, column(96, 98) / 10)
    assert weather.times[0].strftime("%m-%d %H:%M %z") == "01-01 00:30 -0500"


# -- each format, written here ---------------------------------------------------------------------------


@pytest.mark.parametrize("minutes", [60, 30])
def test_epw(tmp_path, minutes):
    middle = samples.local_year(SOUTH_EAST, minutes)
    sky = samples.sky(SOUTH_EAST, middle)
    weather = read_weather(written(tmp_path, samples.epw(SOUTH_EAST, middle, sky, minutes)))
    assert weather.kind == "EPW" and weather.name == "Samplecity" and weather.altitude == 100
    assert weather.interval_hours == minutes / 60
    assert (weather.times == middle).all()
    assert_sun_agrees(weather, sky)


@pytest.mark.parametrize(("minutes", "label"), [(60, "end"), (60, "start"), (60, "middle"), (15, "end")])
def test_tmy3_labels(tmp_path, minutes, label):
    middle = samples.local_year(NORTH_WEST, minutes)
    sky = samples.sky(NORTH_WEST, middle)
    weather = read_weather(written(tmp_path, samples.tmy3(NORTH_WEST, middle, sky, minutes, label)))
    assert weather.kind == "TMY3" and weather.interval_hours == minutes / 60
    assert (weather.times == middle).all()
    assert_sun_agrees(weather, sky)
    assert bool(weather.notes) == (label != "end")


def test_tmy3_of_a_leap_year_keeps_29_february(tmp_path):
    middle = samples.local_year(NORTH_WEST, year=2020)
    sky = samples.sky(NORTH_WEST, middle)
    weather = read_weather(written(tmp_path, samples.tmy3(NORTH_WEST, middle, sky)))
    assert weather.times.size == 8784 and (weather.times == middle).all()
    assert_sun_agrees(weather, sky)  # with the hours of 8,760
    february = weather.times.month == 2
    assert weather.hours[february].sum() == pytest.approx(28 * 24)


def test_typical_year_of_months_from_several_years(tmp_path):
    middle = samples.local_year(NORTH_WEST)
    sky = samples.sky(NORTH_WEST, middle)
    text = samples.tmy3(NORTH_WEST, middle, sky)
    lines = text.splitlines()
    for k, line in enumerate(lines[2:], start=2):
        year = 2000 + (int(line[:2]) * 5) % 7  # 2000 and 2004 are leap years
        lines[k] = line[:6] + str(year) + line[10:]
    weather = read_weather(written(tmp_path, "\n".join(lines)))
    assert (weather.times == middle).all()
    assert_sun_agrees(weather, sky)


def test_tmy2_with_a_city_of_several_words(tmp_path):
    city = "ST JOHN ON SEA"
    middle = samples.local_year(SOUTH_EAST, year=1991)
    sky = samples.sky(SOUTH_EAST, middle)
    weather = read_weather(written(tmp_path, samples.tmy2(SOUTH_EAST, city, middle, sky)))
    assert weather.name == city.title()
    assert (weather.latitude, weather.longitude) == (-30, 150)
    np.testing.assert_allclose(weather.temp_air, sky["temp_air"])
    assert_sun_agrees(weather, sky)


@pytest.mark.parametrize("form", ["csv", "json"])
def test_pvgis_tmy_takes_the_sun_at_stamp_plus_offset(tmp_path, form):
    stamps = pd.date_range("2021-01-01", periods=8760, freq="h", tz="UTC")
    sky = samples.sky(NORTH_WEST, stamps + pd.Timedelta(hours=0.1761))
    weather = read_weather(written(tmp_path, samples.pvgis_tmy(NORTH_WEST, stamps, sky, 0.1761, form)))
    assert weather.kind == "PVGIS TMY"
    assert_sun_agrees(weather, sky)


@pytest.mark.parametrize("form", ["csv", "json"])
def test_pvgis_hourly_on_the_horizontal_over_two_years(tmp_path, form):
    stamps = pd.date_range("2019-01-01 00:10", "2020-12-31 23:10", freq="h", tz="UTC")
    sky = samples.sky(SOUTH_EAST, stamps)
    parts = pd.DataFrame({
        "Gb(i)": sky["ghi"] - sky["dhi"], "Gd(i)": sky["dhi"], "Gr(i)": 0.0, "H_sun": 0.0,
        "T2m": sky["temp_air"], "WS10m": 2.0,
    })  # fmt: skip
    weather = read_weather(written(tmp_path, samples.pvgis_hourly(SOUTH_EAST, stamps, parts, 0, 0, form)))
    assert weather.kind == "PVGIS hourly" and weather.plane is None
    assert (weather.times == stamps).all()
    assert_sun_agrees(weather, sky)
    high = weather.ghi > 200
    np.testing.assert_allclose(weather.dni[high], sky["dni"][high], atol=5)  # of rounded values
    assert weather.hours[0] == pytest.approx(0.5)  # the mean of two years
    assert weather.hours[(weather.times.month == 2)].sum() == pytest.approx(28 * 24)


@pytest.mark.parametrize("form", ["csv", "json"])
def test_pvgis_hourly_on_a_tilted_plane(tmp_path, form):
    stamps = pd.date_range("2021-01-01 00:10", periods=8760, freq="h", tz="UTC")
    sky = samples.sky(NORTH_WEST, stamps)
    parts = pd.DataFrame(
        {"Gb(i)": sky["ghi"], "Gd(i)": sky["dhi"], "Gr(i)": 3.0, "T2m": sky["temp_air"], "WS10m": 2.0}
    )
    weather = read_weather(written(tmp_path, samples.pvgis_hourly(NORTH_WEST, stamps, parts, 35, -90, form)))
    assert weather.ghi is None and weather.horizontal_kwh_m2 is None
    assert (weather.plane.tilt, weather.plane.azimuth) == (35, 90)  # PVGIS: -90 is east; here 90
    np.testing.assert_allclose(weather.plane.global_, sky["ghi"] + sky["dhi"] + 3.0)


def test_a_few_missing_hours_are_filled_and_said(tmp_path):
    middle = samples.local_year(NORTH_WEST)
    sky = samples.sky(NORTH_WEST, middle)
    lines = samples.tmy3(NORTH_WEST, middle, sky).splitlines()
    noon = 2 + 24 * 180 + 12
    del lines[noon : noon + 3]
    row = 2 + 24 * 200 + 12
    lines[row] = ",".join(
        lines[row].split(",")[:2] + ["-9900"] * 5
    )  # the mark of a missing value (from memory)
    weather = read_weather(written(tmp_path, "\n".join(lines)))
    assert weather.times.size == 8756 and weather.hours.sum() == pytest.approx(8760)
    assert any("4 missing intervals" in note for note in weather.notes)
    assert weather.horizontal_kwh_m2 == pytest.approx(sky["ghi"].sum() / 1000, rel=1e-4)


def test_the_third_component_follows_from_the_other_two(tmp_path):
    middle = samples.local_year(NORTH_WEST)
    sky = samples.sky(NORTH_WEST, middle)
    without = sky.assign(dhi=9999)  # the mark of a missing value in EPW
    weather = read_weather(written(tmp_path, samples.epw(NORTH_WEST, middle, without)))
    np.testing.assert_allclose(weather.dhi, sky["dhi"], atol=2)


# -- files that are wrong --------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def good() -> tuple[pd.DatetimeIndex, pd.DataFrame]:
    middle = samples.local_year(NORTH_WEST)
    return middle, samples.sky(NORTH_WEST, middle)


def refused(path: Path) -> str:
    with pytest.raises(MatcherError) as caught:
        read_weather(path)
    line = str(caught.value)
    assert line.startswith(str(path)) and "\n" not in line and len(line) < 400
    return line


def test_no_file_empty_file_other_file(tmp_path):
    assert "No such file" in refused(tmp_path / "missing.epw")
    assert "cannot be read" in refused(tmp_path)
    assert "empty" in refused(written(tmp_path, " \n"))
    assert "not a weather file" in refused(written(tmp_path, "name,price\nx,1\n"))
    path = tmp_path / "bytes.epw"
    path.write_bytes(bytes(range(256)) * 10)
    assert "not a weather file" in refused(path)
    assert "neither PVGIS hourly nor PVGIS TMY" in refused(written(tmp_path, '{"outputs": {"monthly": []}}'))
    assert "cut or was edited" in refused(written(tmp_path, '{"outputs": {"hourly": [{"time"'))


def test_cut_files(tmp_path, good):
    stamps = pd.date_range("2021-01-01", periods=8760, freq="h", tz="UTC")
    sky = samples.sky(NORTH_WEST, stamps)
    texts = {
        "EPW": samples.epw(NORTH_WEST, *good),
        "TMY3": samples.tmy3(NORTH_WEST, *good),
        "TMY2": samples.tmy2(NORTH_WEST, "CUT", *good),
        "CSV": samples.pvgis_tmy(NORTH_WEST, stamps, sky, 0.0, "csv"),
        "JSON": samples.pvgis_tmy(NORTH_WEST, stamps, sky, 0.0, "json"),
    }
    for kind, text in texts.items():
        for share in (0.0005, 0.1, 0.97) if kind != "TMY2" else (0.0005, 0.1):
            line = refused(written(tmp_path, text[: int(len(text) * share)]))
            assert "cut" in line or "without rows" in line or "not a weather file" in line, line


def test_shuffled_rows_and_shuffled_values(tmp_path, good):
    middle, sky = good
    lines = samples.tmy3(NORTH_WEST, middle, sky).splitlines()
    order = np.random.default_rng(1).permutation(len(lines) - 2) + 2
    assert "shuffled" in refused(written(tmp_path, "\n".join(lines[:2] + [lines[k] for k in order])))
    assert "doubled" in refused(written(tmp_path, "\n".join(lines[:50] + lines[49:])))
    mixed = sky.sample(frac=1, random_state=1)
    assert "while the sun is down" in refused(written(tmp_path, samples.epw(NORTH_WEST, middle, mixed)))


def test_wrong_place_or_time_zone(tmp_path, good):
    text = samples.epw(NORTH_WEST, *good)
    assert "while the sun is down" in refused(written(tmp_path, text.replace(",-100.0,", ",100.0,", 1)))
    assert "while the sun is down" in refused(written(tmp_path, text.replace(",-7.0,", ",2.0,", 1)))
    assert "not on Earth" in refused(written(tmp_path, text.replace(",40.0,", ",400.0,", 1)))


@pytest.mark.parametrize(
    ("factor", "said"),
    [(3600, "J/m2"), (3.6, "kJ/m2"), (0.0036, "MJ/m2"), (0.001, "kW/m2"), (0.0929, "check the unit")],
)
def test_irradiance_in_other_units(tmp_path, good, factor, said):
    middle, sky = good
    scaled = sky.copy()
    scaled[["ghi", "dni", "dhi"]] *= factor
    assert said in refused(written(tmp_path, samples.epw(NORTH_WEST, middle, scaled)))


def test_temperature_in_other_units(tmp_path, good):
    middle, sky = good
    for scaled, said in ((sky["temp_air"] * 1.8 + 32, "Fahrenheit"), (sky["temp_air"] + 273.15, "kelvin")):
        text = samples.tmy3(NORTH_WEST, middle, sky.assign(temp_air=scaled))
        assert said in refused(written(tmp_path, text))


def test_missing_column_and_negative_irradiance(tmp_path, good):
    middle, sky = good
    text = samples.tmy3(NORTH_WEST, middle, sky)
    assert "wind_speed is missing" in refused(written(tmp_path, text.replace("Wspd (m/s)", "Gust (m/s)")))
    assert "never negative" in refused(
        written(tmp_path, samples.epw(NORTH_WEST, middle, sky.assign(dhi=-60)))
    )
    dark = sky.assign(ghi=0, dni=0, dhi=0)
    assert "0 in all rows" in refused(written(tmp_path, samples.epw(NORTH_WEST, middle, dark)))


def test_tracked_plane_of_pvgis_is_refused(tmp_path):
    stamps = pd.date_range("2021-01-01 00:10", periods=8760, freq="h", tz="UTC")
    sky = samples.sky(NORTH_WEST, stamps)
    parts = pd.DataFrame({"G(i)": sky["ghi"], "T2m": sky["temp_air"], "WS10m": 2.0})
    text = samples.pvgis_hourly(NORTH_WEST, stamps, parts, 0, 0, "csv").replace("Slope: 0 deg. ", "Slope: - ")
    assert "tracked plane" in refused(written(tmp_path, text))


# -- clear sky -------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("lat", "lon", "warm_month"), [(48.0, 11.0, 7), (-33.0, 151.0, 1), (0.0, -78.0, 7)])
def test_clear_sky_year(lat, lon, warm_month):
    # Source: pvlib.location.Location.get_clearsky; the temperature by its definition.
    weather = clear_sky_weather(lat, lon, -12.0, 36.0)
    theirs = pvlib.location.Location(lat, lon).get_clearsky(weather.times)
    np.testing.assert_allclose(weather.ghi, theirs["ghi"], rtol=1e-9, atol=1e-9)
    assert weather.times.size == 8760 and weather.hours.sum() == 8760
    assert -12.0 <= weather.lowest_c < -11.8 and 35.8 < weather.highest_c <= 36.0
    warmest = weather.times[int(np.argmax(weather.temp_air))]
    assert warmest.month == warm_month and abs(warmest.day - 20) <= 1
    solar_hour = (warmest.hour + warmest.minute / 60 + lon / 15) % 24
    assert abs(solar_hour - 15) <= 0.5
    assert "upper bound" in weather.notes[0]


def test_clear_sky_of_no_place():
    with pytest.raises(MatcherError, match="latitude 95"):
        clear_sky_weather(95.0, 0.0, 0.0, 30.0)
    with pytest.raises(MatcherError, match="swap"):
        clear_sky_weather(45.0, 0.0, 30.0, 0.0)
