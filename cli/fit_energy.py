"""``fit --yearly-kwh``: the smallest module count that yields an energy, and the chain of efficiencies."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from cli.console import say

if TYPE_CHECKING:
    from cli.wanted import EnergyWanted
    from cli.years import SiteYear
    from matcher.energy import Chain
    from matcher.fit import Fit, Option


def show_energy(fit: Fit, year: SiteYear, energy: EnergyWanted) -> None:
    """Print the module count and the chain of the option that yields most with it."""
    assert fit.request.counts is not None
    count = fit.request.counts[0]
    say(f"{energy.yearly_kwh:,.0f} kWh a year: {count} modules are the fewest that yield it.")
    best, links = _best_chain(fit, year)
    if best is not None and links is not None:
        inverter = fit.inverters[best.inverter].name
        say(
            f"With {best.label} on {inverter}: {best.yearly_kwh:,.0f} kWh of the"
            f" {links.irradiation_kwh_m2:,.0f} kWh/m2 on the array. Module {links.module:.1%},"
            f" DC wiring {links.dc_wiring:.1%}, inverter {links.inverter:.1%}, clipping"
            f" {'not known' if links.clipping is None else f'{links.clipping:.1%}'}: the system"
            f" {links.system:.1%} (the product)."
        )
    say()


def add_energy(fit: Fit, year: SiteYear, energy: EnergyWanted) -> dict[str, Any]:
    """The energy wanted and the chain as an entry of the document."""
    assert fit.request.counts is not None
    best, links = _best_chain(fit, year)
    chain = None
    if links is not None:
        chain = {
            "irradiation_kwh_m2": links.irradiation_kwh_m2,
            "module": links.module,
            "dc_wiring": links.dc_wiring,
            "inverter": links.inverter,
            "clipping": links.clipping,
            "system": links.system,
        }
    return {
        "energy": {
            "wanted_kwh": energy.yearly_kwh,
            "modules": fit.request.counts[0],
            "yearly_kwh": None if best is None else best.yearly_kwh,
            "chain": chain,
        }
    }


def _best_chain(fit: Fit, year: SiteYear) -> tuple[Option | None, Chain | None]:
    """The listed option with the most energy, and its chain."""
    from cli.years import DC_LOSS_PCT
    from matcher.energy import chain

    options = [o for o in fit.options(full=False) if o.yearly_kwh is not None]
    best = max(options, key=lambda o: o.yearly_kwh or 0.0, default=None)
    module_year = None if best is None else fit.search.year_of(best.module)
    if best is None or module_year is None or year.irradiation_kwh_m2 is None:
        return best, None
    links = chain(best, fit.modules[best.module], module_year, year.irradiation_kwh_m2, DC_LOSS_PCT)
    return best, links
