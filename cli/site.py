"""``ferrule site``: places by name, with their design temperatures, mounting and weather."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, Annotated, Any

import typer

from catalog.errors import CatalogError
from cli.groups import Commands
from cli.opening import CatalogOption, open_catalog
from cli.site_weather import missing_temperatures, pair, say_weather, weather_facts
from cli.siting import (
    AzimuthOption,
    CapOption,
    HighOption,
    LatOption,
    LonOption,
    LowOption,
    MountingOption,
    RearOption,
    TiltOption,
    WeatherOption,
)

if TYPE_CHECKING:
    from catalog.records import Site

LIST_SCHEMA = "ferrule.sites/1"
SCHEMA = "ferrule.site/1"

app = Commands(help="Sites that are kept by name: add, list, show, drop.")

NameArgument = Annotated[str, typer.Argument(metavar="NAME", help="Name of the site.", show_default=False)]
JsonOption = Annotated[bool, typer.Option("--json", help="Print the result as a document.")]


@app.command()
def add(
    name: NameArgument,
    low: LowOption = None,
    high: HighOption = None,
    mounting: MountingOption = None,
    voltage_cap: CapOption = None,
    rear_share: RearOption = None,
    lat: LatOption = None,
    lon: LonOption = None,
    tilt: TiltOption = None,
    azimuth: AzimuthOption = None,
    weather: WeatherOption = None,
    replace: Annotated[
        bool, typer.Option("--replace", help="Take the place of a site of that name.")
    ] = False,
    as_json: JsonOption = False,
    catalog: CatalogOption = None,
) -> None:
    """Keep a site, so that --site NAME says all of it.

    The design temperatures are the lowest and highest air temperature to design for. A weather file is read
    at once and what it holds is reported; it is not copied, so it should stay where it is.

    Example: ferrule site add Wharf --low -12 --high 36 --lat 52.1 --lon 4.3
    """
    from catalog.records import Site
    from catalog.sites import checked

    if low is None or high is None:
        raise CatalogError(missing_temperatures(low, high, weather))
    given = {
        "voltage_cap_v": voltage_cap,
        "rear_share": rear_share,
        "lat": lat,
        "lon": lon,
        "tilt": tilt,
        "azimuth": azimuth,
        "weather": None if weather is None else os.path.abspath(os.path.expanduser(weather)),
    }
    if mounting is not None:
        given["mounting"] = mounting
    site = checked(Site(name=" ".join(name.split()), design_low_c=low, design_high_c=high, **given))
    facts = weather_facts(site)
    with open_catalog(catalog, create=True) as opened:
        _refuse_taken(opened.sites(), site, replace)
        opened.add_site(site, replace=replace)
    if as_json:
        _print_document(site, facts)
    else:
        from cli.console import say

        say(f"Kept: {site.name}, {site.design_low_c:g} to {site.design_high_c:g} degC, {site.mounting}.")
        say_weather(site, facts)


@app.command("list")
def list_(as_json: JsonOption = False, catalog: CatalogOption = None) -> None:
    """List the sites that are kept.

    Example: ferrule site list
    """
    with open_catalog(catalog) as opened:
        sites = opened.sites()
    from cli.console import Column, number, print_json, print_table, say

    if as_json:
        print_json({"schema": LIST_SCHEMA, "sites": [_values(site) for site in sites]})
        return
    if not sites:
        say("No site is kept: 'ferrule site add NAME --low DEGC --high DEGC' keeps one.")
        return
    columns = [
        Column("site", fold=True),
        Column("low degC", number=True),
        Column("high degC", number=True),
        Column("mounting"),
        Column("cap V", number=True),
        Column("place"),
        Column("tilt/azimuth"),
        Column("weather", fold=True),
    ]
    print_table(
        columns,
        [
            [
                site.name,
                f"{site.design_low_c:g}",
                f"{site.design_high_c:g}",
                site.mounting,
                number(site.voltage_cap_v),
                pair(site.lat, site.lon, ", "),
                pair(site.tilt, site.azimuth, "/"),
                os.path.basename(site.weather or ""),
            ]
            for site in sites
        ],
    )


@app.command()
def show(name: NameArgument, as_json: JsonOption = False, catalog: CatalogOption = None) -> None:
    """Show one site, and what its weather file holds.

    Example: ferrule site show "Butterfield Barn"
    """
    with open_catalog(catalog) as opened:
        site = opened.site(name)
    facts = weather_facts(site)
    if as_json:
        _print_document(site, facts)
        return
    from catalog.records import specs
    from cli.console import Column, print_table, say
    from cli.sheet_show import NOT_STATED, value_text

    say(site.name)
    rows = [["mounting", site.mounting, "", "how the array is mounted"]]
    for field, spec in specs(type(site)).items():
        if field != "name":
            text = value_text(getattr(site, field))
            rows.append([field, text or NOT_STATED, "" if spec.unit == "1" else spec.unit, spec.meaning])
    print_table(
        [Column("field"), Column("value", fold=True), Column("unit"), Column("meaning", fold=True)], rows
    )
    say_weather(site, facts)


@app.command()
def drop(name: NameArgument, as_json: JsonOption = False, catalog: CatalogOption = None) -> None:
    """Forget a site; its weather file stays.

    Example: ferrule site drop Wharf
    """
    with open_catalog(catalog) as opened:
        site = opened.site(name)
        opened.drop_site(site.name)
    if as_json:
        from cli.console import print_json

        print_json({"schema": SCHEMA, "dropped": site.name})
    else:
        from cli.console import say

        say(f"Dropped: {site.name}.")


def _refuse_taken(sites: list[Site], site: Site, replace: bool) -> None:
    taken = next((s for s in sites if s.name.casefold() == site.name.casefold()), None)
    if taken is not None and not replace:
        raise CatalogError(
            f"a site is called {taken.name!r} already: --replace puts the new one in its place"
        )


def _values(site: Site) -> dict[str, Any]:
    from dataclasses import asdict

    return asdict(site)


def _print_document(site: Site, facts: dict[str, Any] | None) -> None:
    from cli.console import print_json

    print_json({"schema": SCHEMA, "site": _values(site), "weather": facts})
