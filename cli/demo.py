"""``ferrule demo``: an invented distributor's question, answered end to end on a catalog of its own."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError

if TYPE_CHECKING:
    from catalog.records import Site
    from catalog.stock import StockItem
    from catalog.store import Catalog
    from matcher.fit import Fit, Option

#: The question: modules that are left in the hall, for an order from this place.
MODULE = "Marzipan Photovoltaik Klassik 270P"
SITE = "Butterfield Barn"
COUNT = "24"
UNITS = "1..3"
RATIO = "0.8..1.5"
CLIP_CAP_PCT = 2.0
RULES = "iec-62548"
ORDER = "least-inverter"

SHEETS = ("modules.toml", "inverters.csv")
SITES = "sites.toml"
STOCK = "stock.csv"


def demo(
    keep: Annotated[
        str | None, typer.Option(metavar="FILE", help="Make the demo's catalog here; it must not exist yet.")
    ] = None,
) -> None:
    """Show what Ferrule does, on an invented distributor's shelf.

    Makes a catalog of its own (anew each time; your own catalog is not touched), loads invented datasheets
    and sites, and answers a buyer's question.

    Example: ferrule demo
    """
    path = _fresh(keep)
    from catalog.store import Catalog

    with Catalog.open(path, create=True) as catalog:
        _stock_shelf(catalog)
        _answer(catalog, path)


def _fresh(keep: str | None) -> Path:
    """Where the demo's catalog is made; one that an earlier demo has made there gives way."""
    if keep is not None:
        path = Path(keep).expanduser()
        if path.exists():
            raise CatalogError(
                f"--keep {keep}: this file exists; name one that does not, the demo overwrites nothing"
            )
        return path
    from platformdirs import user_data_dir

    path = Path(user_data_dir("ferrule", appauthor=False), "demo.sqlite")
    path.unlink(missing_ok=True)
    return path


def _stock_shelf(catalog: Catalog) -> None:
    """Load the demo's datasheets, sites and stock list."""
    import seed_catalog
    from catalog.sheetfiles import read_sheets
    from catalog.stock_file import read_stock_file

    files = [read_sheets(seed_catalog.path(name)) for name in SHEETS]
    catalog.load([m for f in files for m in f.modules], [i for f in files for i in f.inverters])
    for site in _sites(seed_catalog.path(SITES)):
        catalog.add_site(site)
    catalog.load_stock(read_stock_file(seed_catalog.path(STOCK)).items)


def _sites(path: Path) -> list[Site]:
    import tomllib

    from catalog.records import Site

    with path.open("rb") as file:
        return [Site(**entry) for entry in tomllib.load(file)["site"]]


def _answer(catalog: Catalog, path: Path) -> None:
    """Search as ``ferrule fit`` does, and say it all."""
    from cli import fit_screen
    from cli.asking import request_of
    from cli.choosing import choose_module
    from cli.console import paragraph
    from cli.years import site_year
    from matcher.fit import fit as search

    site = catalog.site(SITE)
    module = choose_module(catalog, MODULE)
    inverters = catalog.inverters()
    request = request_of(site, RATIO, COUNT, CLIP_CAP_PCT, RULES, False, ORDER, False, UNITS)
    year = site_year(catalog, site, module)
    found = search([module], inverters, request, year.year)

    shelf = _shelf(catalog)
    left = shelf[MODULE]
    options = list(found.options(10))
    blocks = [
        paragraph(
            f"The demo: Loam & Lantern, an invented distributor, has {len(catalog.names('module'))} types of"
            f" modules and {len(inverters)} of inverters. {left.quantity} {module.name} are left ({left.place}),"
            f" and a customer at {site.name} would take {COUNT} of them. The buyer asks:"
        ),
        paragraph(fit_screen.question(found)),
        *fit_screen.options_blocks(found, year, options),
        paragraph(_in_short(found, options, shelf)),
        [*paragraph(_proof(options[0])), *_misses(found)],
        fit_screen.grounds_lines(found, year),
        _next(path),
    ]
    print("\n".join(fit_screen.joined(blocks)))


