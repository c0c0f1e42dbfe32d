"""Datasheets in a workbook (XLSX): a worksheet of modules, one of inverters, or tables of others.

A workbook is a ZIP archive of XML. Before anything of it is read, its sizes are checked as the archive states them
(and Python's zipfile never unpacks more than stated), and what could reach outside or grow when parsed is refused.
"""

from __future__ import annotations

import io
import warnings
import zipfile
from collections.abc import Sequence
from datetime import date, datetime
from pathlib import Path
from typing import Any

from catalog.cells import packed
from catalog.errors import CatalogError
from catalog.records import Inverter, Module
from catalog.sheet_reading import Reading
from catalog.sheet_tables import Table
from catalog.sheets_csv import columns_of

_MOST_UNPACKED = 200 * 2**20  # [bytes]
_MOST_RATIO = 150  # unpacked to packed; a sheet of like numbers reaches some 30
_SMALL = 2 * 2**20  # below this a high ratio does no harm [bytes]
_MOST_PARTS = 2000
_MOST_ROWS = 300_000
_MOST_COLUMNS = 500
_MOST_CELLS = 6_000_000


def read_tables(data: bytes, reading: Reading) -> list[Table]:
    """The tables of a workbook, one per worksheet that holds anything.

    Raises
    ------
    CatalogError
        If it is no workbook, or one that could do harm.
    """
    _guard(data, reading)
    from openpyxl import load_workbook

    try:
        with warnings.catch_warnings():
            # What openpyxl leaves out (styles, printer settings) is nothing that is read here.
            warnings.simplefilter("ignore")
            book = load_workbook(io.BytesIO(data), read_only=True, data_only=True, keep_links=False)
        tables = [
            Table(_rows(sheet, reading), sheet.title)
            for sheet in book.worksheets
            if sheet.sheet_state == "visible"
        ]
    except CatalogError:
        raise
    # A damaged workbook makes openpyxl, and the XML parser below it, fail in any way there is.
    except Exception as problem:
        raise reading.fault(
            f"is no workbook that can be read ({type(problem).__name__}); open it in a spreadsheet and save it anew"
        ) from None
    tables = [table for table in tables if table.rows]
    if not tables:
        raise reading.fault("has no worksheet with anything in it; enter at least one module or inverter")
    return tables


def _guard(data: bytes, reading: Reading) -> None:
    """Refuse what is no workbook, is huge when unpacked, links to other files, or defines entities."""
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            parts = archive.infolist()
            if len(parts) > _MOST_PARTS or sum(p.file_size for p in parts) > _MOST_UNPACKED:
                raise reading.fault("is huge when unpacked, so it was not opened; save the rows alone as CSV")
            for part in parts:
                if part.file_size > _SMALL and part.file_size > _MOST_RATIO * max(part.compress_size, 1):
                    raise reading.fault(
                        f"unpacks to {part.file_size / max(part.compress_size, 1):.0f} times its size ({part.filename}), so it"
                        " was not opened; save the rows alone as CSV"
                    )
            names = [part.filename.replace("\\", "/").casefold() for part in parts]
            if any("externallink" in name for name in names):
                raise reading.fault("links to other files; save it with values in the place of links")
            for part in parts:
                if part.filename.endswith((".xml", ".rels")):
                    _guard_part(archive.read(part), part.filename, reading)
    except CatalogError:
        raise
    # zipfile raises half a dozen types for damaged archives (bad magic, checksum, encryption, compression).
    except Exception:
        raise reading.fault("is no workbook (XLSX); open it in a spreadsheet and save it anew") from None


def _guard_part(text: bytes, name: str, reading: Reading) -> None:
    if b"\0" in text or b"<!DOCTYPE" in text or b"<!ENTITY" in text:
        raise reading.fault(f"holds definitions that no workbook needs ({name}), so it was not opened")
    if name.endswith(".rels") and b'TargetMode="External"' in text and b"externalLink" in text:
        raise reading.fault("links to other files; save it with values in the place of links")


def _rows(sheet: Any, reading: Reading) -> list[list[Any]]:
    """Cells of a worksheet as plain values; empty rows at its end are left out."""
    # The extent that the file states may be wrong, and would be allocated.
    sheet.reset_dimensions()
    rows: list[list[Any]] = []
    cells = 0
    for number, row in enumerate(sheet.iter_rows(), start=1):
        cells += len(row)
        if number > _MOST_ROWS or len(row) > _MOST_COLUMNS or cells > _MOST_CELLS:
            raise reading.fault(
                f"has more than {_MOST_ROWS:,} rows or {_MOST_COLUMNS} columns; part it",
                f"sheet {sheet.title!r}",
            )
        rows.append([_plain(cell) for cell in row])
    while rows and all(cell is None for cell in rows[-1]):
        rows.pop()
    return rows


def _plain(cell: Any) -> Any:
    """Value of a cell; of a number that is shown as percent, the text that is shown."""
    value = cell.value
    if isinstance(value, float | int) and not isinstance(value, bool):
        if "%" in (cell.number_format or ""):
            return f"{value * 100:.10g} %"
        return value
    if isinstance(value, datetime) and not (value.hour or value.minute or value.second):
        return value.date().isoformat()
    if isinstance(value, date):
        return value.isoformat()
    return value if value is None or isinstance(value, str | bool) else str(value)


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
