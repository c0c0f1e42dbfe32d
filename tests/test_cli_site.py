"""``ferrule site``: add, list, show, drop."""

from __future__ import annotations

import json
from pathlib import Path

import pandas as pd
import pvlib
import pytest

#: A TMY3 file that pvlib installs, of Greensboro, North Carolina (form: NREL/TP-581-43156; from memory).
TMY3 = Path(pvlib.__file__).parent / "data" / "723170TYA.CSV"


@pytest.fixture(scope="module")
def tmy3() -> pd.DataFrame:
    """The weather file as pandas reads it."""
    return pd.read_csv(TMY3, skiprows=1)


FULL = (
    "--low", -12, "--high", 36.5, "--mounting", "gap-roof", "--voltage-cap", 600, "--rear-share", 0.1,
    "--lat", 47.6, "--lon", 1.4, "--tilt", 30, "--azimuth", 205,
)  # fmt: skip


def test_a_site_is_kept_with_all_its_values(ferrule):
    assert ferrule("site", "add", "Mill  Lane", *FULL).out.startswith(
        "Kept: Mill Lane, -12 to 36.5 degC, gap-roof"
    )
    site = json.loads(ferrule("site", "show", "mill lane", "--json").out)["site"]
    assert site == {
        "name": "Mill Lane", "design_low_c": -12, "design_high_c": 36.5, "mounting": "gap-roof",
        "voltage_cap_v": 600, "rear_share": 0.1, "lat": 47.6, "lon": 1.4, "tilt": 30, "azimuth": 205,
        "weather": None,
    }  # fmt: skip


def test_what_is_not_given_is_not_stated(ferrule):
    ran = ferrule("site", "add", "Bare", "--low", -3, "--high", 40)
    assert "no clipping figure" in ran.out
    rows = {line.split()[0]: line.split() for line in ferrule("site", "show", "bare").out.splitlines()}
    assert rows["voltage_cap_v"][1:3] == ["not", "stated"]
    assert rows["mounting"][1] == "open-rack"
    assert rows["design_low_c"][1:3] == ["-3", "degC"]
    site = json.loads(ferrule("site", "show", "bare", "--json").out)["site"]
    assert site["lat"] is None and site["voltage_cap_v"] is None


def test_list_and_drop(ferrule, small_catalog):
    ferrule("site", "add", "Mill Lane", *FULL)
    ran = ferrule("site", "list")
    assert "Low Wharf" in ran.out and "Mill Lane" in ran.out and "47.6, 1.4" in ran.out
    assert [s["name"] for s in json.loads(ferrule("site", "list", "--json").out)["sites"]] == [
        "Low Wharf",
        "Mill Lane",
    ]
    assert json.loads(ferrule("site", "drop", "MILL LANE", "--json").out)["dropped"] == "Mill Lane"
    assert ferrule("site", "drop", "low wharf").out == "Dropped: Low Wharf.\n"
    assert "No site is kept" in ferrule("site", "list").out
    assert json.loads(ferrule("site", "list", "--json").out)["sites"] == []


def test_a_site_is_replaced_only_when_asked(ferrule, small_catalog):
    ran = ferrule("site", "add", "LOW wharf", "--low", -1, "--high", 30)
    assert ran.status == 2 and "--replace" in ran.err and "Low Wharf" in ran.err
    assert json.loads(ferrule("site", "show", "low wharf", "--json").out)["site"]["design_low_c"] == -12
    assert ferrule("site", "add", "LOW wharf", "--low", -1, "--high", 30, "--replace").status == 0
    assert json.loads(ferrule("site", "show", "low wharf", "--json").out)["site"]["design_low_c"] == -1


def test_the_weather_file_is_read_and_reported(ferrule, tmy3):
    ran = ferrule(
        "site",
        "add",
        "Greens",
        "--low",
        -20,
        "--high",
        40,
        "--weather",
        TMY3,
        "--tilt",
        0,
        "--azimuth",
        180,
        "--json",
    )
    weather = json.loads(ran.out)["weather"]
    temperature = tmy3["Dry-bulb (C)"]
    assert (weather["lowest_c"], weather["highest_c"]) == (temperature.min(), temperature.max())
    assert weather["entries"] * weather["interval_hours"] == len(tmy3) == 8760
    assert "Greensboro" in weather["place"]
    # A plane that lies flat receives what the file gives for the horizontal.
    assert weather["irradiation_kwh_m2"] == pytest.approx(tmy3["GHI (W/m^2)"].sum() / 1000, rel=0.02)
    out = ferrule("site", "show", "greens").out
    assert "8,760 hours" in out and "Greensboro" in out and "kWh/m2" in out