def _shelf(catalog: Catalog) -> dict[str, StockItem]:
    """The demo's stock by name of the record; what could not be read has none."""
    names = {n.id: n.name for kind in ("module", "inverter") for n in catalog.names(kind)}
    return {names[item.record]: item for item in catalog.stock() if item.record is not None}


def _in_short(found: Fit, options: Sequence[Option], shelf: Mapping[str, StockItem]) -> str:
    """The answer as one gives it on the telephone: least inverter, least money, doubtful bargain."""
    in_stock = [o for o in options if o.units <= shelf[_name(found, o)].quantity]
    proven = [o for o in in_stock if not o.confirm]
    least = min(proven, key=lambda o: _cost(found, o, shelf))
    said = f"In short: the least inverter that does the work is {_ordered(found, options[0], shelf)}."
    if least is not options[0]:
        said += f" The least money is {_ordered(found, least, shelf)}."
    bargain = min(in_stock, key=lambda o: _cost(found, o, shelf))
    if bargain.confirm:
        said += (
            f" Cheaper still is {_ordered(found, bargain, shelf)}: do not pay before its datasheet has given"
            " the values above, a wrong guess burns it."
        )
    return said


def _name(found: Fit, option: Option) -> str:
    return found.inverters[option.inverter].name


def _cost(found: Fit, option: Option, shelf: Mapping[str, StockItem]) -> float:
    return option.units * shelf[_name(found, option)].unit_price


def _ordered(found: Fit, option: Option, shelf: Mapping[str, StockItem]) -> str:
    lot = shelf[_name(found, option)]
    price = f"{_cost(found, option, shelf):,.0f} {lot.currency}"
    return f"#{option.rank}, {option.units} x {_name(found, option)} ({price}, {lot.quantity} on the shelf)"


def _proof(option: Option) -> str:
    """What an option was held against: the check of the cold voltage, and the one with the least room."""
    cold = next(c for c in option.checks if c.check == "max-dc-voltage")
    stops = [c for c in option.checks if c.stop and c.margin_pct is not None and c.unit != "1"]
    tight = min(stops, key=lambda c: c.margin_pct or 0.0)
    return (
        f"#{option.rank} passed {len(option.checks)} checks, each with value, limit and clause (fit --checks shows them):"
        f" max-dc-voltage {cold.value:,.1f} of {cold.limit:,.1f} {cold.unit} ({cold.rule}) and so on; the least room is in"
        f" {tight.check}, {tight.value:,.0f} of {tight.limit:,.0f} {tight.unit}."
    )


def _misses(found: Fit) -> list[str]:
    """Why the others are not in the list: the nearest that a rating stops."""
    from cli.console import paragraph

    stopped = [(found.inverters[k].name, r) for k, r in found.rejections() if r.failed[0] != "ratio-window"]
    return [
        line
        for name, reason in stopped[:1]
        for line in paragraph(
            f"Not in the list, for example: {name}, stopped by {', '.join(reason.failed)}: {reason.nearest}."
        )
    ]


def _next(path: Path) -> list[str]:
    """Commands to go on with, ready to be copied: folded as a shell understands it."""
    from cli.console import WIDTH, paragraph

    words = "Go on from here; 'ferrule sheet load cec' loads the public tables into a catalog of your own:"
    commands = (
        (f'ferrule fit -m "klassik 270p" --count {COUNT} --units {UNITS} --site "{SITE}"', "--in-stock --by cost"),
        (f'ferrule stock grid --site "{SITE}"', ""),
        (f'ferrule fit -m "klassik 270p" -i "viola 5" --site "{SITE}"', ""),
        ('ferrule sheet show "old faithful 4.6"', ""),
    )
    lines = paragraph(words)
    for first, rest in commands:
        more = f'{rest} --catalog "{path}"'.strip()
        whole = f"  {first} {more}"
        lines += [whole] if len(whole) <= WIDTH else [f"  {first} \\", f"    {more}"]
    return lines
