"""Small invented weather files of each format, written by the tests that read them.

The sky is pvlib's clear sky, averaged over each interval where the format means averages, so that the place,
the time labels and the units of the file are known exactly.
"""

from __future__ import annotations

import json
from dataclasses import dataclass

import numpy as np
import pandas as pd
from pvlib.location import Location


@dataclass(frozen=True)
class Place:
    latitude: float
    longitude: float
    utc_offset: float  # [h]
    altitude: float = 100.0


NORTH_WEST = Place(40.0, -100.0, -7.0)
SOUTH_EAST = Place(-30.0, 150.0, 10.0)


def sky(place: Place, middle: pd.DatetimeIndex) -> pd.DataFrame:
    """Clear-sky irradiance [W/m2], air temperature [degC] and wind [m/s] at the given instants."""
    found = Location(place.latitude, place.longitude, altitude=place.altitude).get_clearsky(
        middle, model="ineichen", linke_turbidity=3.0
    )
    found = found.round(0)
    found["temp_air"] = np.round(10 + 8 * np.sin(2 * np.pi * (middle.hour - 9) / 24), 1)
    found["wind_speed"] = 2.0
    return found


def local_year(place: Place, minutes: int = 60, year: int = 2021) -> pd.DatetimeIndex:
    """Middle of each interval of a year in local standard time."""
    end = f"{year + 1}-01-01"
    start = pd.date_range(
        f"{year}-01-01", end, freq=f"{minutes}min", inclusive="left", tz=int(place.utc_offset * 3600)
    )
    return start + pd.Timedelta(minutes=minutes / 2)


def epw(place: Place, middle: pd.DatetimeIndex, data: pd.DataFrame, minutes: int = 60) -> str:
    """EPW: the label is the end of the interval, hour 1..24."""
    head = [
        f"LOCATION,Samplecity,-,XXX,invented,000000,{place.latitude},{place.longitude},"
        f"{place.utc_offset},{place.altitude}",
        "DESIGN CONDITIONS,0", "TYPICAL/EXTREME PERIODS,0", "GROUND TEMPERATURES,0",
        "HOLIDAYS/DAYLIGHT SAVINGS,No,0,0,0", "COMMENTS 1,invented", "COMMENTS 2,",
        f"DATA PERIODS,1,{60 // minutes},Data,Sunday,1/1,12/31",
    ]  # fmt: skip
    end = middle + pd.Timedelta(minutes=minutes / 2)
    minute = np.where(end.minute == 0, 60, end.minute)
    table = pd.DataFrame(
        {"year": middle.year, "month": middle.month, "day": middle.day, "hour": middle.hour + 1}
    )
    table[["minute", "source"]] = np.column_stack([minute, np.full(len(end), "?9")])
    table["temp_air"] = data["temp_air"].to_numpy()
    table[["dew", "humidity", "pressure", "etr", "etrn", "infrared"]] = (5, 50, 101325, 0, 0, 300)
    table[["ghi", "dni", "dhi"]] = data[["ghi", "dni", "dhi"]].to_numpy()
    table[["light1", "light2", "light3", "light4", "direction"]] = (0, 0, 0, 0, 180)
    table["wind_speed"] = data["wind_speed"].to_numpy()
    table[[f"rest{k}" for k in range(13)]] = 0
    return "\n".join(head) + "\n" + table.to_csv(index=False, header=False, lineterminator="\n")


def tmy3(
    place: Place, middle: pd.DatetimeIndex, data: pd.DataFrame, minutes: int = 60, label: str = "end"
) -> str:
    """TMY3, with the columns that matter."""
    shift = {"end": minutes / 2, "start": -minutes / 2, "middle": 0}[label]
    head = [
        f'700000,"SAMPLE CITY",XX,{place.utc_offset},{place.latitude},{place.longitude},{place.altitude}',
        "Date (MM/DD/YYYY),Time (HH:MM),GHI (W/m^2),DNI (W/m^2),DHI (W/m^2),Dry-bulb (C),Wspd (m/s)",
    ]
    at = middle + pd.Timedelta(minutes=shift)
    midnight = (at == at.normalize()) & (label == "end")
    day, clock = at.strftime("%m/%d/%Y"), at.strftime("%H:%M")
    table = pd.DataFrame({"day": np.where(midnight, middle.strftime("%m/%d/%Y"), day)})
    table["clock"] = np.where(midnight, "24:00", clock)
    columns = ["ghi", "dni", "dhi", "temp_air", "wind_speed"]
    table[columns] = data[columns].to_numpy()
    return "\n".join(head) + "\n" + table.to_csv(index=False, header=False, lineterminator="\n")


