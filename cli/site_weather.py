"""What the weather file of a site holds, and what is to be said about it."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from catalog.records import Site


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


def missing_temperatures(low: float | None, high: float | None, weather: str | None) -> str:
    """What to say where a design temperature is missing: what a weather file could offer, and its danger."""
    missing = " and ".join(option for option, value in (("--low", low), ("--high", high)) if value is None)
    line = (
        f"{missing}: give the lowest and the highest air temperature to design for, in degC"
        " (--low -12 --high 38)"
    )
    if weather is None:
        return line
    from matcher.weather import read_weather

    year = read_weather(weather)
    return (
        f"{line}; {os.path.basename(weather)} runs from {year.lowest_c:g} to {year.highest_c:g} degC, but a"
        " typical year is not an extreme one: look up the extremes of the place, or take these knowingly with"
        f" --low {year.lowest_c:g} --high {year.highest_c:g}"
    )


def say_weather(site: Site, facts: dict[str, Any] | None) -> None:
    """Print what the weather file holds, and what does not go together with the site."""
    from cli.console import say

    if facts is None:
        if site.lat is None:
            say("No place, no weather file, so no clipping figure here (--lat and --lon, or --weather).")
        return
    hours = facts["entries"] * facts["interval_hours"]
    assumed = ", assumed" if facts["plane_assumed"] else ""
    say(
        f"Weather: {facts['kind']}, {facts['place']} ({pair(facts['lat'], facts['lon'], ', ')}),"
        f" {hours:,.0f} hours,"
        f" {facts['lowest_c']:.1f} to {facts['highest_c']:.1f} degC in the air,"
        f" {facts['irradiation_kwh_m2']:,.0f} kWh/m2 a year on the array"
        f" (tilt {facts['tilt']:g}, azimuth {facts['azimuth']:g} deg{assumed})."
    )
    for line in (*facts["notes"], *_cautions(site, facts)):
        say(f"{line[0].upper()}{line[1:].rstrip('.')}.")


def _cautions(site: Site, facts: dict[str, Any]) -> list[str]:
    """What does not go together in a site and its weather."""
    found = []
    lowest, highest = facts["lowest_c"], facts["highest_c"]
    if lowest < site.design_low_c:
        found.append(
            f"the file is colder ({lowest:.1f} degC) than the design low of {site.design_low_c:g} degC:"
            " strings that just hold at the one are too long for the other; give a lower --low"
        )
    elif lowest == site.design_low_c:
        found.append(
            "the design low is the lowest hour of the file, and a typical year is not an extreme one"
        )
    if highest > site.design_high_c:
        found.append(
            f"the file is hotter ({highest:.1f} degC) than the design high of {site.design_high_c:g} degC;"
            " give a higher --high"
        )
    if site.lat is not None and site.lon is not None and _apart(site, facts):
        found.append(
            "the place of the file is not that of the site; the file's own counts for sun and weather"
        )
    return found


def _apart(site: Site, facts: dict[str, Any]) -> bool:
    """Whether the file is from more than a degree away."""
    return abs(site.lat - facts["lat"]) > 1 or abs((site.lon - facts["lon"] + 180) % 360 - 180) > 1


def pair(one: float | None, other: float | None, between: str) -> str:
    """Two numbers as one cell; blank where neither is known."""
    return (
        ""
        if one is None and other is None
        else between.join("-" if v is None else f"{v:g}" for v in (one, other))
    )
