"""``ferrule stock list``: what is in stock, as a table, a file or a document, `ferrule.stock/1`.

A CSV file or workbook that is written can be loaded again with ``ferrule stock load``.
"""

from __future__ import annotations

import csv
import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import IO, TYPE_CHECKING, Annotated, Any

import typer

from catalog.errors import CatalogError
from cli.kinds import KindOption, asked_kinds
from cli.opening import CatalogOption, open_catalog

if TYPE_CHECKING:
    from catalog.names import Named
    from catalog.stock import StockItem

SCHEMA = "ferrule.stock/1"

FORMS = (".csv", ".xlsx", ".json")


def list_(
    kind: KindOption = None,
    open_: Annotated[bool, typer.Option("--open", help="Only what waits for a decision.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print the document ferrule.stock/1.")] = False,
    out: Annotated[str | None, typer.Option(metavar="FILE", help="Write it to a file: .csv, .xlsx or .json.")] = None,
    catalog: CatalogOption = None,
) -> None:
    """List what is in stock: how many, at what price, where, and which record it is.

    Example: ferrule stock list --kind inverter
    """
    from cli.in_stock import note_waiting

    kinds = asked_kinds(kind)
    with open_catalog(catalog) as opened:
        items = everything = opened.stock()
        names = {n.id: n for k in ("module", "inverter") for n in opened.names(k)}
    if kind is not None:
        items = [item for item in items if item.kind in kinds]
    if open_:
        items = [item for item in items if item.open]
    note_waiting(everything)
    if out is not None:
        from cli.console import counted, note

        _write(items, names, out)
        note(f"{counted(len(items), 'line')}. Written to {out}.")
    if as_json:
        from cli.console import print_json

        print_json(document(items, names))
    elif out is None:
        from cli.console import say

        if items:
            _show(items, names)
        else:
            say(_none_of(everything, kind, open_))


def _none_of(everything: Sequence[StockItem], kind: str | None, waiting: bool) -> str:
    """What to say where no line is asked for or there: not the same whether others are in stock or none."""
    if not everything:
        return "Nothing is in stock: 'ferrule stock load FILE' loads a list."
    article = f"{kind.casefold()} article" if kind else "article"
    if waiting:
        return f"No {article} waits for a decision." if kind else "Nothing waits for a decision."
    return f"No {article} is in stock."


def document(items: Sequence[StockItem], names: Mapping[int, Named]) -> dict[str, Any]:
    """The document `ferrule.stock/1`; what is not known is null.

    ``match`` tells how an article came to its record: ``named``, ``sure``, ``decided``; or why it has none: ``choose``,
    ``none``, ``left-out``.
    """
    return {"schema": SCHEMA, "items": [_entry(item, names) for item in items]}


def _entry(item: StockItem, names: Mapping[int, Named]) -> dict[str, Any]:
    record = names.get(item.record) if item.record is not None else None
    return {
        "article": item.article or None,
        "kind": item.kind,
        "text": item.text,
        "record": None if record is None else {"id": record.id, "maker": record.maker, "model": record.model},
        "match": item.confidence,
        "quantity": item.quantity,
        "unit_price": item.unit_price,
        "currency": item.currency,
        "place": item.place or None,
        "source": str(item.source),
    }


def _show(items: Sequence[StockItem], names: Mapping[int, Named]) -> None:
    from cli.console import Column, number, print_table

    currencies = {item.currency for item in items if item.currency}
    one = currencies.pop() if len(currencies) == 1 else None
    columns = [
        Column("article", fold=True),
        Column("record", fold=True, min_width=24),
        Column("match"),
        Column("pieces", number=True),
        Column(f"price {one}" if one else "price", number=True),
        Column("place", fold=True),
    ]
    rows = []
    for item in items:
        price = number(item.unit_price, 2)
        if not one and item.currency:
            price += f" {item.currency}"
        called = names[item.record].name if item.record is not None else f"? {item.words or item.article}"
        rows.append([item.article, called, item.confidence, number(item.quantity), price, item.place])
    print_table(columns, rows)


_COLUMNS = (
    ("article", 14, None), ("kind", 10, None), ("text", 50, None), ("record", 34, None), ("match", 10, None),
    ("quantity", 10, 0), ("unit_price", 11, 2), ("currency", 9, None), ("place", 26, None),
)  # fmt: skip


def _write(items: Sequence[StockItem], names: Mapping[int, Named], out: str) -> None:
    from cli.fit_files import replacing

    path = Path(out)
    form = path.suffix.lower()
    if form not in FORMS:
        raise CatalogError(f"--out {out}: the ending decides the form, .csv, .xlsx or .json")
    with replacing(path, binary=form == ".xlsx") as stream:
        if form == ".json":
            json.dump(document(items, names), stream, allow_nan=False, indent=1)
        elif form == ".csv":
            _write_csv(items, names, stream)
        else:
            _write_workbook(items, names, stream)


def _values(item: StockItem, names: Mapping[int, Named]) -> list[Any]:
    # What the list calls a record that is not known goes out as it came in.
    record = names[item.record].name if item.record is not None else item.named or None
    return [item.article or None, item.kind, item.text or None, record, item.confidence, item.quantity, item.unit_price,
            item.currency, item.place or None]  # fmt: skip


def _write_csv(items: Sequence[StockItem], names: Mapping[int, Named], stream: IO[str]) -> None:
    from cli.fit_files import safe

    writer = csv.writer(stream)
    writer.writerow([name for name, _, _ in _COLUMNS])
    for item in items:
        writer.writerow([safe(v) if isinstance(v, str) else v for v in _values(item, names)])


def _write_workbook(items: Sequence[StockItem], names: Mapping[int, Named], stream: IO[bytes]) -> None:
    import xlsxwriter

    from cli.worksheets import Column, Formats, Table

    book = xlsxwriter.Workbook(
        stream, {"strings_to_formulas": False, "strings_to_urls": False, "strings_to_numbers": False}
    )
    table = Table(book, "Stock", [Column(*column) for column in _COLUMNS], Formats(book))
    for item in items:
        table.row(_values(item, names))
    table.close()
    book.close()
