"""What is wanted or offered besides modules and inverters: an energy, and prices."""

from __future__ import annotations

from dataclasses import dataclass
from math import inf
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError

if TYPE_CHECKING:
    from catalog.records import Module, Site
    from cli.years import SiteYear
    from matcher.growth import Worth

_ENERGY = "Energy wanted"
_PRICES = "More or fewer modules"

YearlyKwhOption = Annotated[float | None, typer.Option("--yearly-kwh", metavar="KWH", help="AC energy wanted a year [kWh]: the fewest modules that yield it.", rich_help_panel=_ENERGY)]  # noqa: E501
DailyKwhOption = Annotated[float | None, typer.Option("--daily-kwh", metavar="KWH", help="AC energy wanted a day [kWh], the mean of the year.", rich_help_panel=_ENERGY)]  # noqa: E501
SunHoursOption = Annotated[float | None, typer.Option("--sun-hours", metavar="H", help="Hours of full sun a day on the array [kWh/m2], where there is no weather.", rich_help_panel=_ENERGY)]  # noqa: E501
ByCountOption = Annotated[bool, typer.Option("--by-count", help="For a pair: how energy, clipping and worth run with the number of modules.", rich_help_panel=_PRICES)]  # noqa: E501
EnergyPriceOption = Annotated[float | None, typer.Option("--energy-price", metavar="P", help="Worth of a kWh that is used or netted.", rich_help_panel=_PRICES)]  # noqa: E501
OwnUseOption = Annotated[float | None, typer.Option("--own-use", metavar="KWH", help="Yearly energy that is used or netted [kWh]; without it, all.", rich_help_panel=_PRICES)]  # noqa: E501
ExportPriceOption = Annotated[float | None, typer.Option("--export-price", metavar="P", help="Worth of a kWh beyond that; 0 where surplus is not paid.", rich_help_panel=_PRICES)]  # noqa: E501
ModulePriceOption = Annotated[float | None, typer.Option("--module-price", metavar="P", help="Price of one module more, with what belongs to it.", rich_help_panel=_PRICES)]  # noqa: E501
YearsOption = Annotated[float, typer.Option("--years", metavar="Y", help="Years over which a module must earn its price.", rich_help_panel=_PRICES)]  # noqa: E501

@dataclass(frozen=True, slots=True)
class EnergyWanted:
    """An AC energy a year [kWh], and the sun hours a day [h] that stand in for weather."""

    yearly_kwh: float
    sun_hours: float | None = None


def energy_wanted(yearly_kwh: float | None, daily_kwh: float | None, sun_hours: float | None) -> EnergyWanted | None:
    """The energy that is wanted; ``None`` where none is.

    Raises
    ------
    CatalogError
        Where the values do not go together or are not possible.
    """
    if yearly_kwh is not None and daily_kwh is not None:
        raise CatalogError("give the energy once: --yearly-kwh or --daily-kwh")
    wanted = yearly_kwh if daily_kwh is None else daily_kwh * 365.0
    if wanted is None:
        if sun_hours is not None:
            raise CatalogError("--sun-hours goes with the energy wanted: --daily-kwh or --yearly-kwh")
        return None
    if not 0 < wanted < 1e12:
        raise CatalogError(f"an energy of {wanted:g} kWh a year is not above 0")
    if sun_hours is not None and not 0 < sun_hours <= 12:
        raise CatalogError(f"--sun-hours {sun_hours:g}: hours of full sun a day are above 0 and at most 12")
    return EnergyWanted(wanted, sun_hours)


def worth_of(
    energy_price: float | None,
    own_use: float | None,
    export_price: float | None,
    module_price: float | None,
    years: float,
) -> Worth | None:
    """Prices as given; ``None`` where the energy has none.

    Raises
    ------
    CatalogError
        Where a price is missing that another one needs.
    """
    from matcher.growth import Worth

    prices = {"--own-use": own_use, "--export-price": export_price, "--module-price": module_price}
    if energy_price is None:
        given = [option for option, value in prices.items() if value is not None]
        if given:
            raise CatalogError(f"{given[0]} needs the worth of a kWh: --energy-price")
        return None
    if any(v is not None and not 0 <= v < inf for v in (energy_price, *prices.values())) or not 0 < years <= 100:
        raise CatalogError("prices and energies are numbers not below 0, and the years are above 0 and at most 100")
    if own_use is not None and export_price is None:
        raise CatalogError("--own-use leaves a surplus: say what it is paid with --export-price, 0 where it is not")
    if own_use is None and export_price is not None:
        raise CatalogError("--export-price is for energy beyond your own use: say how much that is with --own-use")
    return Worth(energy_price, own_use, export_price or 0.0, module_price, years)


def sun_hours_site_year(module: Module, site: Site, sun_hours: float) -> SiteYear:
    """A year made of sun hours, for a site without weather.

    Raises
    ------
    CatalogError
        Where the module's power in the heat is not known.
    """
    from cli.years import DC_LOSS_PCT, SiteYear
    from matcher.electrical import power_in_heat
    from matcher.energy import sun_hours_year

    hot = power_in_heat(module, site)
    if hot is None:
        raise CatalogError(f"the energy of {module.name} in the heat needs pmax_coef_pct, which is not stated")
    vmp_v, pmax_w, cell_c = hot
    year = sun_hours_year(vmp_v, pmax_w, sun_hours, DC_LOSS_PCT)
    note = (
        f"Energy from {sun_hours:g} hours of full sun a day, the modules always at their hot design temperature"
        f" ({cell_c:.0f} degC of the cell): on the low side, and without a clipping figure."
    )
    return SiteYear(year, "sun hours", (note,), irradiation_kwh_m2=365.0 * sun_hours)
