"""The condensed year of a module at a site: from the catalog where it is kept, else worked out and kept."""

from __future__ import annotations

import hashlib
import io
import json
import os
from dataclasses import astuple, dataclass
from typing import TYPE_CHECKING

from catalog.errors import CatalogError

if TYPE_CHECKING:
    from catalog.records import Module, Site
    from catalog.store import Catalog
    from matcher.moduleyear import ModuleYear
    from matcher.singlediode import SixParameters
    from matcher.weather import Weather

#: Stands in where neither site nor weather file says how the array is tilted.
ASSUMED_TILT = 30.0

#: Goes into the key of a kept year; to be raised when the calculation changes.
_EDITION = 1


@dataclass(frozen=True, slots=True)
class SiteYear:
    """The year of a module, where it comes from, and what must be said about it; no year says why in ``why_not``."""

    year: ModuleYear | None
    weather: str | None = None
    notes: tuple[str, ...] = ()
    why_not: str | None = None


def site_year(catalog: Catalog, site: Site, module: Module, dc_loss_pct: float = 2.0) -> SiteYear:
    """Condensed year of one module at a site.

    Raises
    ------
    CatalogError, MatcherError
        Where the weather file cannot be read.
    """
    if site.weather is None and site.lat is None:
        return SiteYear(None, why_not="the site has no place: give --lat and --lon, or a --weather file")
    from matcher.electrical import diode_parameters

    diode = diode_parameters(module)
    if diode is None:
        return SiteYear(None, why_not=f"the coefficients of {module.name} do not allow a model of its power")
    key = _key(site, diode, dc_loss_pct)
    kept = catalog.kept(key)
    if kept is not None:
        return _unpacked(kept)
    found = _worked_out(site, diode, dc_loss_pct)
    catalog.keep(key, _packed(found))
    return found


def _worked_out(site: Site, diode: SixParameters, dc_loss_pct: float) -> SiteYear:
    from matcher.moduleyear import condense, module_year, plane_year

    weather = weather_of(site)
    tilt, azimuth, assumed = plane_of(site, weather)
    plane = plane_year(weather, tilt, azimuth)
    year = condense(module_year(diode, plane, dc_loss_pct))
    label = "clear-sky year" if site.weather is None else f"{weather.kind} {os.path.basename(site.weather)}"
    notes = [
        f"Weather: {label}, {weather.lowest_c:.1f} to {weather.highest_c:.1f} degC in the air,"
        f" {plane.irradiation_kwh_m2:,.0f} kWh/m2 a year on the array (tilt {tilt:g}, azimuth {azimuth:g} deg"
        f"{', assumed' if assumed else ''})."
    ]
    notes += [f"{n[0].upper()}{n[1:].rstrip('.')}." for n in weather.notes]
    return SiteYear(year, label, tuple(notes))


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


def _key(site: Site, diode: SixParameters, dc_loss_pct: float) -> str:
    made_from: list[object] = [_EDITION, site.tilt, site.azimuth, dc_loss_pct, [float(v) for v in astuple(diode)]]
    if site.weather is not None:
        try:
            status = os.stat(site.weather)
        except OSError as error:
            raise CatalogError(f"weather file {site.weather}: {error.strerror}") from None
        made_from += [os.path.abspath(site.weather), status.st_size, status.st_mtime_ns]
    else:
        made_from += [site.lat, site.lon, site.design_low_c, site.design_high_c]
    return "year:" + hashlib.sha256(json.dumps(made_from).encode()).hexdigest()


def _packed(found: SiteYear) -> bytes:
    import numpy as np

    assert found.year is not None
    text = json.dumps({"weather": found.weather, "notes": found.notes})
    data = io.BytesIO()
    np.savez(data, power_w=found.year.power_w, vmp_v=found.year.vmp_v, hours=found.year.hours, text=np.array(text))
    return data.getvalue()


def _unpacked(data: bytes) -> SiteYear:
    import numpy as np

    from matcher.moduleyear import ModuleYear

    with np.load(io.BytesIO(data), allow_pickle=False) as arrays:
        text = json.loads(str(arrays["text"]))
        year = ModuleYear(arrays["power_w"], arrays["vmp_v"], arrays["hours"])
    return SiteYear(year, text["weather"], tuple(text["notes"]))
