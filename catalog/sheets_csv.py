"""Datasheets in a CSV file: one row per record, one column per field (see `catalog.cells` for cells with several values)."""

from __future__ import annotations

import csv
import io
from collections.abc import Sequence
from pathlib import Path

from catalog.cells import packed
from catalog.raw_tables import separated_rows
from catalog.records import Inverter, Module, specs
from catalog.sheet_reading import Reading
from catalog.sheet_tables import KNOWN, Table, heading_row, key_of

_MARKS = (",", ";", "\t")
_OWN = frozenset(key_of(name) for name in KNOWN)

#: A text that begins like this is a formula to a spreadsheet; it is written with an apostrophe ahead.
_FORMULA = ("=", "+", "-", "@", "'")


def read_tables(text: str, reading: Reading) -> list[Table]:
    """The table of a CSV text; the separator is a comma, a semicolon or a tab, whichever makes a heading readable.

    Raises
    ------
    CatalogError
        If the text is no table.
    """
    if text.startswith("sep="):
        # A spreadsheet's own line about the separator; it stays a row, so that row numbers are those of the file.
        mark = text[4:5]
        return [Table(separated_rows(text, mark if mark in _MARKS else ",", reading.fault), guarded=True)]
    line = text.lstrip("\r\n").partition("\n")[0]
    known = {mark: sum(key_of(cell.strip('" \r')) in _OWN for cell in line.split(mark)) for mark in _MARKS}
    mark = max(known, key=known.__getitem__)
    if known[mark] < 2:
        head = "\n".join(text.splitlines()[:25])
        score = {
            m: heading_row(list(csv.reader(io.StringIO(head), delimiter=m)))[1] for m in _MARKS if m in head
        }
        mark = max(score, key=score.__getitem__, default=mark)
    return [Table(separated_rows(text, mark, reading.fault), guarded=True)]


def write_csv(path: Path, records: Sequence[Module | Inverter]) -> None:
    """Write records to a CSV file; columns in which no record has a value are left out."""
    rows = [packed(record) for record in records]
    names = columns_of(rows, records)
    with path.open("w", encoding="utf-8", newline="") as file:
        file.write(",".join(names) + "\n")
        for row in rows:
            file.write(",".join([_written(row.get(name, "")) for name in names]) + "\n")


def columns_of(rows: Sequence[dict], records: Sequence[Module | Inverter]) -> list[str]:
    """Columns that some row has a value for, or that every record needs."""
    used = {name for row in rows for name in row}
    types = {type(record) for record in records} or {Module}
    needed = {name for type_ in types for name, spec in specs(type_).items() if spec.required}
    return [name for name in KNOWN if name in used | needed]


def _written(cell: object) -> str:
    """A cell as text. Whatever another separator would part is in quotes, so that no part of it becomes a formula."""
    if isinstance(cell, float):
        return repr(cell).removesuffix(".0")
    text = str(cell)
    if isinstance(cell, str) and text.startswith(_FORMULA):
        text = f"'{text}"
    if any(mark in text for mark in ',;"\t'):
        text = '"' + text.replace('"', '""') + '"'
    return text
