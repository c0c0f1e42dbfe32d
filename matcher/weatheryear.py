"""From the rows of a weather file to a year that can be trusted: order, gaps, units, sun."""

from __future__ import annotations

import calendar
from typing import TYPE_CHECKING

from matcher.errors import MatcherError
from matcher.weather import HOURS_OF_YEAR, PlaneIrradiance, Weather

if TYPE_CHECKING:
    import numpy as np
    import pandas as pd

    from matcher.weatherfiles import RawYear

_DAYS = (31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31)
_MIN_COVERAGE = 0.9  # of the hours of each month
_LONGEST_FILL = 6.0  # [h] of temperature or wind that is interpolated
_SOLAR_CONSTANT = 1361.0  # [W/m2]


def year_of(raw: RawYear, where: str) -> Weather:
    """Check the rows of a file and weigh them to one year.

    Each row stands for as many hours as its month and time of day have in a year of 365 days, divided by the
    rows that the file has for them. So several years become their mean, 29 February counts as a part of
    February, a gap is filled by the same hour of the other days of the month, and the sum is 8,760 h.

    Raises
    ------
    MatcherError
        One line, with what to mend.
    """
    import numpy as np

    data, notes = raw.data, list(raw.notes)
    if data.index.hasnans:
        row = int(np.flatnonzero(data.index.isna())[0])
        raise MatcherError(f"{where}: row {row + 1} of the data has no time; the file is cut, fetch it again")
    data.index = _calendar(data.index)
    _check_order(data.index, raw.interval_hours, where)
    _check_temperature(data["temp_air"].to_numpy(), where)
    irradiance = [c for c in ("ghi", "dni", "dhi", "beam_horizontal", "plane") if c in data]
    for column in irradiance:
        _check_irradiance_unit(data[column].to_numpy(), column, where)
        data[column] = data[column].clip(lower=0.0)
    if not -90 <= raw.latitude <= 90 or not -180 <= raw.longitude <= 180:
        raise MatcherError(
            f"{where}: the place {raw.latitude:g}, {raw.longitude:g} is not on Earth; mend the head of "
            "the file"
        )

    _fill(data, "temp_air", raw.interval_hours, notes, where)
    _fill(data, "wind_speed", raw.interval_hours, notes, where)
    sun = _sun(data.index, raw)
    _complete_components(data, sun[0], where)
    complete = data.notna().all(axis=1).to_numpy()
    if not complete.any():
        raise MatcherError(f"{where}: no row has all of {', '.join(data.columns)}; fetch the file again")
    if not complete.all():
        data, sun = data[complete], (sun[0][complete], sun[1][complete])
    hours, gaps = _hours(data.index, raw.interval_hours, where)
    if gaps:
        notes.append(f"{gaps} missing intervals, filled by the same hour of other days of the month")

    column = {name: data[name].to_numpy() for name in data}
    _check_sun(column["plane"] if raw.plane else column["ghi"], hours, sun[0], raw, where)
    weather = Weather(
        kind=raw.kind,
        name=raw.name,
        latitude=raw.latitude,
        longitude=raw.longitude,
        altitude=raw.altitude,
        times=data.index,
        hours=hours,
        interval_hours=raw.interval_hours,
        ghi=column.get("ghi"),
        dni=column.get("dni"),
        dhi=column.get("dhi"),
        temp_air=column["temp_air"],
        wind_speed=column["wind_speed"],
        plane=PlaneIrradiance(*raw.plane, column["plane"]) if raw.plane else None,
        notes=tuple(notes),
    )
    weather.__dict__["sun"] = sun  # known already; `sun` is a cached property
    return weather


def _calendar(times: pd.DatetimeIndex) -> pd.DatetimeIndex:
    """One calendar year for files whose months come from different years; real years stay as they are."""
    import numpy as np
    import pandas as pd

    years = times.year.to_numpy()
    span = (times.max() - times.min()).days
    backwards = bool(np.any(np.diff(years) < 0))
    if not backwards and span <= 366 * len(np.unique(years)) and len(times) * 1.2 > span * 24 * 0.9:
        return times
    naive = times.tz_localize(None)
    year = 2020 if np.any((naive.month == 2) & (naive.day == 29)) else 2021
    parts = pd.DataFrame({"year": year, "month": naive.month, "day": naive.day})
    rest = naive - naive.normalize()
    return pd.DatetimeIndex(pd.to_datetime(parts) + rest).tz_localize(times.tz)


