"""Datasheets in a workbook (XLSX): a worksheet of modules, one of inverters, or tables of others."""

from __future__ import annotations

import io
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from catalog.cells import packed
from catalog.raw_tables import worksheet_rows
from catalog.records import Inverter, Module
from catalog.sheet_reading import Reading
from catalog.sheet_tables import Table
from catalog.sheets_csv import columns_of


def read_tables(data: bytes, reading: Reading) -> list[Table]:
    """The tables of a workbook, one per worksheet that holds anything.

    Raises
    ------
    CatalogError
        If it is no workbook, or one that could do harm.
    """
    tables = [Table(rows, title) for title, rows in worksheet_rows(data, reading.fault)]
    if not tables:
        raise reading.fault("has no worksheet with anything in it; enter at least one module or inverter")
    return tables


def write_xlsx(path: Path, records: Sequence[Module | Inverter]) -> None:
    """Write records to a workbook, a worksheet per kind; texts are texts, whatever they begin with."""
    import xlsxwriter

    options = {"strings_to_formulas": False, "strings_to_urls": False, "strings_to_numbers": False}
    # In memory first: a file that cannot be written fails in one place.
    memory = io.BytesIO()
    with xlsxwriter.Workbook(memory, options | {"in_memory": True}) as book:
        bold = book.add_format({"bold": True})
        kinds = {"modules": Module, "inverters": Inverter}
        for title, type_ in kinds.items():
            some = [record for record in records if isinstance(record, type_)]
            if not some and (title == "inverters" or records):
                continue
            sheet = book.add_worksheet(title)
            rows = [packed(record) for record in some]
            names = columns_of(rows, some)
            sheet.freeze_panes(1, names.index("model") + 1)
            for k, name in enumerate(names):
                sheet.write_string(0, k, name, bold)
                sheet.set_column(k, k, max(len(name) + 2, 9))
            for number, row in enumerate(rows, start=1):
                for k, name in enumerate(names):
                    if name in row:
                        _write(sheet, number, k, row[name])
    path.write_bytes(memory.getvalue())


def _write(sheet: Any, row: int, column: int, cell: Any) -> None:
    # A workbook keeps 16 digits; a number that needs 17 is kept as text.
    if isinstance(cell, int | float) and not isinstance(cell, bool) and float(f"{cell:.16G}") == cell:
        sheet.write_number(row, column, cell)
    else:
        sheet.write_string(row, column, cell if isinstance(cell, str) else repr(cell))
