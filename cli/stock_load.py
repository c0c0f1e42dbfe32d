"""``ferrule stock load``: a list of what is in stock into the catalog, its articles matched to records."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from cli.opening import CatalogOption, open_catalog

if TYPE_CHECKING:
    from catalog.stock import StockItem


def load(
    file: Annotated[Path, typer.Argument(metavar="FILE", help="The list, .csv or .xlsx.", show_default=False)],
    add: Annotated[
        bool, typer.Option("--add", help="Keep what is in stock; only the same articles in the same places give way.")
    ] = False,
    currency: Annotated[
        str | None, typer.Option(metavar="CODE", help="Currency of prices that the list names none for, such as EUR.")
    ] = None,
    catalog: CatalogOption = None,
) -> None:
    """Load a stock list in the place of the last one: all or nothing.

    Columns as people name them: quantity, and the article's text or number; unit price, currency, place, kind, maker
    and model where there are any. Each article is matched to a record. What is not sure is listed with candidates and
    waits for a decision ('ferrule stock review'); decisions are kept and hold for the lists that follow.

    Example: ferrule stock load seed_catalog/stock.csv
    """
    from catalog.stock_file import read_stock_file
    from cli.console import counted, note, say
    from cli.stock_review import say_open

    found = read_stock_file(file, currency)
    with open_catalog(catalog) as opened:
        before = opened.stock()
        items = opened.load_stock(found.items, add=add)
        for line in found.notes:
            note(line)
        say(summary(items))
        if before:
            lines = f"the {counted(len(before), 'line')} before"
            say(f"Beside {lines}." if add else f"In the place of {lines}, {_way_back(before, file.name)}.")
        say_open(opened, items)


#: Lists that are named as those that were replaced.
_LISTS = 3


def _way_back(before: Sequence[StockItem], now: str) -> str:
    """From which lists the lines are that were replaced, and how to have them again."""
    lists = list(dict.fromkeys(str(item.source) for item in before))
    if lists == [now]:
        return f"from {now} as it was; 'ferrule stock list --out FILE' keeps a copy of what is in stock"
    named = ", ".join(lists[:_LISTS]) + (f" and {len(lists) - _LISTS:,} more" if len(lists) > _LISTS else "")
    again = "that list" if len(lists) == 1 else "these lists, each with --add,"
    return f"from {named}; load {again} again to have them back (--add keeps them beside the new ones; decisions are kept)"


_HOW = {
    "named": "by the full name", "sure": "by their text", "decided": "as decided",
}  # fmt: skip


def summary(items: Sequence[StockItem]) -> str:
    """How many lines there are, and how they came to their records."""
    from cli.console import counted

    number = Counter(item.confidence for item in items)
    matched = ", ".join(f"{number[how]:,} {words}" for how, words in _HOW.items() if number[how])
    said = f"{counted(len(items), 'line')} in stock: {sum(number[how] for how in _HOW):,} matched to records"
    said += f" ({matched})" if matched else ""
    left = number["left-out"]
    waiting = number["choose"] + number["none"]
    said += f", {left:,} left out as decided" if left else ""
    return f"{said}, {waiting:,} to review."
