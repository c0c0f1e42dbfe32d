"""``ferrule fit``: name what you have, get what fits it."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from cli.console import note
from cli.opening import CatalogOption, open_catalog
from cli.siting import (
    AzimuthOption, CapOption, HighOption, LatOption, LonOption, LowOption, MountingOption, RearOption,
    SiteOption, TiltOption, WeatherOption, site_of,
)  # fmt: skip

from cli.wanted import (
    ByCountOption, DailyKwhOption, EnergyPriceOption, ExportPriceOption, ModulePriceOption, OwnUseOption,
    SunHoursOption, YearlyKwhOption, YearsOption, energy_wanted, worth_of,
)  # fmt: skip

if TYPE_CHECKING:
    from catalog.records import Inverter, Module, Site
    from catalog.store import Catalog
    from cli.in_stock import Lots
    from cli.wanted import EnergyWanted
    from cli.years import SiteYear
    from matcher.energy import Enough
    from matcher.moduleyear import PlaneYear
    from matcher.request import Request
    from matcher.shelf import Shelf

NOTHING_FITS = 1


def fit(
    module: Annotated[str | None, typer.Option("--module", "-m", metavar="NAME", help="The module on hand.")] = None,
    inverter: Annotated[str | None, typer.Option("--inverter", "-i", metavar="NAME", help="The inverter on hand.")] = None,
    count: Annotated[str | None, typer.Option(metavar="N", help="Modules on hand: 60, or a range 56..64.")] = None,
    units: Annotated[str, typer.Option(metavar="K", help="Inverters of one type that share them: 2, or a range 1..4.")] = "1",
    strings: Annotated[str | None, typer.Option(metavar="LIST", help="The array as strings, hosted exactly: 2x11,1x12 is 2 strings of 11 modules and 1 of 12; 2x11@170/30,1x12@260/30 with azimuth/tilt of each part.")] = None,
    ratio: Annotated[str, typer.Option(metavar="LOW..HIGH", help="Window of DC/AC ratios.")] = "0.8..1.5",
    clip_cap: Annotated[float, typer.Option(metavar="PCT", help="Clipping loss up to which a higher DC/AC ratio is better [%].")] = 2.0,
    rules: Annotated[str, typer.Option(metavar="NAME", help="Rule set: iec-62548, nec-690, or a file of your own, .toml.")] = "iec-62548",
    combiner: Annotated[bool, typer.Option("--combiner", help="Strings are paralleled in a combiner box: string inputs are waived.")] = False,
    by: Annotated[str | None, typer.Option(metavar="ORDER", help="least-inverter (energy, where an energy is wanted), ratio, clipping, margin, energy or cost.")] = None,
    in_stock: Annotated[bool, typer.Option("--in-stock", help="Only what is in stock, in the numbers that are there; with the cost.")] = False,
    every: Annotated[bool, typer.Option("--every", help="Every arrangement, not the best one of each record.")] = False,
    checks: Annotated[bool, typer.Option("--checks", help="Show every check of the options shown (and put them into documents).")] = False,
    why: Annotated[bool, typer.Option("--why", help="Say of the records without option what stops them and what would change that.")] = False,
    peaks: Annotated[bool, typer.Option("--peaks", help="Of the first options, how much may be clipped at most, as hourly means hide peaks.")] = False,
    limit: Annotated[int | None, typer.Option(metavar="N", min=1, help="Options shown on screen; without it as many as the screen holds, at most 20.")] = None,
    json: Annotated[bool, typer.Option("--json", help="Print the document ferrule.fit/1 instead of tables.")] = False,
    out: Annotated[str | None, typer.Option(metavar="FILE", help="Write the result to a file; its ending decides the form: .csv, .xlsx, .json, .html, or .parquet where the extra 'parquet' is installed.")] = None,
    site: SiteOption = None,
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
    yearly_kwh: YearlyKwhOption = None,
    daily_kwh: DailyKwhOption = None,
    sun_hours: SunHoursOption = None,
    by_count: ByCountOption = False,
    energy_price: EnergyPriceOption = None,
    own_use: OwnUseOption = None,
    export_price: ExportPriceOption = None,
    module_price: ModulePriceOption = None,
    years: YearsOption = 20.0,
    catalog: CatalogOption = None,
) -> int:
    """Name what you have, get what fits it.

    With --module, the inverters that take it; with --inverter, the modules it takes; with both, every
    arrangement of that pair. Exit status: 0 something fits, 1 nothing fits, 2 bad input.

    Example: ferrule fit --module "klassik 270p" --low -12 --high 37
    """
    if module is None and inverter is None:
        raise CatalogError("name what you have: --module NAME, --inverter NAME, or both")
    if strings is not None and module is None:
        raise CatalogError("--strings needs the module that they are made of: --module NAME")
    pair = module is not None and inverter is not None
    if by_count and not pair:
        raise CatalogError("--by-count is about one pair: give --module and --inverter")
    energy = energy_wanted(yearly_kwh, daily_kwh, sun_hours)
    if energy is not None and (count is not None or strings is not None):
        raise CatalogError("an energy wanted decides the module count: leave --count and --strings away")
    if by_count and (energy is not None or strings is not None or units.strip() != "1"):
        raise CatalogError("--by-count goes through the module counts of one unit: leave --strings, --units and an energy wanted away")
    by = by or ("least-inverter" if energy is None else "energy")
    worth = worth_of(energy_price, own_use, export_price, module_price, years)
    with open_catalog(catalog) as opened:
        place = site_of(
            opened, site, low=low, high=high, mounting=mounting, voltage_cap=voltage_cap, rear_share=rear_share,
            lat=lat, lon=lon, tilt=tilt, azimuth=azimuth, weather=weather,
        )  # fmt: skip
        from cli.asking import request_of
        from cli.in_stock import on_shelf, stock_lots

        request = request_of(place, ratio, count, clip_cap, rules, combiner, by, every or pair, units, strings)
        lots = stock_lots(opened) if in_stock or by == "cost" else None
        modules, inverters = _records(opened, module, inverter, lots if in_stock else None)
        stock = None if lots is None else on_shelf(modules, inverters, request, lots, bounded=in_stock)
        if stock is not None:
            modules, inverters = stock.modules, stock.inverters
        year = _year(opened, place, modules, inverters, energy, request.different_faces)

    from dataclasses import replace

    from cli import fit_files, fit_screen
    from cli.fit_growth import add_growth, growth_lines, show_growth
    from cli.years import cold_plane
    from matcher.fit import fit as search

    plane = cold_plane(request)
    if energy is not None:
        enough = _enough(request, modules, inverters, year, energy, plane, stock.shelf if stock else None)
        request = replace(request, counts=(enough.modules, enough.modules))
        if stock is not None:
            stock.check_count(request)
    found = search(modules, inverters, request, year.year, plane, stock.shelf if stock else None)
    extra = add_growth(found, worth) if by_count else {}
    if stock is not None:
        extra |= stock.entry()
    if energy is not None:
        from cli.fit_energy import add_energy

        extra |= add_energy(found, year, energy, enough)
    if peaks:
        from cli.fit_peaks import peaks_entry, peaks_line, peaks_of
        from cli.years import DC_LOSS_PCT

        hidden = peaks_of(found, place, DC_LOSS_PCT)
        extra |= peaks_entry(hidden)
        year = replace(year, notes=(*year.notes, peaks_line(hidden)))
    said = [] if stock is None else list(stock.notes)
    chained: list[str] = []
    if energy is not None:
        from cli.fit_energy import energy_lines

        first, *chained = energy_lines(found, year, energy, enough)
        said.append(first)
    if out is not None:
        fit_files.write(found, out, year, with_checks=checks or not request.every, why=why, extra=extra,
                        said=[*said, *chained])  # fmt: skip
        note(f"Written to {out}.")
    if json:
        fit_files.print_document(found, year.weather, with_checks=checks or not request.every, why=why, extra=extra)
    elif out is None or fit_screen.on_terminal():
        if by_count and limit is None and not checks:
            show_growth(found, year, worth, said)
        else:
            if by_count:
                print("\n".join([*growth_lines(found, worth), ""]))
            wanted = None if energy is None else energy.yearly_kwh
            fit_screen.show(found, year, limit=limit, checks=checks, why=why, before=said, aside=chained,
                            wanted_kwh=wanted)  # fmt: skip
    return 0 if found.totals.records_with_option else NOTHING_FITS


def _year(
    catalog: Catalog,
    site: Site,
    modules: list[Module],
    inverters: list[Inverter],
    energy: EnergyWanted | None,
    faces: tuple[tuple[float, float], ...],
) -> SiteYear:
    """The year that the question needs: of the module, of its faces, of all modules, or made of sun hours."""
    from cli.wanted import sun_hours_site_year
    from cli.years import facing_year, has_weather, site_year, site_years

    by_sun_hours = energy is not None and energy.sun_hours is not None
    if by_sun_hours and has_weather(site):
        raise CatalogError("--sun-hours stands in for weather, and the site has a place or a weather file: leave one of them away")
    if len(modules) == 1:
        if faces:
            return facing_year(site, modules[0], faces)
        if by_sun_hours:
            assert energy is not None and energy.sun_hours is not None
            return sun_hours_site_year(modules[0], site, energy.sun_hours)
        limited = any(g.max_current_a is not None for i in inverters for g in i.inputs)
        return site_year(catalog, site, modules[0], current_limits=limited)
    return site_years(catalog, site, modules)


def _enough(
    request: Request,
    modules: list[Module],
    inverters: list[Inverter],
    year: SiteYear,
    energy: EnergyWanted,
    plane: PlaneYear | None,
    shelf: Shelf | None,
) -> Enough:
    """The smallest module count that yields the energy."""
    from matcher.energy import fewest_modules

    if year.year is None:
        raise CatalogError(f"an energy needs weather: {year.why_not}, or --sun-hours with --module")
    return fewest_modules(modules, inverters, request, year.year, energy.yearly_kwh, plane, shelf)


def _records(
    catalog: Catalog, module: str | None, inverter: str | None, stocked: Lots | None
) -> tuple[list[Module], list[Inverter]]:
    """The records that were named, and all others of the other kind, or those in stock."""
    from cli.choosing import choose_inverter, choose_module
    from cli.in_stock import only_in_stock

    modules = inverters = None
    if module is not None:
        modules = [choose_module(catalog, module)]
    if inverter is not None:
        inverters = [choose_inverter(catalog, inverter)]
    if modules is None:
        modules = catalog.modules() if stocked is None else only_in_stock(catalog, stocked, "module")
    if inverters is None:
        inverters = catalog.inverters() if stocked is None else only_in_stock(catalog, stocked, "inverter")
    for kind, records in (("module", modules), ("inverter", inverters)):
        if not records:
            raise CatalogError(
                f"the catalog holds no {kind}: load the public tables with 'ferrule sheet load cec', or your own"
                " with 'ferrule sheet load FILE'"
            )
    return modules, inverters
