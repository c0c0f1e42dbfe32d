"""Checks of a site's values: what is impossible is refused with a line that says how to mend it."""

from __future__ import annotations

from catalog.errors import CatalogError
from catalog.records import MOUNTINGS, Site, specs


def checked(site: Site) -> Site:
    """The site as it is, if its values are possible and go together.

    Raises
    ------
    CatalogError
        Naming the field, its value and what would be possible; a temperature of Fahrenheit size gets a hint.
    """
    for name, spec in specs(Site).items():
        value = getattr(site, name)
        if value is None or spec.low is None or spec.high is None:
            continue
        if not spec.low <= value <= spec.high:
            raise CatalogError(
                f"{spec.meaning} {value:g} {spec.unit} is outside {spec.low:g} to {spec.high:g} {spec.unit}{_hint(spec.unit, value)}"
            )
    if site.design_low_c > site.design_high_c:
        raise CatalogError(
            f"the design low of {site.design_low_c:g} degC is above the design high of {site.design_high_c:g} degC:"
            " give the lower temperature as --low, the higher as --high"
        )
    if site.mounting not in MOUNTINGS:
        raise CatalogError(f"mounting {site.mounting!r} is not known: it is one of {', '.join(MOUNTINGS)}")
    if (site.lat is None) != (site.lon is None):
        raise CatalogError("a place needs both --lat and --lon")
    return site


def _hint(unit: str, value: float) -> str:
    """What a value out of range most likely is."""
    if unit == "degC" and value > 40:
        return f": temperatures are in degC ({value:g} degF would be {(value - 32) / 1.8:.0f} degC)"
    return ""
