"""The year of one module on one plane: irradiance, cell temperature, power, voltage; condensed to classes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

from matcher.errors import MatcherError

if TYPE_CHECKING:
    import numpy as np

    from matcher.singlediode import SixParameters
    from matcher.weather import Weather

ALBEDO = 0.2
FAIMAN_U0 = 25.0  # [W/m2/K]
FAIMAN_U1 = 6.84  # [W/m2/K per m/s]

#: Numbers per working array; small enough for the processor's cache.
_CHUNK = 16_384


@dataclass(frozen=True, slots=True)
class PlaneYear:
    """Sunlit intervals of one year on one plane, arrays of one length.

    irradiance [W/m2] on the plane, cell_c [degC], hours [h] that each entry stands for, rows: the entries of
    the weather they come from.
    """

    irradiance: np.ndarray
    cell_c: np.ndarray
    hours: np.ndarray
    rows: np.ndarray

    @property
    def irradiation_kwh_m2(self) -> float:
        """Yearly irradiation on the plane [kWh/m2]."""
        return float(self.irradiance @ self.hours) / 1000


@dataclass(frozen=True, slots=True)
class ModuleYear:
    """One year of one module, hour by hour or in classes, arrays of one length.

    power_w [W] and vmp_v [V] of the module at its maximum power point, power after DC losses; hours [h] that
    each entry stands for. ``shows_clipping`` is False for a stand-in that has no hours of high power.
    """

    power_w: np.ndarray
    vmp_v: np.ndarray
    hours: np.ndarray
    shows_clipping: bool = True

    @property
    def energy_kwh(self) -> float:
        """Yearly energy of the module after DC losses [kWh]."""
        return float(self.power_w @ self.hours) / 1000


def plane_year(weather: Weather, tilt: float, azimuth: float) -> PlaneYear:
    """Irradiance on a plane and cell temperature over the year.

    Transposition by Hay and Davies with albedo 0.2, cell temperature by Faiman with u0 = 25 and u1 = 6.84
    and the wind of the weather, both by pvlib. No reflection, soiling, snow or spectral loss. A file that
    holds irradiance on a plane instead is taken as it is, where the plane is the one asked for.

    Parameters
    ----------
    weather
        The year.
    tilt, azimuth
        Of the plane [deg]: from the horizontal, and clockwise from north.

    Returns
    -------
    PlaneYear
        The intervals with irradiance above 0.

    Raises
    ------
    MatcherError
        When the file holds irradiance on another plane.

    References
    ----------
    Hay and Davies 1980; Faiman 2008, doi:10.1002/pip.813
    """
    import numpy as np
    from pvlib.temperature import faiman

    if weather.plane is not None:
        given = weather.plane
        turned = abs((given.azimuth - azimuth + 180) % 360 - 180)
        if abs(given.tilt - tilt) > 0.5 or (turned > 0.5 and given.tilt > 0.5):
            raise MatcherError(
                f"the {weather.kind} file of {weather.name} holds irradiance on a plane of tilt "
                f"{given.tilt:g}, azimuth {given.azimuth:g} deg only; ask for that plane, or fetch the file "
                "with slope 0 and its components"
            )
        total, rows = given.global_, np.arange(given.global_.size)
    else:
        from pvlib.irradiance import get_extra_radiation, get_total_irradiance

        rows = np.flatnonzero((weather.ghi > 0) | (weather.dhi > 0) | (weather.dni > 0))
        zenith, sun_azimuth = (angle[rows] for angle in weather.sun)
        total = get_total_irradiance(
            tilt, azimuth, zenith, sun_azimuth,
            dni=weather.dni[rows], ghi=weather.ghi[rows], dhi=weather.dhi[rows],
            dni_extra=get_extra_radiation(weather.times[rows].day_of_year.to_numpy()),
            albedo=ALBEDO, model="haydavies",
        )["poa_global"]  # fmt: skip
        total = np.asarray(total)
    lit = total > 0  # drops NaN too
    rows, total = rows[lit], total[lit]
    cell_c = faiman(total, weather.temp_air[rows], weather.wind_speed[rows], u0=FAIMAN_U0, u1=FAIMAN_U1)
    return PlaneYear(total, np.asarray(cell_c), weather.hours[rows], rows)


def module_year(params: SixParameters, plane: PlaneYear, dc_loss_pct: float = 2.0) -> ModuleYear:
    """Power and voltage of one module over the year.

    Parameters
    ----------
    params
        Of one module, or of several as columns (see `module_years`).
    plane
        Irradiance and cell temperature.
    dc_loss_pct
        DC losses, on power [%]; the voltage stays that of the module.

    Returns
    -------
    ModuleYear
        Entry by entry as in ``plane``. An entry without a finite maximum power point counts as no power.
    """
    import numpy as np

    from matcher.singlediode import max_power_point

    vmp, imp = max_power_point(params, plane.irradiance, plane.cell_c)
    usable = np.isfinite(vmp) & np.isfinite(imp) & (vmp > 0) & (imp > 0)
    power = np.where(usable, vmp * imp, 0.0) * (1 - dc_loss_pct / 100)
    return ModuleYear(power, np.where(usable, vmp, 0.0), plane.hours)


def condense_plane(plane: PlaneYear, bound_pct: float = 0.004) -> PlaneYear:
    """The year of a plane in classes of like irradiance and cell temperature, for many modules at once.

    The classes are those of a module that loses 0.4 % of its power and 0.35 % of its voltage per kelvin, with
    the bound on what a power or a current limit takes of it (see `matcher.condensation`); they serve other
    modules nearly as well. Each class carries the sum of its hours and its mean irradiance and temperature.

    Returns
    -------
    PlaneYear
        By falling irradiance; ``rows`` is empty.
    """
    import numpy as np

    from matcher.condensation import class_labels

    g, t, hours = plane.irradiance, plane.cell_c, plane.hours
    voltage = (1 - 0.0035 * (t - 25)) * (1 + 0.03 * np.log(np.maximum(g, 1.0) / 1000))
    label = class_labels(g * (1 - 0.004 * (t - 25)), voltage, hours, bound_pct, current_limits=True)
    total = np.bincount(label, hours)
    mean_g = np.bincount(label, hours * g) / total
    # Weighed by irradiance, since power is close to g (1 + gamma (t - 25)).
    mean_t = np.bincount(label, hours * g * t) / np.bincount(label, hours * g)
    order = np.argsort(-mean_g, kind="stable")
    return PlaneYear(mean_g[order], mean_t[order], total[order], np.empty(0, dtype=int))


def facing_years(params: SixParameters, planes: Sequence[PlaneYear], dc_loss_pct: float = 2.0) -> ModuleYear:
    """One year of one module on several planes of the same weather, interval by interval.

    Returns
    -------
    ModuleYear
        ``power_w`` and ``vmp_v`` of shape (planes, n), ``hours`` of shape (n,): every interval in which one
        of the planes has light.
    """
    import numpy as np

    rows = np.unique(np.concatenate([plane.rows for plane in planes]))
    power, vmp, hours = np.zeros((len(planes), rows.size)), np.zeros((len(planes), rows.size)), np.zeros(rows.size)
    for k, plane in enumerate(planes):
        year = module_year(params, plane, dc_loss_pct)
        at = np.searchsorted(rows, plane.rows)
        power[k, at], vmp[k, at], hours[at] = year.power_w, year.vmp_v, year.hours
    return ModuleYear(power, vmp, hours)


def module_years(params: SixParameters, plane: PlaneYear, dc_loss_pct: float = 2.0) -> ModuleYear:
    """Years of many modules on one plane, best on a condensed one (`condense_plane`).

    Parameters
    ----------
    params
        Arrays of shape (modules,), as from `matcher.singlediode.stacked`.
    plane
        Irradiance and cell temperature, n entries.
    dc_loss_pct
        DC losses, on power [%].

    Returns
    -------
    ModuleYear
        ``power_w`` and ``vmp_v`` of shape (modules, n), ``hours`` of shape (n,).
    """
    import numpy as np

    from matcher.singlediode import SixParameters, at_conditions

    shape = (len(params.a_ref), plane.hours.size)
    power, vmp = np.empty(shape), np.empty(shape)
    step = max(1, _CHUNK // max(1, plane.hours.size))
    for first in range(0, shape[0], step):
        few = slice(first, first + step)
        part = SixParameters(*(getattr(params, f.name)[few] for f in fields(params)))
        year = module_year(at_conditions(part), plane, dc_loss_pct)
        power[few], vmp[few] = year.power_w, year.vmp_v
    return ModuleYear(power, vmp, plane.hours)


def condense(year: ModuleYear, bound_pct: float = 0.004, *, current_limits: bool = True) -> ModuleYear:
    """The same year in a few hundred classes of like power and like current.

    Each class carries the sums of its entries' hours and energy and their mean voltage. The year's energy
    is exact; what one limit takes of it errs by at most the bound (see `matcher.condensation`).

    Parameters
    ----------
    year
        Entry by entry.
    bound_pct
        Largest error of the energy that one limit takes, in percent of the year's energy.
    current_limits
        Whether trackers may limit the current. Where no inverter that is looked at states a maximum
        current, ``False`` needs less than half the classes for the same bound.

    Returns
    -------
    ModuleYear
        By falling power; intervals without power are left out.
    """
    import numpy as np

    from matcher.condensation import class_labels

    lit = year.power_w > 0
    power, vmp, hours = year.power_w[lit], year.vmp_v[lit], year.hours[lit]
    if not power.size:
        return ModuleYear(power, vmp, hours)
    label = class_labels(power, vmp, hours, bound_pct, current_limits)
    total = np.bincount(label, hours)
    mean_power = np.bincount(label, hours * power) / total
    mean_vmp = np.bincount(label, hours * vmp) / total
    order = np.argsort(-mean_power, kind="stable")
    return ModuleYear(mean_power[order], mean_vmp[order], total[order])
