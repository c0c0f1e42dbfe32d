"""Weather files as they are: which format, and what its time labels mean.

The formats are known by their content, never by the file's name; ``pvlib.iotools`` reads the rows. What
each format's label means, and so where the middle of the interval lies:

EPW
    Hour 1..24 and minute of the *end* of the interval (EnergyPlus, Auxiliary Programs, "Weather File Data
    Dictionary"), local standard time. pvlib's index is the full hour before; the minutes of files with
    several rows per hour, which pvlib leaves unused, are taken from the row.
TMY3
    Label of the *end* of the interval, 01:00..24:00, local standard time (Wilcox and Marion 2008,
    NREL/TP-581-43156). Files of this form by others that begin at 00:00 label the start, and those that
    begin half an interval later the middle. Times are built from the label, because pvlib's index moves
    a 29 February to 1 March.
TMY2
    Hour 1..24 of the end of the interval, local standard time (Marion and Urban 1995, doi:10.2172/87130);
    pvlib's index is the start.
PVGIS hourly
    UTC. A stamp such as 00:10 is the instant of the satellite's image and the value is that of the instant;
    the reanalysis data, which are means, are stamped in the middle of the hour (pvlib,
    ``get_pvgis_hourly``). So the stamp is the time of the sun in both, and stands for one hour.
PVGIS TMY
    UTC, full hours; the instant of the irradiance is the stamp plus the "Irradiance Time Offset" of the file,
    0 where it has none.

Air temperature and wind of a row are taken for the row's interval as they stand.
"""

from __future__ import annotations

import io
import json
import re
import tempfile
import warnings
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from matcher.errors import MatcherError

if TYPE_CHECKING:
    import pandas as pd

COLUMNS = ("ghi", "dni", "dhi", "temp_air", "wind_speed")
_TMY2_HEADER = re.compile(
    r"\s*(\d{5})\s+(\S.*?)\s+([A-Z]{2})\s+(-?\d+)"  # station, city, state, hours from UTC
    r"\s+([NS])\s*(\d+)\s+(\d+)\s+([EW])\s*(\d+)\s+(\d+)\s+(-?\d+)\s*$"  # degrees and minutes, metres
)


@dataclass
class RawYear:
    """Rows of a file, before any check.

    ``data`` holds the columns of `COLUMNS` that the file has, or ``plane`` for irradiance on a plane, and
    ``beam_horizontal`` for the beam on the horizontal; ``data.index`` is the middle of the intervals.
    """

    kind: str
    name: str
    latitude: float
    longitude: float
    altitude: float
    data: pd.DataFrame
    interval_hours: float
    plane: tuple[float, float] | None = None  # tilt and azimuth [deg]
    notes: list[str] = field(default_factory=list)


def raw_year(content: bytes, where: str) -> RawYear:
    """Recognise the format of a file's content and read it.

    Raises
    ------
    MatcherError
        When it is empty, none of the formats, or not readable as the format it looks like.
    """
    text = _text(content)
    if not text.strip():
        raise MatcherError(
            f"{where}: the file is empty; give a weather file (EPW, TMY3, TMY2, PVGIS CSV or JSON)"
        )
    kind, read = _recognise(text)
    if read is None:
        raise MatcherError(
            f"{where}: not a weather file that Ferrule knows (EPW, TMY3, TMY2, PVGIS hourly or TMY as CSV or "
            f"JSON); line 1 begins {text.lstrip().splitlines()[0][:40]!r}"
        )
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of pandas about pvlib's readers; what is wrong is found below
            raw = read(text)
    except MatcherError as error:
        raise MatcherError(f"{where}: {error}") from None
    except Exception as error:  # noqa: BLE001 - whatever the reader stumbles over
        reason = str(error).strip().splitlines()[0] if str(error).strip() else type(error).__name__
        raise MatcherError(
            f"{where}: looks like {kind} but cannot be read as such ({reason[:120]}); the file is cut or was "
            "edited, fetch it again"
        ) from None
    if len(raw.data) < 2:
        raise MatcherError(f"{where}: {kind} without rows of data; fetch it again")
    return raw


def _text(content: bytes) -> str:
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError:
        return content.decode("latin-1")


def _recognise(text: str) -> tuple[str, Any]:
    """Name and reader of the format, by what stands in the first lines."""
    head = text.lstrip()[:4000]
    lines = head.splitlines()
    if head.startswith("{"):
        return "PVGIS JSON", _pvgis_json
    if lines[0].startswith("LOCATION,"):
        return "EPW", _epw
    if len(lines) > 1 and lines[1].startswith("Date (MM/DD/YYYY),Time (HH:MM)"):
        return "TMY3", _tmy3
    if lines[0].startswith("Latitude (decimal degrees)"):
        if "time(UTC)," in head:
            return "PVGIS TMY", _pvgis_tmy_csv
        return "PVGIS hourly", _pvgis_hourly_csv
    if _TMY2_HEADER.match(lines[0]):
        return "TMY2", _tmy2
    return "", None


