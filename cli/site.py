"""``ferrule site``: places by name, with their design temperatures, mounting and weather."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, Annotated, Any

import typer

from catalog.errors import CatalogError
from cli.opening import CatalogOption, open_catalog
from cli.siting import (
    AzimuthOption, CapOption, HighOption, LatOption, LonOption, LowOption, MountingOption, RearOption,
    TiltOption, WeatherOption,
)  # fmt: skip

if TYPE_CHECKING:
    from catalog.records import Site

LIST_SCHEMA = "ferrule.sites/1"
SCHEMA = "ferrule.site/1"

app = typer.Typer(no_args_is_help=True, help="Sites that are kept by name: add, list, show, drop.")

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
    replace: Annotated[bool, typer.Option("--replace", help="Take the place of a site of that name.")] = False,
    as_json: JsonOption = False,
    catalog: CatalogOption = None,
) -> None:
    """Keep a site, so that --site NAME says all of it.

    The design temperatures are the lowest and highest air temperature to design for. A weather file is read at
    once and what it holds is reported; it is not copied, so it should stay where it is.

    Example: ferrule site add "Low Wharf" --low -12 --high 36 --mounting near-roof --lat 52.1 --lon 4.3
    """
    from catalog.records import Site
    from catalog.sites import checked

    if low is None or high is None:
        raise CatalogError(_missing_temperatures(low, high, weather))
    given = {
        "voltage_cap_v": voltage_cap, "rear_share": rear_share, "lat": lat, "lon": lon, "tilt": tilt, "azimuth": azimuth,
        "weather": None if weather is None else os.path.abspath(os.path.expanduser(weather)),
    }  # fmt: skip
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
        _say_weather(site, facts)


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
    columns = [Column("site", fold=True), Column("low degC", number=True), Column("high degC", number=True), Column("mounting"),
               Column("cap V", number=True), Column("place"), Column("tilt/azimuth"), Column("weather", fold=True)]  # fmt: skip
    print_table(columns, [
        [s.name, f"{s.design_low_c:g}", f"{s.design_high_c:g}", s.mounting, number(s.voltage_cap_v), _pair(s.lat, s.lon, ", "),
         _pair(s.tilt, s.azimuth, "/"), os.path.basename(s.weather or "")]
        for s in sites
    ])  # fmt: skip


@app.command()
def show(name: NameArgument, as_json: JsonOption = False, catalog: CatalogOption = None) -> None:
    """Show one site, and what its weather file holds.

    Example: ferrule site show "Low Wharf"
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
    print_table([Column("field"), Column("value", fold=True), Column("unit"), Column("meaning", fold=True)], rows)
    _say_weather(site, facts)


@app.command()
def drop(name: NameArgument, as_json: JsonOption = False, catalog: CatalogOption = None) -> None:
    """Forget a site; its weather file stays.

    Example: ferrule site drop "Low Wharf"
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


def weather_facts(site: Site) -> dict[str, Any] | None:
    """What the weather file of a site holds; ``None`` where it has none.

    Raises
    ------
    MatcherError
        Where it cannot be read.
    """
    if site.weather is None:
        return None
    from cli.years import plane_of
    from matcher.moduleyear import plane_year
    from matcher.weather import read_weather

    weather = read_weather(site.weather)
    tilt, azimuth, assumed = plane_of(site, weather)
    return {
        "kind": weather.kind,
        "place": weather.name,
        "lat": weather.latitude,
        "lon": weather.longitude,
        "entries": len(weather.times),
        "interval_hours": weather.interval_hours,
        "lowest_c": weather.lowest_c,
        "highest_c": weather.highest_c,
        "tilt": tilt,
        "azimuth": azimuth,
        "plane_assumed": assumed,
        "irradiation_kwh_m2": plane_year(weather, tilt, azimuth).irradiation_kwh_m2,
        "notes": list(weather.notes),
    }


def _missing_temperatures(low: float | None, high: float | None, weather: str | None) -> str:
    """What to say where a design temperature is missing; what a weather file could offer, and why not to trust it."""
    missing = " and ".join(option for option, value in (("--low", low), ("--high", high)) if value is None)
    line = f"{missing}: give the lowest and the highest air temperature to design for, in degC (--low -12 --high 38)"
    if weather is None:
        return line
    from matcher.weather import read_weather

    year = read_weather(weather)
    return (
        f"{line}; {os.path.basename(weather)} runs from {year.lowest_c:g} to {year.highest_c:g} degC, but a typical year is"
        f" not an extreme one: look up the extremes of the place, or take these knowingly with"
        f" --low {year.lowest_c:g} --high {year.highest_c:g}"
    )


def _refuse_taken(sites: list[Site], site: Site, replace: bool) -> None:
    taken = next((s for s in sites if s.name.casefold() == site.name.casefold()), None)
    if taken is not None and not replace:
        raise CatalogError(f"a site is called {taken.name!r} already: --replace puts the new one in its place")


def _say_weather(site: Site, facts: dict[str, Any] | None) -> None:
    from cli.console import say

    if facts is None:
        if site.lat is None:
            say("No place and no weather file: there will be no clipping figure here (--lat and --lon, or --weather).")
        return
    assumed = ", assumed" if facts["plane_assumed"] else ""
    say(
        f"Weather: {facts['kind']}, {facts['place']} ({_pair(facts['lat'], facts['lon'], ', ')}),"
        f" {facts['entries'] * facts['interval_hours']:,.0f} hours, {facts['lowest_c']:.1f} to {facts['highest_c']:.1f} degC"
        f" in the air, {facts['irradiation_kwh_m2']:,.0f} kWh/m2 a year on the array (tilt {facts['tilt']:g}, azimuth"
        f" {facts['azimuth']:g} deg{assumed})."
    )
    for line in (*facts["notes"], *_cautions(site, facts)):
        say(f"{line[0].upper()}{line[1:].rstrip('.')}.")


def _cautions(site: Site, facts: dict[str, Any]) -> list[str]:
    """What does not go together in a site and its weather."""
    found = []
    if facts["lowest_c"] < site.design_low_c:
        found.append(
            f"the file is colder ({facts['lowest_c']:.1f} degC) than the design low of {site.design_low_c:g} degC: strings"
            " would be too long for that hour; give a lower --low"
        )
    elif facts["lowest_c"] == site.design_low_c:
        found.append("the design low is the lowest hour of the file, and a typical year is not an extreme one")
    if facts["highest_c"] > site.design_high_c:
        found.append(
            f"the file is hotter ({facts['highest_c']:.1f} degC) than the design high of {site.design_high_c:g} degC;"
            " give a higher --high"
        )
    if site.lat is not None and site.lon is not None and _apart(site, facts):
        found.append("the place of the file is not that of the site; the file's own counts for sun and weather")
    return found


def _apart(site: Site, facts: dict[str, Any]) -> bool:
    """Whether the file is from more than a degree away."""
    return abs(site.lat - facts["lat"]) > 1 or abs((site.lon - facts["lon"] + 180) % 360 - 180) > 1


def _values(site: Site) -> dict[str, Any]:
    from dataclasses import asdict

    return asdict(site)


def _print_document(site: Site, facts: dict[str, Any] | None) -> None:
    from cli.console import print_json

    print_json({"schema": SCHEMA, "site": _values(site), "weather": facts})


def _pair(one: float | None, other: float | None, between: str) -> str:
    return "" if one is None and other is None else between.join("-" if v is None else f"{v:g}" for v in (one, other))
