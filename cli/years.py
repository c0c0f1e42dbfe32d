"""The condensed year of a module at a site: from the catalog where it is kept, else worked out and kept."""

from __future__ import annotations

import hashlib
import io
import json
import os
from collections.abc import Mapping, Sequence
from dataclasses import astuple, dataclass, replace
from typing import TYPE_CHECKING

from catalog.errors import CatalogError

if TYPE_CHECKING:
    import numpy as np

    from catalog.records import Module, Site
    from catalog.store import Catalog
    from matcher.moduleyear import ModuleYear, PlaneYear
    from matcher.request import Request
    from matcher.weather import Weather

#: DC losses from the modules to the inverter [% of power] (common practice: 1 to 5 %, no source).
DC_LOSS_PCT = 2.0

NO_PLACE = "the site has no place: give --lat and --lon, or a --weather file"

#: Stands in where neither site nor weather file says how the array is tilted.
ASSUMED_TILT = 30.0

#: Goes into the key of a kept year; to be raised when the calculation changes.
_EDITION = 6

#: What a year made of place and design temperatures alone is called.
CLEAR_SKY = "clear-sky year"


@dataclass(frozen=True, slots=True)
class SiteYear:
    """The year of modules at a site, where it comes from, and what must be said about it.

    ``year`` has arrays (classes,) for one module or (modules, classes) for several; where it is ``None``,
    ``why_not`` says why. ``irradiation_kwh_m2`` is that of a year on the array.
    """

    year: ModuleYear | None
    weather: str | None = None
    notes: tuple[str, ...] = ()
    why_not: str | None = None
    irradiation_kwh_m2: float | None = None

    @property
    def clear_sky(self) -> bool:
        """Whether the year is one without clouds, so that energies and clipping are upper bounds."""
        return self.weather == CLEAR_SKY


@dataclass(frozen=True, slots=True)
class SitePlane:
    """The year of a site's array, where it comes from, and what must be said about it; or why there is none."""

    plane: PlaneYear | None
    weather: str | None = None
    notes: tuple[str, ...] = ()
    why_not: str | None = None


def site_year(
    catalog: Catalog, site: Site, module: Module, *, current_limits: bool = True, dc_loss_pct: float = DC_LOSS_PCT
) -> SiteYear:
    """Condensed year of one module at a site.

    Without ``current_limits`` the year serves inverters only of which no tracker states a maximum current,
    and is smaller.

    Raises
    ------
    CatalogError, MatcherError
        Where the weather file cannot be read.
    """
    if not has_weather(site):
        return SiteYear(None, why_not=NO_PLACE)
    import numpy as np

    from matcher.electrical import diode_parameters

    diode = diode_parameters(module)
    if diode is None:
        return SiteYear(None, why_not=f"the coefficients of {module.name} do not allow a model of its power")
    key = _key("year", site, dc_loss_pct, current_limits, [float(v) for v in astuple(diode)])
    kept = catalog.kept(key)
    if kept is not None:
        arrays, weather, notes = _unpacked(kept)
    else:
        from matcher.moduleyear import condense, module_year

        plane, weather, notes = site_plane(site)
        year = condense(module_year(diode, plane, dc_loss_pct), current_limits=current_limits)
        arrays = {"power_w": year.power_w, "vmp_v": year.vmp_v, "hours": year.hours}
        arrays["irradiation_kwh_m2"] = np.array(plane.irradiation_kwh_m2)
        catalog.keep(key, _packed(arrays, weather, notes))
    from matcher.moduleyear import ModuleYear

    irradiation = float(arrays.pop("irradiation_kwh_m2"))
    return SiteYear(ModuleYear(**arrays), weather, notes, irradiation_kwh_m2=irradiation)


def facing_year(
    site: Site, module: Module, faces: Sequence[tuple[float, float]], dc_loss_pct: float = DC_LOSS_PCT
) -> SiteYear:
    """Year of one module on several planes, given by azimuth and tilt [deg], interval by interval.

    The sun comes to the parts of an array at different times, so their year is not condensed. Raises as
    `site_year` does.
    """
    if not has_weather(site):
        return SiteYear(None, why_not=NO_PLACE)
    from matcher.electrical import diode_parameters
    from matcher.moduleyear import facing_years, plane_year

    diode = diode_parameters(module)
    if diode is None:
        return SiteYear(None, why_not=f"the coefficients of {module.name} do not allow a model of its power")
    weather = weather_of(site)
    planes = [plane_year(weather, tilt, azimuth) for azimuth, tilt in faces]
    _, label, notes = site_plane(replace(site, azimuth=faces[0][0], tilt=faces[0][1]), weather)
    more = tuple(
        f"Another part of the array faces {azimuth:g} deg at {tilt:g} deg tilt:"
        f" {plane.irradiation_kwh_m2:,.0f} kWh/m2 a year."
        for (azimuth, tilt), plane in zip(faces[1:], planes[1:], strict=True)
    )
    return SiteYear(facing_years(diode, planes, dc_loss_pct), label, notes[:1] + more + notes[1:])


def site_years(
    catalog: Catalog, site: Site, modules: Sequence[Module], dc_loss_pct: float = DC_LOSS_PCT
) -> SiteYear:
    """Years of several modules at a site, on classes of irradiance and cell temperature that all share.

    A module whose record does not allow a model of its power has NaN. Raises as `site_year` does.
    """
    if not has_weather(site):
        return SiteYear(None, why_not=NO_PLACE)
    from matcher.sweep import years_of

    found = condensed_plane(catalog, site)
    assert found.plane is not None
    year = years_of(modules, found.plane, dc_loss_pct)
    return SiteYear(year, found.weather, found.notes, irradiation_kwh_m2=found.plane.irradiation_kwh_m2)


