"""``fit --yearly-kwh``: the smallest module count that yields an energy, and the chain of efficiencies."""

from __future__ import annotations

from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from cli.console import say
from cli.documents import inverter_key, module_key
from cli.fit_screen import wiring

if TYPE_CHECKING:
    from cli.wanted import EnergyWanted
    from cli.years import SiteYear
    from matcher.energy import Chain, Enough
    from matcher.fit import Fit


def show_energy(fit: Fit, year: SiteYear, energy: EnergyWanted, enough: Enough) -> None:
    """Print the module count, and the chain of the option that yields most with it."""
    best, links = enough.best, _chain(fit, year, enough)
    say(f"{energy.yearly_kwh:,.0f} kWh a year: {enough.modules:,} modules are the fewest that yield it.")
    say(
        f"Most with them: {best.yearly_kwh:,.0f} kWh, {fit.modules[best.module].name} as {wiring(best)} on"
        f" {fit.inverters[best.inverter].name} ({best.verdict})."
    )
    if links is not None:
        clipping = "not known" if links.clipping is None else f"{links.clipping:.1%}"
        say(
            f"The chain: {links.irradiation_kwh_m2:,.0f} kWh/m2 on the array a year; module {links.module:.1%}, DC wiring"
            f" {links.dc_wiring:.1%}, inverter {links.inverter:.1%}, clipping {clipping}; their product, the system:"
            f" {links.system:.1%}."
        )
    say("Options that follow have this count; one with less in the column kWh/year falls short.")
    say()


def add_energy(fit: Fit, year: SiteYear, energy: EnergyWanted, enough: Enough) -> dict[str, Any]:
    """The energy wanted, the option that yields most and its chain as an entry of the document."""
    links = _chain(fit, year, enough)
    return {
        "energy": {
            "wanted_kwh": energy.yearly_kwh,
            "modules": enough.modules,
            "yearly_kwh": enough.best.yearly_kwh,
            "module": module_key(fit, enough.best.module),
            "inverter": inverter_key(fit, enough.best.inverter),
            "label": enough.best.label,
            "chain": None if links is None else asdict(links) | {"system": links.system},
        }
    }


def _chain(fit: Fit, year: SiteYear, enough: Enough) -> Chain | None:
    from cli.years import DC_LOSS_PCT
    from matcher.energy import chain

    module_year = fit.search.year_of(enough.best.module)
    if module_year is None or year.irradiation_kwh_m2 is None:
        return None
    module = fit.modules[enough.best.module]
    return chain(enough.best, module, module_year, year.irradiation_kwh_m2, DC_LOSS_PCT)
