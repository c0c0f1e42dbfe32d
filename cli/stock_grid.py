"""``ferrule stock grid``: every module in stock against every inverter in stock."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from cli.opening import CatalogOption, open_catalog
from cli.siting import (
    AzimuthOption, CapOption, HighOption, LatOption, LonOption, LowOption, MountingOption, RearOption,
    SiteOption, TiltOption, WeatherOption, site_of,
)  # fmt: skip

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from matcher.shelf import Shelf

NOTHING_FITS = 1

FORMS = (".csv", ".json", ".xlsx", ".svg", ".png")


def grid(
    ratio: Annotated[str, typer.Option(metavar="LOW..HIGH", help="Window of DC/AC ratios.")] = "0.8..1.5",
    clip_cap: Annotated[float, typer.Option(metavar="PCT", help="Clipping loss up to which a higher DC/AC ratio is better [%].")] = 2.0,
    rules: Annotated[str, typer.Option(metavar="NAME", help="Rule set: iec-62548, nec-690, or a file of your own, .toml.")] = "iec-62548",
    combiner: Annotated[bool, typer.Option("--combiner", help="Strings are paralleled in a combiner box: string inputs are waived.")] = False,
    everything: Annotated[bool, typer.Option("--all", help="Show module counts, DC/AC ratios and all reasons, not one screen of them.")] = False,
    json: Annotated[bool, typer.Option("--json", help="Print the document ferrule.grid/1.")] = False,
    out: Annotated[str | None, typer.Option(metavar="FILE", help="Write it to a file: .csv, .xlsx, .json, or a picture, .svg or .png.")] = None,
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
    catalog: CatalogOption = None,
) -> int:
    """Which modules and inverters in stock go together, for how many modules on one inverter, and how well.

    No pair takes more modules than are in stock. What goes with nothing comes first, with the check that stops its
    nearest pair; then a letter for every pair, or with --all module counts and DC/AC ratios too. Exit status: 0 something goes together, 1 nothing does, 2 bad input.

    Example: ferrule stock grid --low -12 --high 37
    """
    if out is not None and Path(out).suffix.lower() not in FORMS:
        raise CatalogError(f"--out {out}: the ending decides the form, {', '.join(FORMS[:-1])} or {FORMS[-1]}")
    from cli.asking import request_of
    from cli.in_stock import only_in_stock, pieces_of, stock_lots
    from cli.years import cold_plane, site_years
    from matcher.grid import grid as all_pairs

    with open_catalog(catalog) as opened:
        place = site_of(
            opened, site, low=low, high=high, mounting=mounting, voltage_cap=voltage_cap, rear_share=rear_share,
            lat=lat, lon=lon, tilt=tilt, azimuth=azimuth, weather=weather,
        )  # fmt: skip
        request = request_of(place, ratio, None, clip_cap, rules, combiner, "least-inverter", False)
        lots = stock_lots(opened)
        modules, inverters = (only_in_stock(opened, lots, kind) for kind in ("module", "inverter"))
        year = site_years(opened, place, modules)
    pieces = {r.id: pieces_of(lots[r.id]) for r in (*modules, *inverters)}
    found = all_pairs(modules, inverters, request, year.year, cold_plane(request), _shelf(modules, inverters, pieces))

    from cli import grid_files, grid_screen, grid_short
    from cli.console import note
    from cli.fit_screen import on_terminal

    shown = grid_files.Shown(found, year, pieces)
    if out is not None:
        grid_files.write(shown, Path(out))
        note(f"{grid_screen.in_short(shown)} Written to {out}.")
    if json:
        grid_files.print_document(shown)
    elif out is None or on_terminal():
        (grid_screen if everything else grid_short).show(shown)
    return 0 if found.pairs else NOTHING_FITS


def _shelf(modules: list[Module], inverters: list[Inverter], pieces: dict[int, int]) -> Shelf:
    """How many of each there are; prices do not matter here."""
    import numpy as np

    from matcher.shelf import Lots, Shelf

    most = [np.array([pieces[r.id] for r in records], dtype=np.int64) for records in (modules, inverters)]
    return Shelf(*most, Lots.of([[]] * len(modules)), Lots.of([[]] * len(inverters)))
