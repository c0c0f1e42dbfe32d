"""`fit --peaks`: how much more may be clipped than hourly means show."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from catalog.errors import CatalogError

if TYPE_CHECKING:
    from catalog.records import Site
    from matcher.fit import Fit

#: Options that it is worked out for, the first ones.
_OPTIONS = 8


@dataclass(frozen=True, slots=True)
class Peak:
    """Clipping loss of an option [%]: by the weather's means, and at most."""

    rank: int
    clipping_loss_pct: float
    at_most_pct: float


def peaks_of(fit: Fit, site: Site, dc_loss_pct: float) -> list[Peak]:
    """Of the first options that have a clipping figure.

    Raises
    ------
    CatalogError
        Where the question has no weather of hours, or parts of the array face different ways.
    """
    if site.weather is None:
        raise CatalogError("--peaks asks what hours hide, and a clear-sky year hides nothing: give a --weather file")
    if fit.request.different_faces:
        raise CatalogError("--peaks is for arrays that face one way: leave the directions out of --strings")
    from cli.years import plane_of, weather_of
    from matcher.electrical import diode_parameters
    from matcher.moduleyear import module_year
    from matcher.peaks import clipping_pct, sun_or_cloud

    weather = weather_of(site)
    plane = sun_or_cloud(weather, *plane_of(site, weather)[:2])
    found: list[Peak] = []
    for option in fit.options(_OPTIONS):
        diode = diode_parameters(fit.modules[option.module])
        if option.clipping_loss_pct is None or diode is None:
            continue
        most = clipping_pct(fit, option, module_year(diode, plane, dc_loss_pct))
        if most is not None:
            found.append(Peak(option.rank, option.clipping_loss_pct, max(most, option.clipping_loss_pct)))
    return found


def peaks_line(peaks: list[Peak]) -> str:
    """What is said of them on screen."""
    if not peaks:
        return "What hourly means hide: none of the options has a clipping figure."
    each = ", ".join(f"#{p.rank} {p.at_most_pct:.2f} %" for p in peaks)
    return f"Clipping at most, were every hour part full sun and part dark (edges of clouds left out): {each}."


def peaks_entry(peaks: list[Peak]) -> dict[str, Any]:
    """Entry of the document."""
    return {
        "peaks": [
            {"rank": p.rank, "clipping_loss_pct": p.clipping_loss_pct, "clipping_at_most_pct": p.at_most_pct}
            for p in peaks
        ]
    }