def _check_order(times: pd.DatetimeIndex, interval_hours: float, where: str) -> None:
    import numpy as np

    if not 1 / 60 <= interval_hours <= 1:
        raise MatcherError(f"{where}: intervals of {interval_hours:g} h; give data of 1 to 60 minutes")
    step = np.diff(times.to_numpy()) / np.timedelta64(1, "h")
    wrong = np.flatnonzero(step <= 0)
    if wrong.size:
        row = int(wrong[0])
        raise MatcherError(
            f"{where}: row {row + 2} of the data ({times[row + 1]:%d %b %H:%M}) is not later than the row "
            f"before ({times[row]:%d %b %H:%M}); the rows are shuffled or doubled, sort them by time or "
            "fetch the file again"
        )


def _check_temperature(temp_air: np.ndarray, where: str) -> None:
    import numpy as np

    known = temp_air[np.isfinite(temp_air)]
    if not known.size:
        raise MatcherError(f"{where}: no air temperature in any row; fetch the file again")
    low, mean, high = known.min(), known.mean(), known.max()
    if low > 150:
        raise MatcherError(
            f"{where}: air temperature from {low:.0f} to {high:.0f}: that is kelvin; subtract 273.15 for degC"
        )
    if mean > 36 or high > 60:
        raise MatcherError(
            f"{where}: air temperature up to {high:.0f}, {mean:.0f} in the mean: that looks like degrees "
            "Fahrenheit; convert to degC, (F - 32) / 1.8"
        )
    if low < -95:
        raise MatcherError(
            f"{where}: air temperature of {low:.0f} degC; mend the column of the air temperature"
        )


def _check_irradiance_unit(values: np.ndarray, column: str, where: str) -> None:
    import numpy as np

    known = values[np.isfinite(values)]
    if not known.size:
        return
    high = known.max()
    if known.min() < -50:
        raise MatcherError(
            f"{where}: {column} of {known.min():.0f} W/m2; irradiance is never negative, mend the column"
        )
    if high > 50_000:
        unit, mend = "J/m2 per hour", "divide by 3,600"
    elif high > 2_200:
        unit, mend = "kJ/m2 per hour", "divide by 3.6"
    elif 0 < high < 8:
        unit, mend = "kW/m2 or MJ/m2 per hour", "multiply by 1,000, or by 1,000 / 3.6"
    else:
        return
    raise MatcherError(
        f"{where}: {column} reaches {high:,.4g}: that looks like {unit}; convert to W/m2 ({mend})"
    )


def _fill(data: pd.DataFrame, column: str, interval_hours: float, notes: list[str], where: str) -> None:
    """Interpolate short gaps of a column that is no irradiance."""
    missing = int(data[column].isna().sum())
    if not missing:
        return
    if column == "wind_speed" and missing == len(data):
        data[column] = 1.0
        notes.append("no wind in the file: 1 m/s assumed, pvlib's default for the Faiman model")
        return
    limit = max(1, round(_LONGEST_FILL / interval_hours))
    data[column] = data[column].interpolate(limit=limit, limit_direction="both")
    notes.append(f"{column}: {missing} missing values interpolated over at most {_LONGEST_FILL:g} h")


def _sun(times: pd.DatetimeIndex, raw: RawYear) -> tuple[np.ndarray, np.ndarray]:
    from pvlib.solarposition import get_solarposition

    found = get_solarposition(times, raw.latitude, raw.longitude, altitude=raw.altitude)
    return found["apparent_zenith"].to_numpy(), found["azimuth"].to_numpy()


