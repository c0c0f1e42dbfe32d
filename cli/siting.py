"""The site of a question: one that is kept by name, or the single values."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from catalog.records import Site
from cli.ranges import degrees

if TYPE_CHECKING:
    from catalog.store import Catalog

PANEL = "Site"


def _low(text: str) -> float:
    return degrees(text, "--low")


def _high(text: str) -> float:
    return degrees(text, "--high")



SiteOption = Annotated[str | None, typer.Option("--site", metavar="NAME", help="A site that is kept (see 'ferrule site list').", rich_help_panel=PANEL)]  # noqa: E501
LowOption = Annotated[float | None, typer.Option("--low", parser=_low, metavar="DEGC", help="Design low ambient temperature [degC].", rich_help_panel=PANEL)]  # noqa: E501
HighOption = Annotated[float | None, typer.Option("--high", parser=_high, metavar="DEGC", help="Design high ambient temperature [degC].", rich_help_panel=PANEL)]  # noqa: E501
MountingOption = Annotated[str | None, typer.Option("--mounting", metavar="HOW", help="open-rack, gap-roof, near-roof or integrated.", rich_help_panel=PANEL)]  # noqa: E501
CapOption = Annotated[float | None, typer.Option("--voltage-cap", metavar="V", help="Cap on the DC voltage of the site [V].", rich_help_panel=PANEL)]  # noqa: E501
RearOption = Annotated[float | None, typer.Option("--rear-share", metavar="SHARE", help="Rear irradiance of bifacial modules as a share of the front.", rich_help_panel=PANEL)]  # noqa: E501
LatOption = Annotated[float | None, typer.Option("--lat", metavar="DEG", help="Latitude [deg], north positive.", rich_help_panel=PANEL)]  # noqa: E501
LonOption = Annotated[float | None, typer.Option("--lon", metavar="DEG", help="Longitude [deg], east positive.", rich_help_panel=PANEL)]  # noqa: E501
TiltOption = Annotated[float | None, typer.Option("--tilt", metavar="DEG", help="Tilt from the horizontal [deg].", rich_help_panel=PANEL)]  # noqa: E501
AzimuthOption = Annotated[float | None, typer.Option("--azimuth", metavar="DEG", help="Azimuth [deg], clockwise from north: 180 faces south.", rich_help_panel=PANEL)]  # noqa: E501
WeatherOption = Annotated[str | None, typer.Option("--weather", metavar="FILE", help="Weather file: EPW, TMY3, TMY2, PVGIS (CSV or JSON).", rich_help_panel=PANEL)]  # noqa: E501


def site_of(
    catalog: Catalog,
    site: str | None,
    *,
    low: float | None,
    high: float | None,
    mounting: str | None = None,
    voltage_cap: float | None = None,
    rear_share: float | None = None,
    lat: float | None = None,
    lon: float | None = None,
    tilt: float | None = None,
    azimuth: float | None = None,
    weather: str | None = None,
) -> Site:
    """The site that is meant: the kept one, single values taking the place of its own.

    Raises
    ------
    CatalogError
        Where design temperatures are missing or values are impossible.
    """
    from catalog.sites import checked

    given = {
        "design_low_c": low, "design_high_c": high, "mounting": mounting, "voltage_cap_v": voltage_cap,
        "rear_share": rear_share, "lat": lat, "lon": lon, "tilt": tilt, "azimuth": azimuth, "weather": weather,
    }  # fmt: skip
    given = {name: value for name, value in given.items() if value is not None}
    if site is not None:
        return checked(replace(catalog.site(site), **given))
    if low is None or high is None:
        raise CatalogError(
            "name a site (--site NAME), or give the design temperatures of the place: --low and --high in degC,"
            " the lowest and highest air temperature to design for"
        )
    return checked(Site(name="as given", **given))