def test_weather_beyond_the_design_temperatures_is_said(ferrule):
    ran = ferrule(
        "site", "add", "Greens", "--low", -5, "--high", 30, "--weather", TMY3, "--lat", 10, "--lon", 10
    )
    said = " ".join(ran.out.split())
    assert ran.status == 0
    assert "colder (-16.7 degC) than the design low of -5 degC" in said
    assert "hotter (35.6 degC) than the design high of 30 degC" in said
    assert "not that of the site" in said


def test_a_weather_file_offers_its_extremes_with_a_warning_only(ferrule, tmy3, tmp_path):
    ran = ferrule("site", "add", "Greens", "--weather", TMY3)
    assert ran.status == 2 and ran.err.count("\n") == 1
    assert f"--low {tmy3['Dry-bulb (C)'].min():g} --high {tmy3['Dry-bulb (C)'].max():g}" in ran.err
    assert "a typical year is not an extreme one" in ran.err
    assert not (tmp_path / "small.sqlite").exists()
    taken = ferrule(
        "site", "add", "Greens", "--low", tmy3["Dry-bulb (C)"].min(), "--high", 40, "--weather", TMY3
    )
    assert "a typical year is not an extreme one" in " ".join(taken.out.split())


def test_a_weather_path_holds_in_every_folder(ferrule, tmp_path, monkeypatch):
    (tmp_path / "year.csv").write_bytes(TMY3.read_bytes())
    monkeypatch.chdir(tmp_path)
    ran = ferrule("site", "add", "Greens", "--low", -20, "--high", 40, "--weather", "year.csv", "--json")
    assert json.loads(ran.out)["site"]["weather"] == str(tmp_path / "year.csv")


@pytest.mark.parametrize(
    ("values", "said"),
    [
        (("--low", 20, "--high", 5), "design low of 20 degC is above the design high of 5 degC"),
        (("--low", 10, "--high", 95), "95 degF would be 35 degC"),
        (("--low", -12), "--high: give"),
        ((), "--low and --high: give"),
        (("--low", -90, "--high", 30), "-90"),
        (("--low", -12, "--high", 36, "--mounting", "flat"), "open-rack, gap-roof, near-roof, integrated"),
        (("--low", -12, "--high", 36, "--lat", 50), "both --lat and --lon"),
        (("--low", -12, "--high", 36, "--lat", 95, "--lon", 0), "latitude"),
        (("--low", -12, "--high", 36, "--rear-share", 10), "rear irradiance"),
        (("--low", "cold", "--high", 36), "--low"),
        (("--low", "nan", "--high", 36), "low"),
        (("--low", -12, "--high", 36, "--weather", "nowhere.epw"), "nowhere.epw"),
        (("--low", -12, "--high", 36, "--weather", __file__), "not a weather file"),
    ],
)
def test_add_refuses_in_one_line_and_keeps_nothing(ferrule, tmp_path, values, said):
    ran = ferrule("site", "add", "Mill Lane", *values)
    assert ran.status == 2 and not ran.out
    assert said in ran.err and ran.err.count("\n") == 1
    assert not (tmp_path / "small.sqlite").exists()


@pytest.mark.parametrize("command", ["show", "drop"])
def test_an_unknown_site_names_the_near_one(ferrule, small_catalog, command):
    ran = ferrule("site", command, "low warf")
    assert ran.status == 2 and "near to it: Low Wharf" in ran.err
    assert "Low Wharf" in ferrule("site", "list").out


def test_a_weather_file_that_is_gone_is_said_and_the_site_can_be_dropped(ferrule, tmp_path):
    file = tmp_path / "year.csv"
    file.write_bytes(TMY3.read_bytes())
    ferrule("site", "add", "Greens", "--low", -20, "--high", 40, "--weather", file)
    file.unlink()
    ran = ferrule("site", "show", "greens")
    assert ran.status == 2 and "year.csv" in ran.err
    assert ferrule("site", "drop", "greens").status == 0