def condensed_plane(catalog: Catalog, site: Site) -> SitePlane:
    """Condensed year of a site's array, whatever the modules; raises as `site_year` does."""
    if not has_weather(site):
        return SitePlane(None, why_not=NO_PLACE)
    import numpy as np

    from matcher.moduleyear import PlaneYear, condense_plane

    key = _key("plane", site)
    kept = catalog.kept(key)
    if kept is not None:
        arrays, weather, notes = _unpacked(kept)
    else:
        whole, weather, notes = site_plane(site)
        condensed = condense_plane(whole)
        arrays = {"irradiance": condensed.irradiance, "cell_c": condensed.cell_c, "hours": condensed.hours}
        catalog.keep(key, _packed(arrays, weather, notes))
    return SitePlane(PlaneYear(**arrays, rows=np.empty(0, dtype=int)), weather, notes)


def has_weather(site: Site) -> bool:
    """Whether a year can be had for the site."""
    return site.weather is not None or site.lat is not None


def site_plane(site: Site, weather: Weather | None = None) -> tuple[PlaneYear, str, tuple[str, ...]]:
    """The site's year on its array, what it is called, and what must be said about it."""
    from matcher.moduleyear import plane_year

    weather = weather or weather_of(site)
    tilt, azimuth, assumed = plane_of(site, weather)
    plane = plane_year(weather, tilt, azimuth)
    label = CLEAR_SKY if site.weather is None else f"{weather.kind} {os.path.basename(site.weather)}"
    place = f" ({weather.name})" if weather.name and site.weather is not None else ""
    notes = [
        f"Weather: {label}{place}, {len(weather.times):,} intervals of {weather.interval_hours:g} h,"
        f" {weather.lowest_c:.1f} to {weather.highest_c:.1f} degC in the air,"
        f" {plane.irradiation_kwh_m2:,.0f} kWh/m2 a year on the array (tilt {tilt:g}, azimuth {azimuth:g} deg"
        f"{', assumed' if assumed else ''})."
    ]
    notes += [f"{n[0].upper()}{n[1:].rstrip('.')}." for n in weather.notes]
    return plane, label, tuple(notes)


def cold_plane(request: Request) -> PlaneYear | None:
    """The hour by hour year that a rule set takes the cold voltage from; ``None`` where it does not.

    Raises
    ------
    CatalogError
        Where it does and the site has no weather file: a clear sky is no record of cold hours.
    """
    if request.rules.cold_voltage != "hourly":
        return None
    if request.site.weather is None:
        raise CatalogError(
            f"rule set {request.rules.name} takes the cold voltage from hourly weather: give the site a weather"
            " file (--weather)"
        )
    return site_plane(request.site)[0]


def weather_of(site: Site) -> Weather:
    """The weather of a site: its file, else a clear sky at its place."""
    from matcher.weather import clear_sky_weather, read_weather

    if site.weather is not None:
        return read_weather(site.weather)
    if site.lat is None or site.lon is None:
        raise CatalogError(f"site {site.name} has neither a weather file nor a place")
    return clear_sky_weather(site.lat, site.lon, site.design_low_c, site.design_high_c)


def plane_of(site: Site, weather: Weather) -> tuple[float, float, bool]:
    """Tilt and azimuth [deg] of a site's array, and whether one of them is assumed."""
    given = weather.plane
    towards_equator = 180.0 if weather.latitude >= 0 else 0.0
    tilt = site.tilt if site.tilt is not None else given.tilt if given else None
    azimuth = site.azimuth if site.azimuth is not None else given.azimuth if given else None
    assumed = tilt is None or azimuth is None
    return (
        ASSUMED_TILT if tilt is None else tilt,
        towards_equator if azimuth is None else azimuth,
        assumed,
    )


def _key(kind: str, site: Site, *more: object) -> str:
    """Key of what is kept: everything that it was made from."""
    made_from: list[object] = [_EDITION, site.tilt, site.azimuth, *more]
    if site.weather is not None:
        try:
            status = os.stat(site.weather)
        except OSError as error:
            raise CatalogError(f"weather file {site.weather}: {error.strerror}") from None
        made_from += [os.path.abspath(site.weather), status.st_size, status.st_mtime_ns]
    else:
        made_from += [site.lat, site.lon, site.design_low_c, site.design_high_c]
    return f"{kind}:" + hashlib.sha256(json.dumps(made_from).encode()).hexdigest()


def _packed(arrays: Mapping[str, np.ndarray], weather: str, notes: tuple[str, ...]) -> bytes:
    import numpy as np

    data = io.BytesIO()
    np.savez(data, text=np.array(json.dumps({"weather": weather, "notes": notes})), **arrays)
    return data.getvalue()


def _unpacked(data: bytes) -> tuple[dict[str, np.ndarray], str, tuple[str, ...]]:
    import numpy as np

    with np.load(io.BytesIO(data), allow_pickle=False) as file:
        text = json.loads(str(file["text"]))
        arrays = {name: file[name] for name in file.files if name != "text"}
    return arrays, text["weather"], tuple(text["notes"])
