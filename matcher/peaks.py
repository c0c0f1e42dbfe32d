"""How much more may be clipped than means over an hour show.

The mean of an hour says nothing of its minutes, and clipping falls on the bright ones. Whatever the minutes were,
no more can be clipped than if the hour had been part full sun and part dark: a limit takes a convex function of the
power, which is largest where the power is at its extremes (Jensen's inequality). Full sun is the clear sky of
Ineichen and Perez 2002 (doi:10.1016/S0038-092X(02)00045-2) by pvlib. Left out are the edges of clouds, which for
seconds to minutes make it brighter than a clear sky does.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from matcher.clipping import block_losses
from matcher.columns import column
from matcher.moduleyear import PlaneYear, plane_year

if TYPE_CHECKING:
    import numpy as np

    from matcher.fit import Fit, Option
    from matcher.moduleyear import ModuleYear
    from matcher.weather import Weather


def sun_or_cloud(weather: Weather, tilt: float, azimuth: float) -> PlaneYear:
    """A year on a plane with each interval parted into full sun and dark, its irradiation kept.

    Parameters
    ----------
    weather
        The year.
    tilt, azimuth
        Of the plane [deg].

    Returns
    -------
    PlaneYear
        The bright parts: at the brightest of a clear sky at the begin, the middle and the end of the interval,
        or at the interval's own mean where that is more; hours shortened accordingly.
    """
    import numpy as np
    import pandas as pd
    from pvlib.location import Location

    plane = plane_year(weather, tilt, azimuth)
    place = Location(weather.latitude, weather.longitude, altitude=weather.altitude)
    brightest = plane.irradiance.copy()
    for shift in (-0.5, 0.0, 0.5):
        times = weather.times + pd.Timedelta(hours=shift * weather.interval_hours)
        sun = place.get_solarposition(times)
        sky = place.get_clearsky(times, model="ineichen", solar_position=sun)
        clear = replace(weather, times=times, plane=None, **{name: sky[name].to_numpy() for name in ("ghi", "dni", "dhi")})
        clear.__dict__["sun"] = (sun["apparent_zenith"].to_numpy(), sun["azimuth"].to_numpy())
        found = plane_year(clear, tilt, azimuth)
        whole = np.zeros(len(times))
        whole[found.rows] = found.irradiance
        brightest = np.maximum(brightest, whole[plane.rows])
    share = plane.irradiance / brightest
    warmer = cell_c(brightest, weather, plane.rows)
    return PlaneYear(brightest, warmer, plane.hours * share, plane.rows)


def cell_c(irradiance: np.ndarray, weather: Weather, rows: np.ndarray) -> np.ndarray:
    """Cell temperature [degC] at an irradiance [W/m2] in some entries of the weather, as in `plane_year`."""
    from pvlib.temperature import faiman

    from matcher.moduleyear import FAIMAN_U0, FAIMAN_U1

    return faiman(irradiance, weather.temp_air[rows], weather.wind_speed[rows], u0=FAIMAN_U0, u1=FAIMAN_U1)


def clipping_pct(fit: Fit, option: Option, year: ModuleYear) -> float | None:
    """Clipping loss [%] of an option over a year of its module; ``None`` where it cannot be known."""
    import numpy as np

    inverter, lost, whole = fit.inverters[option.inverter], 0.0, 0.0
    amps = column(inverter.inputs, "max_current_a")
    for unit in option.wired:
        block = np.array([[[t.strings, t.in_series] for t in unit.trackers]])
        of = [t.inputs for t in unit.trackers]
        losses = block_losses(year, fit.search.inverters, option.inverter, amps[of], block)
        share = float(losses.total_pct[0]) / 100.0
        energy = unit.copies * float(losses.yearly_kwh[0]) / (1.0 - share)
        lost, whole = lost + share * energy, whole + energy
    return 100.0 * lost / whole if whole > 0 else None
