"""``fit --yearly-kwh``: the smallest module count that yields an energy, and the chain of efficiencies."""

from __future__ import annotations

from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from cli.console import counted
from cli.documents import inverter_key, module_key
from cli.fit_screen import wiring

if TYPE_CHECKING:
    from cli.wanted import EnergyWanted
    from cli.years import SiteYear
    from matcher.energy import Chain, Enough
    from matcher.fit import Fit, Option


def energy_lines(fit: Fit, year: SiteYear, energy: EnergyWanted, enough: Enough) -> list[str]:
    """The module count, whether what fits reaches the energy with it, and the chain of the option that yields most."""
    best, proven, links = enough.best, enough.proven, _chain(fit, year, enough)
    count = counted(enough.modules, "module")
    fewest = "is the fewest that yields it" if enough.modules == 1 else "are the fewest that yield it"
    sky = ", in a year without clouds and so at least" if year.clear_sky else ""
    said = f"{energy.yearly_kwh:,.0f} kWh a year{sky}: {count} {fewest}, {_named(fit, best)}"
    if proven is None:
        said += "; nothing that fits yields so much"
    elif proven.modules > best.modules:
        said += (
            f"; of what fits it takes {proven.modules:,}, {_named(fit, proven)}:"
            f" --count {proven.modules} in place of the energy lists them"
        )
    elif best.verdict is not proven.verdict:
        said += f"; of what fits as many, {_named(fit, proven)}"
    said += "."
    if year.clear_sky:
        said += " Clouds make it more: give a weather file (--weather), or --sun-hours with a site without a place."
    lines = [said]
    if links is not None:
        clipping = "not known" if links.clipping is None else f"{links.clipping:.1%}"
        lines.append(
            f"The chain: {links.irradiation_kwh_m2:,.0f} kWh/m2 on the array a year; module {links.module:.1%}, DC wiring"
            f" {links.dc_wiring:.1%}, inverter {links.inverter:.1%}, clipping {clipping}; their product, the system:"
            f" {links.system:.1%}."
        )
    return lines


def _named(fit: Fit, o: Option) -> str:
    """An option without what the question names."""
    module = f"{fit.modules[o.module].name} as " if len(fit.modules) > 1 else ""
    inverter = f" on {fit.inverters[o.inverter].name}" if len(fit.inverters) > 1 else ""
    return f"{module}{wiring(o)}{inverter} ({o.yearly_kwh:,.0f} kWh, {o.verdict})"


def add_energy(fit: Fit, year: SiteYear, energy: EnergyWanted, enough: Enough) -> dict[str, Any]:
    """The energy wanted, the option that yields most and its chain as an entry of the document."""
    links = _chain(fit, year, enough)
    return {
        "energy": {
            "wanted_kwh": energy.yearly_kwh,
            "modules": enough.modules,
            **_entry(fit, enough.best),
            "verdict": str(enough.best.verdict),
            "fits": None if enough.proven is None else {"modules": enough.proven.modules, **_entry(fit, enough.proven)},
            "chain": None if links is None else asdict(links) | {"system": links.system},
        }
    }


def _entry(fit: Fit, o: Option) -> dict[str, Any]:
    return {
        "yearly_kwh": o.yearly_kwh,
        "module": module_key(fit, o.module),
        "inverter": inverter_key(fit, o.inverter),
        "label": o.label,
    }


def _chain(fit: Fit, year: SiteYear, enough: Enough) -> Chain | None:
    from cli.years import DC_LOSS_PCT
    from matcher.energy import chain

    module_year = fit.search.year_of(enough.best.module)
    if module_year is None or year.irradiation_kwh_m2 is None:
        return None
    module = fit.modules[enough.best.module]
    return chain(enough.best, module, module_year, year.irradiation_kwh_m2, DC_LOSS_PCT)