def _complete_components(data: pd.DataFrame, zenith: np.ndarray, where: str) -> None:
    """Where one of ghi, dni, dhi is missing, take it from the other two: ghi = dni cos(zenith) + dhi."""
    import numpy as np

    if "plane" in data:
        return
    cosine = np.cos(np.radians(zenith))
    if "beam_horizontal" in data:
        # No more than the sun sends: near the horizon the quotient of two small numbers says nothing.
        data["dni"] = (data.pop("beam_horizontal") / np.maximum(cosine, 0.01)).clip(upper=_SOLAR_CONSTANT)
        return
    absent = [c for c in ("ghi", "dni", "dhi") if data[c].isna().all()]
    if len(absent) > 1:
        raise MatcherError(
            f"{where}: {' and '.join(absent)} missing in all rows; two of ghi, dni, dhi are needed, fetch "
            "the file again"
        )
    above = np.maximum(cosine, 0.0)
    data["ghi"] = data["ghi"].fillna(data["dni"] * above + data["dhi"])
    data["dhi"] = data["dhi"].fillna((data["ghi"] - data["dni"] * above).clip(lower=0))
    beam = (data["ghi"] - data["dhi"]).clip(lower=0) / np.maximum(cosine, 0.01)
    data["dni"] = data["dni"].fillna(beam.clip(upper=_SOLAR_CONSTANT))


def _hours(times: pd.DatetimeIndex, interval_hours: float, where: str) -> tuple[np.ndarray, int]:
    """Hours of the year that each row stands for [h], and how many intervals the file lacks."""
    import numpy as np

    per_day = round(24 / interval_hours)
    month = times.month.to_numpy() - 1
    clock = times.hour.to_numpy() + times.minute.to_numpy() / 60 + times.second.to_numpy() / 3600
    slot = np.minimum((clock / interval_hours + 1e-6).astype(int), per_day - 1)
    count = np.zeros((12, per_day))
    np.add.at(count, (month, slot), 1)
    year = times.year.to_numpy()
    gaps = 0
    for m in range(12):
        there = np.unique(year[month == m])
        days = sum(calendar.monthrange(int(y), m + 1)[1] for y in there) or _DAYS[m]
        rows, want = int(count[m].sum()), days * per_day
        if m == 1 and there.size and rows <= 28 * there.size * per_day:
            want = 28 * there.size * per_day  # a typical year leaves 29 February out
        if rows < _MIN_COVERAGE * want or not count[m].all():
            raise MatcherError(
                f"{where}: {calendar.month_name[m + 1]} has {rows:,} of {want:,} intervals; the file is cut "
                "or has gaps, fetch a whole year"
            )
        gaps += max(0, want - rows)
    weight = np.array(_DAYS)[:, None] * interval_hours / count
    hours = weight[month, slot]
    assert abs(hours.sum() - HOURS_OF_YEAR) < 1e-6
    return hours, gaps


def _check_sun(
    irradiance: np.ndarray, hours: np.ndarray, zenith: np.ndarray, raw: RawYear, where: str
) -> None:
    """The sun must be up when it shines, and the year neither darker nor brighter than Earth's years are."""
    import numpy as np

    energy = irradiance * hours
    total = energy.sum()
    if not total > 0:
        raise MatcherError(f"{where}: the irradiance is 0 in all rows; fetch the file again")
    # Half an interval of twilight is no fault: the sun may rise after the middle of the interval.
    night = energy[zenith > 92 + 7.5 * raw.interval_hours].sum() / total
    if night > 0.01:
        raise MatcherError(
            f"{where}: {night:.0%} of the irradiance falls while the sun is down at {raw.latitude:g}, "
            f"{raw.longitude:g}; the place or time zone in the head is wrong, or the rows are shuffled"
        )
    if raw.plane and raw.plane[0] > 0:
        return
    sky = _SOLAR_CONSTANT * np.maximum(np.cos(np.radians(zenith)), 0)
    clearness = total / (sky @ hours)
    if not 0.2 < clearness < 0.9:
        raise MatcherError(
            f"{where}: the year has {total / 1000:,.0f} kWh/m2 on the horizontal, {clearness:.0%} of what "
            "reaches the top of the atmosphere (20 to 90 % is possible); check the unit, it must be W/m2"
        )
