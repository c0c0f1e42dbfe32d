"""A year of weather at one place: what a file gave, or a clear sky.

`read_weather` recognises a file by its content and leaves the reading to ``pvlib.iotools`` (see
`matcher.weatherfiles`, which also says what each format's time labels mean). Every entry of a `Weather`
stands for one interval, and its time is the middle of that interval, where the sun is taken.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

from matcher.errors import MatcherError

if TYPE_CHECKING:
    import numpy as np
    import pandas as pd

HOURS_OF_YEAR = 8760.0


@dataclass(frozen=True)
class PlaneIrradiance:
    """Irradiance that a file gives on one tilted plane, instead of the horizontal components."""

    tilt: float  # [deg]
    azimuth: float  # [deg], clockwise from north
    global_: np.ndarray  # [W/m2]


@dataclass(frozen=True)
class Weather:
    """One year of weather.

    Attributes
    ----------
    kind
        What it is: the format of the file, or "clear sky".
    name
        Place, as the file names it.
    latitude, longitude, altitude
        [deg], [deg], [m].
    times
        Middle of each interval, with time zone.
    hours
        Hours of the year that each entry stands for; they add up to 8,760 also where a file holds several
        years, a leap day or gaps [h].
    interval_hours
        Length of the file's interval [h].
    ghi, dni, dhi
        Global horizontal, direct normal, diffuse horizontal irradiance [W/m2]; ``None`` where the file
        gives irradiance on a tilted plane only (`plane`).
    temp_air, wind_speed
        [degC], [m/s].
    plane
        Irradiance on a tilted plane, where the file holds that instead.
    notes
        What a reader of the figures should know: gaps, assumptions, conventions.
    """

    kind: str
    name: str
    latitude: float
    longitude: float
    altitude: float
    times: pd.DatetimeIndex
    hours: np.ndarray
    interval_hours: float
    ghi: np.ndarray | None
    dni: np.ndarray | None
    dhi: np.ndarray | None
    temp_air: np.ndarray
    wind_speed: np.ndarray
    plane: PlaneIrradiance | None = None
    notes: tuple[str, ...] = ()

    @property
    def lowest_c(self) -> float:
        """Lowest air temperature [degC]. That of a typical year is not an extreme one."""
        return float(self.temp_air.min())

    @property
    def highest_c(self) -> float:
        """Highest air temperature [degC]."""
        return float(self.temp_air.max())

    @property
    def horizontal_kwh_m2(self) -> float | None:
        """Yearly global horizontal irradiation [kWh/m2]; ``None`` for a file of a tilted plane."""
        return None if self.ghi is None else float(self.ghi @ self.hours) / 1000

    @cached_property
    def sun(self) -> tuple[np.ndarray, np.ndarray]:
        """Apparent zenith and azimuth of the sun at `times` [deg]; computed once per weather."""
        from pvlib.solarposition import get_solarposition

        found = get_solarposition(self.times, self.latitude, self.longitude, altitude=self.altitude)
        return found["apparent_zenith"].to_numpy(), found["azimuth"].to_numpy()


def read_weather(path: str | Path) -> Weather:
    """Read a weather file: EPW, TMY3, TMY2, PVGIS hourly or PVGIS TMY (CSV and JSON), known by its content.

    Parameters
    ----------
    path
        The file. Nothing is fetched from a network.

    Returns
    -------
    Weather

    Raises
    ------
    MatcherError
        One line that names the file, what is wrong and how to mend it: no such file, none of the formats,
        cut or out of order, gaps too large, units that are not W/m2 and degC, place or time zone that does
        not agree with the sun.
    """
    from matcher.weatherfiles import raw_year
    from matcher.weatheryear import year_of

    path = Path(path)
    try:
        content = path.read_bytes()
    except OSError as error:
        raise MatcherError(
            f"{path}: cannot be read ({error.strerror or error}); give the path of a weather file"
        ) from None
    return year_of(raw_year(content, str(path)), str(path))


def clear_sky_weather(lat: float, lon: float, design_low_c: float, design_high_c: float) -> Weather:
    """A year without clouds, to bound clipping from above where there is no weather file.

    Irradiance: the model of Ineichen by ``pvlib.location.Location.get_clearsky`` with the monthly Linke
    turbidity and the altitude that pvlib carries. Times: the middle of each hour (UTC) of a year of 365 days.
    Air temperature: (low + high) / 2 plus a cosine over the year and a cosine over the day, each of
    amplitude (high - low) / 4, so that the extremes of the curve are the two design temperatures; warmest
    on 21 July in the northern hemisphere and half a year later in the southern, at 15:00 local mean solar
    time. Wind: 1 m/s, pvlib's default for the Faiman model. Temperature and wind are assumptions, no data.

    Parameters
    ----------
    lat, lon
        [deg], north and east positive.
    design_low_c, design_high_c
        Design temperatures of the site [degC].

    Returns
    -------
    Weather

    Raises
    ------
    MatcherError
        For a place that is not on Earth or a low above the high.

    References
    ----------
    Ineichen and Perez 2002, doi:10.1016/S0038-092X(02)00045-2
    """
    if not (-90 <= lat <= 90 and -180 <= lon <= 180):
        raise MatcherError(
            f"latitude {lat:g}, longitude {lon:g}: give -90..90 (north positive), -180..180 (east positive)"
        )
    if not design_low_c <= design_high_c:
        raise MatcherError(
            f"design low {design_low_c:g} degC lies above design high {design_high_c:g} degC; swap the two"
        )
    import numpy as np
    import pandas as pd
    from pvlib.location import Location

    times = pd.date_range("2021-01-01 00:30", periods=8760, freq="h", tz="UTC")
    place = Location(lat, lon, tz="UTC")  # with pvlib's altitude of the place
    position = place.get_solarposition(times)
    sky = place.get_clearsky(times, model="ineichen", solar_position=position)
    year = np.arange(8760) / 24 + 0.5 / 24  # [d] since 1 January 00:00 UTC
    warmest = 201.5 if lat >= 0 else 201.5 - 182.5  # noon of 21 July, the 202nd day
    solar_hour = (year % 1) * 24 + lon / 15
    quarter = (design_high_c - design_low_c) / 4
    temp_air = (design_low_c + design_high_c) / 2 + quarter * (
        np.cos(2 * np.pi * (year - warmest) / 365) + np.cos(2 * np.pi * (solar_hour - 15) / 24)
    )
    weather = Weather(
        kind="clear sky",
        name=f"{lat:g}, {lon:g}",
        latitude=lat,
        longitude=lon,
        altitude=float(place.altitude),
        times=times,
        hours=np.ones(8760),
        interval_hours=1.0,
        ghi=sky["ghi"].to_numpy(),
        dni=sky["dni"].to_numpy(),
        dhi=sky["dhi"].to_numpy(),
        temp_air=temp_air,
        wind_speed=np.ones(8760),
        notes=("clear sky all year: an upper bound of energy and of clipping, not a forecast",),
    )
    # The sun is known already; `sun` is a cached property.
    weather.__dict__["sun"] = (position["apparent_zenith"].to_numpy(), position["azimuth"].to_numpy())
    return weather