def _epw(text: str) -> RawYear:
    import numpy as np
    import pandas as pd
    from pvlib.iotools import read_epw

    data, meta = read_epw(io.StringIO(text))
    minute = pd.to_numeric(data["minute"]).to_numpy()
    hour = data.index  # start of the labelled hour
    per_hour = int(pd.Series(1, index=hour).groupby(level=0).size().mode().iloc[0])
    interval = pd.Timedelta(hours=1) / per_hour
    if per_hour == 1:
        end = hour + pd.Timedelta(hours=1)
    elif 0 in minute and minute[0] == 0:  # 0, 15, 30, 45: labels of the start
        end = hour + pd.to_timedelta(minute, unit="min") + interval
    else:  # 15, 30, 45, 60, or 0 in place of 60
        end = hour + pd.to_timedelta(np.where(minute == 0, 60, minute), unit="min")
    frame = _columns(data, {name: name for name in COLUMNS}, end - interval / 2)
    _blank(frame, irradiance=9999, temp_air=99.9, wind_speed=999)
    return RawYear(
        "EPW",
        meta["city"].strip(),
        meta["latitude"],
        meta["longitude"],
        meta["altitude"],
        frame,
        1 / per_hour,
    )


def _tmy3(text: str) -> RawYear:
    import pandas as pd
    from pvlib.iotools import read_tmy3

    data, meta = read_tmy3(io.StringIO(text))
    day = pd.to_datetime(data["Date (MM/DD/YYYY)"], format="%m/%d/%Y")
    clock = data["Time (HH:MM)"].str.split(":", expand=True).astype(int)
    minutes = clock[0] * 60 + clock[1]
    label = pd.DatetimeIndex(day + pd.to_timedelta(minutes, unit="min")).tz_localize(int(meta["TZ"] * 3600))
    interval = _interval(label)
    first, length = minutes.iloc[0], interval.total_seconds() / 60
    notes = []
    if first == 0:
        middle = label + interval / 2
        notes.append("labels begin at 00:00: taken as the start of each interval")
    elif first == length / 2:
        middle = label
        notes.append("labels begin half an interval after midnight: taken as the middle of each interval")
    else:
        middle = label - interval / 2
    names = {**{name: name for name in COLUMNS}}
    frame = _columns(data, names, middle)
    _blank(frame, irradiance=9999, temp_air=99.9, wind_speed=999)
    name = meta["Name"].strip().strip('"').title()
    return RawYear(
        "TMY3", name, meta["latitude"], meta["longitude"], meta["altitude"], frame, length / 60, notes=notes
    )


def _tmy2(text: str) -> RawYear:
    import pandas as pd
    from pvlib.iotools import read_tmy2

    lines = text.splitlines()
    head = _TMY2_HEADER.match(lines[0])
    station, city, *rest = head.groups()
    # pvlib reads from a path only, and splits the head at spaces, also those of a city of several words.
    lines[0] = " ".join([station, city.replace(" ", "_"), *rest])
    with tempfile.TemporaryDirectory() as folder:
        copy = Path(folder) / "year.tm2"
        copy.write_text("\n".join([line for line in lines if line.strip()]) + "\n")
        data, meta = read_tmy2(copy)
    names = {"ghi": "GHI", "dni": "DNI", "dhi": "DHI", "temp_air": "DryBulb", "wind_speed": "Wspd"}
    frame = _columns(data, names, data.index + pd.Timedelta(minutes=30))
    _blank(frame, irradiance=9999, temp_air=9999, wind_speed=999)
    frame[["temp_air", "wind_speed"]] /= 10  # tenths
    return RawYear("TMY2", city.title(), meta["latitude"], meta["longitude"], meta["altitude"], frame, 1.0)


def _pvgis_json(text: str) -> RawYear:
    from pvlib.iotools import read_pvgis_hourly, read_pvgis_tmy

    outputs = json.loads(text).get("outputs", {})
    if "tmy_hourly" in outputs:
        data, meta = read_pvgis_tmy(io.StringIO(text), pvgis_format="json")
        place = meta["inputs"]["location"]
        return _pvgis_tmy(data, place, _offset(meta["inputs"]))
    if "hourly" not in outputs:
        raise MatcherError(
            "JSON, but neither PVGIS hourly nor PVGIS TMY (outputs.hourly, outputs.tmy_hourly)"
        )
    data, meta = read_pvgis_hourly(io.StringIO(text), pvgis_format="json")
    mounting = meta["inputs"].get("mounting_system", {})
    fixed = mounting.get("fixed")
    slope = fixed["slope"]["value"] if fixed else None
    aspect = fixed["azimuth"]["value"] if fixed else None
    return _pvgis_hourly(data, meta["inputs"]["location"], slope, aspect)