def tmy2(place: Place, city: str, middle: pd.DatetimeIndex, data: pd.DataFrame) -> str:
    """TMY2: fixed columns; what Ferrule does not read is filled with 0."""

    def degrees(value: float, letters: str) -> str:
        minutes = round(abs(value) * 60)
        return f"{letters[value < 0]} {minutes // 60:3d} {minutes % 60:2d}"

    rows = [
        f" 99999 {city:<22} XX {int(place.utc_offset):3d} {degrees(place.latitude, 'NS')} "
        f"{degrees(place.longitude, 'EW')} {int(place.altitude):5d}"
    ]
    for t, row in zip(middle, data.itertuples(), strict=True):
        text = f" {t.year % 100:02d}{t.month:02d}{t.day:02d}{t.hour + 1:02d}" + "0000" * 2
        text += "".join(f"{int(v):4d}A7" for v in (row.ghi, row.dni, row.dhi))
        text += "   0A7" * 4 + " 0A7" * 2 + f"{round(row.temp_air * 10):4d}A7" + "   0A7" + "  0A7" + "   0A7"
        text += "  0A7" + f"{round(row.wind_speed * 10):3d}A7" + "   0A7" + "    0A7" + "0" * 10
        text += "  0A7" * 3 + " 0A7"
        rows.append(text)
    return "\n".join(rows) + "\n"


def pvgis_tmy(place: Place, stamps: pd.DatetimeIndex, data: pd.DataFrame, offset: float, form: str) -> str:
    """PVGIS TMY: UTC stamps at full hours, the irradiance ``offset`` hours later."""
    months = [{"month": m, "year": 2005 + m} for m in range(1, 13)]
    table = pd.DataFrame({
        "time(UTC)": stamps.strftime("%Y%m%d:%H%M"), "T2m": data.temp_air.to_numpy(), "RH": 50.0,
        "G(h)": data.ghi.to_numpy(), "Gb(n)": data.dni.to_numpy(), "Gd(h)": data.dhi.to_numpy(),
        "IR(h)": 300.0, "WS10m": data.wind_speed.to_numpy(), "WD10m": 90.0, "SP": 101325.0,
    })  # fmt: skip
    if form == "json":
        location = {"latitude": place.latitude, "longitude": place.longitude, "elevation": place.altitude,
                    "irradiance_time_offset": offset}  # fmt: skip
        return json.dumps({
            "inputs": {"location": location},
            "outputs": {"months_selected": months, "tmy_hourly": table.to_dict("records")},
            "meta": {"inputs": {}},
        })  # fmt: skip
    head = _pvgis_head(place) + [f"Irradiance Time Offset (h): {offset}", "month,year"]
    head += [f"{m['month']},{m['year']}" for m in months]
    return (
        "\r\n".join(head)
        + "\r\n"
        + table.to_csv(index=False, lineterminator="\r\n")
        + "\r\nT2m: invented\r\n"
    )


def pvgis_hourly(
    place: Place, stamps: pd.DatetimeIndex, components: pd.DataFrame, slope: float, aspect: float, form: str
) -> str:
    """PVGIS hourly: UTC stamps are instants; columns Gb(i), Gd(i), Gr(i) of ``components``, or G(i)."""
    table = pd.DataFrame({"time": stamps.strftime("%Y%m%d:%H%M")})
    for name in components:
        table[name] = components[name].to_numpy()
    table["Int"] = 0.0
    if form == "json":
        fixed = {"slope": {"value": slope, "optimal": False}, "azimuth": {"value": aspect, "optimal": False}}
        return json.dumps({
            "inputs": {
                "location": {
                    "latitude": place.latitude,
                    "longitude": place.longitude,
                    "elevation": place.altitude,
                },
                "mounting_system": {"fixed": fixed},
            },
            "outputs": {"hourly": table.to_dict("records")}, "meta": {"inputs": {}},
        })  # fmt: skip
    head = _pvgis_head(place) + ["Radiation database:\tinvented", "", ""]
    head += [f"Slope: {slope:g} deg. ", f"Azimuth: {aspect:g} deg. "]
    return (
        "\r\n".join(head)
        + "\r\n"
        + table.to_csv(index=False, lineterminator="\r\n")
        + "\r\nInt: invented\r\n"
    )


def _pvgis_head(place: Place) -> list[str]:
    return [
        f"Latitude (decimal degrees):\t{place.latitude:.3f}",
        f"Longitude (decimal degrees):\t{place.longitude:.3f}",
        f"Elevation (m):\t{place.altitude:.0f}",
    ]
