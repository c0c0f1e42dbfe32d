"""Cells of CSV text and of workbooks (XLSX) as they stand, for all who read tables that people keep.

A workbook is a ZIP archive of XML. Before anything of it is read, its sizes are checked as the archive states them
(and Python's zipfile never unpacks more than stated), and what could reach outside or grow when parsed is refused.
"""

from __future__ import annotations

import csv
import io
import warnings
import zipfile
from collections.abc import Callable
from datetime import date, datetime
from typing import Any

from catalog.errors import CatalogError

#: Makes the error of a message, and of the place in the file that it is about.
Fault = Callable[..., CatalogError]

_MOST_UNPACKED = 200 * 2**20  # [bytes]
_MOST_RATIO = 150  # unpacked to packed; a sheet of like numbers reaches some 30
_SMALL = 2 * 2**20  # below this a high ratio does no harm [bytes]
_MOST_PARTS = 2000
_MOST_ROWS = 300_000
_MOST_COLUMNS = 500
_MOST_CELLS = 6_000_000



def separated_rows(text: str, mark: str, fault: Fault) -> list[list[str]]:
    """Rows of a CSV text whose cells are parted by a mark.

    Raises
    ------
    CatalogError
        If its quotes do not match.
    """
    rows: list[list[str]] = []
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=mark, strict=True)
    try:
        rows.extend(reader)
    except csv.Error as problem:
        raise fault(f"the quotes do not match ({problem}); correct the row", f"row {len(rows) + 1}") from None
    return rows


def worksheet_rows(data: bytes, fault: Fault) -> list[tuple[str, list[list[Any]]]]:
    """Title and rows of every visible worksheet that holds anything: texts, numbers, yes and no, ``None``.

    A number that is shown as percent is the text that is shown, a date is text as well.

    Raises
    ------
    CatalogError
        If it is no workbook, or one that could do harm.
    """
    _guard(data, fault)
    from openpyxl import load_workbook

    try:
        with warnings.catch_warnings():
            # What openpyxl leaves out (styles, printer settings) is nothing that is read here.
            warnings.simplefilter("ignore")
            book = load_workbook(io.BytesIO(data), read_only=True, data_only=True, keep_links=False)
        sheets = [(s.title, _rows(s, fault)) for s in book.worksheets if s.sheet_state == "visible"]
    except CatalogError:
        raise
    # A damaged workbook makes openpyxl, and the XML parser below it, fail in any way there is.
    except Exception as problem:
        raise fault(
            f"is no workbook that can be read ({type(problem).__name__}); open it in a spreadsheet and save it anew"
        ) from None
    return [(title, rows) for title, rows in sheets if rows]


def _guard(data: bytes, fault: Fault) -> None:
    """Refuse what is no workbook, is huge when unpacked, links to other files, or defines entities."""
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            parts = archive.infolist()
            if len(parts) > _MOST_PARTS or sum(p.file_size for p in parts) > _MOST_UNPACKED:
                raise fault("is huge when unpacked, so it was not opened; save the rows alone as CSV")
            for part in parts:
                if part.file_size > _SMALL and part.file_size > _MOST_RATIO * max(part.compress_size, 1):
                    raise fault(
                        f"unpacks to {part.file_size / max(part.compress_size, 1):.0f} times its size ({part.filename}), so it"
                        " was not opened; save the rows alone as CSV"
                    )
            names = [part.filename.replace("\\", "/").casefold() for part in parts]
            if any("externallink" in name for name in names):
                raise fault("links to other files; save it with values in the place of links")
            for part in parts:
                if part.filename.endswith((".xml", ".rels")):
                    _guard_part(archive.read(part), part.filename, fault)
    except CatalogError:
        raise
    # zipfile raises half a dozen types for damaged archives (bad magic, checksum, encryption, compression).
    except Exception:
        raise fault("is no workbook (XLSX); open it in a spreadsheet and save it anew") from None


def _guard_part(text: bytes, name: str, fault: Fault) -> None:
    if b"\0" in text or b"<!DOCTYPE" in text or b"<!ENTITY" in text:
        raise fault(f"holds definitions that no workbook needs ({name}), so it was not opened")
    if name.endswith(".rels") and b'TargetMode="External"' in text and b"externalLink" in text:
        raise fault("links to other files; save it with values in the place of links")


def _rows(sheet: Any, fault: Fault) -> list[list[Any]]:
    """Cells of a worksheet as plain values; empty rows at its end are left out."""
    # The extent that the file states may be wrong, and would be allocated.
    sheet.reset_dimensions()
    rows: list[list[Any]] = []
    cells = 0
    for number, row in enumerate(sheet.iter_rows(), start=1):
        cells += len(row)
        if number > _MOST_ROWS or len(row) > _MOST_COLUMNS or cells > _MOST_CELLS:
            raise fault(
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