def _pvgis_tmy_csv(text: str) -> RawYear:
    from pvlib.iotools import read_pvgis_tmy

    data, meta = read_pvgis_tmy(io.BytesIO(text.encode()), pvgis_format="csv")
    return _pvgis_tmy(data, meta["inputs"], _offset(meta["inputs"]))


def _pvgis_hourly_csv(text: str) -> RawYear:
    from pvlib.iotools import read_pvgis_hourly

    data, meta = read_pvgis_hourly(io.StringIO(text.replace("\r\n", "\n")), pvgis_format="csv")
    inputs = meta["inputs"]
    return _pvgis_hourly(
        data, inputs, _leading_number(inputs.get("Slope")), _leading_number(inputs.get("Azimuth"))
    )


def _pvgis_tmy(data: pd.DataFrame, place: dict, offset: float | None) -> RawYear:
    import pandas as pd

    notes = []
    if offset is None:
        notes.append("the file names no irradiance time offset: the sun is taken at the full hours")
    frame = _columns(data, {name: name for name in COLUMNS}, data.index + pd.Timedelta(hours=offset or 0.0))
    return RawYear("PVGIS TMY", _pvgis_name(place), *_pvgis_place(place), frame, 1.0, notes=notes)


def _pvgis_hourly(data: pd.DataFrame, place: dict, slope: float | None, aspect: float | None) -> RawYear:
    if slope is None or aspect is None:
        raise MatcherError("PVGIS hourly of a tracked plane; fetch it for a fixed plane, best with slope 0")
    notes = []
    if "poa_direct" in data and slope == 0:
        # On the horizontal the components of the plane are beam and diffuse; the ground is not seen.
        data = data.assign(beam_horizontal=data["poa_direct"], dhi=data["poa_sky_diffuse"])
        data["ghi"] = data["beam_horizontal"] + data["dhi"]
        kept = ("ghi", "beam_horizontal", "dhi", "temp_air", "wind_speed")
        plane = None
    else:
        components = ["poa_direct", "poa_sky_diffuse", "poa_ground_diffuse"]
        source = data[components].sum(axis=1) if "poa_direct" in data else data["poa_global"]
        data = data.assign(plane=source)
        kept = ("plane", "temp_air", "wind_speed")
        plane = (float(slope), (float(aspect) + 180) % 360)  # PVGIS counts from south, west positive
    if "Int" in data and (share := float((data["Int"] == 1).mean())) > 0:
        notes.append(f"{share:.1%} of the hours are reconstructed by PVGIS")
    frame = _columns(data, {name: name for name in kept}, data.index)
    return RawYear(
        "PVGIS hourly", _pvgis_name(place), *_pvgis_place(place), frame, 1.0, plane=plane, notes=notes
    )


def _pvgis_place(place: dict) -> tuple[float, float, float]:
    return float(place["latitude"]), float(place["longitude"]), float(place.get("elevation") or 0.0)


def _pvgis_name(place: dict) -> str:
    return f"{float(place['latitude']):g}, {float(place['longitude']):g}"


def _offset(inputs: dict) -> float | None:
    """Irradiance time offset [h], wherever the version of the file puts it."""
    for key, value in inputs.items():
        if isinstance(value, dict):
            found = _offset(value) if key != "descriptions" else None
            if found is not None:
                return found
        elif key.lower().replace("_", " ").startswith("irradiance time offset"):
            return float(value)
    return None


def _leading_number(text: str | None) -> float | None:
    """The number that a line such as "30 deg. (optimum)" begins with."""
    found = re.match(r"\s*(-?\d+(?:\.\d+)?)", text or "")
    return float(found[1]) if found else None


def _interval(label: pd.DatetimeIndex) -> pd.Timedelta:
    """The step between labels that occurs most."""
    import pandas as pd

    return pd.Series(label).diff().mode().iloc[0]


def _columns(data: pd.DataFrame, names: dict[str, str], middle: pd.DatetimeIndex) -> pd.DataFrame:
    """The columns asked for, as numbers; what is not a number becomes NaN."""
    import pandas as pd

    missing = [name for column, name in names.items() if name not in data]
    if missing:
        raise MatcherError(f"the column {missing[0]} is missing; fetch the file again with all columns")
    found = {
        column: pd.to_numeric(data[name], errors="coerce").to_numpy(float) for column, name in names.items()
    }
    return pd.DataFrame(found, index=pd.DatetimeIndex(middle))


def _blank(frame: pd.DataFrame, *, irradiance: float, temp_air: float, wind_speed: float) -> None:
    """Set the format's marks of a missing value, and the negative ones that all use, to NaN."""
    for column in frame:
        mark = {"temp_air": temp_air, "wind_speed": wind_speed}.get(column, irradiance)
        frame[column] = frame[column].mask((frame[column] == mark) | (frame[column] <= -99))
