"""Tables that people keep in spreadsheets: rows of cells of a CSV or XLSX file, under the heading that is found in it.

What the headings mean is for the caller to say (``known``); what is found by it is the row that holds the headings,
the separator of a CSV file, and the sheet of a workbook. Lines above the heading, such as a title, are left out.
"""

from __future__ import annotations

import csv
import io
import zipfile
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from datetime import date, time
from pathlib import Path

from catalog.errors import CatalogError

ENDINGS = (".csv", ".tsv", ".txt", ".xlsx", ".xlsm")

#: What a cell holds; blank ones hold ``None``, texts are stripped.
Cell = str | int | float | bool | date | time | None

#: The heading is looked for in so many rows.
_HEADING_WITHIN = 30

_SEPARATORS = ",;\t|"

#: A workbook that is larger when unpacked, or packed more tightly, is no list that people keep [bytes; ratio].
_UNPACKED = 400_000_000
_PACKED_RATIO = 400
_COLUMNS = 300
_ROWS = 1_048_576


@dataclass(frozen=True, slots=True)
class TableRow:
    """A row of cells, as many as there are headings; ``number`` is that of the file, from 1."""

    number: int
    cells: tuple[Cell, ...]


@dataclass(frozen=True, slots=True)
class Table:
    """What a file holds: headings (blank where a column has none), their row, and the rows below that are not empty.

    ``notes`` says what was made of the file that its reader should know.
    """

    path: Path
    headings: tuple[str, ...]
    heading_row: int
    rows: tuple[TableRow, ...]
    notes: tuple[str, ...] = ()


def read_table(path: str | Path, known: Callable[[str], bool]) -> Table:
    """Read the table of a CSV or XLSX file.

    Parameters
    ----------
    path : str or Path
        Its ending decides the form.
    known : callable
        Tells whether a text is a heading that means something.

    Returns
    -------
    Table
        Of a workbook, that of the first visible sheet with a heading that is known.

    Raises
    ------
    CatalogError
        If the file cannot be read, is too large, or no row holds a known heading: one line with the file.
    """
    path = Path(path)
    ending = path.suffix.casefold()
    if ending not in ENDINGS:
        raise CatalogError(f"{path}: a table is read from a .csv or .xlsx file; save it in one of these forms")
    try:
        data = path.read_bytes()
    except OSError as problem:
        raise CatalogError(f"{path}: cannot be read ({problem.strerror}); check the path") from None
    if not data.strip():
        raise CatalogError(f"{path}: is empty")
    if ending in (".xlsx", ".xlsm"):
        return _best(path, _sheets(path, data), known)
    text, notes = _text(path, data)
    return _best(path, _separated(path, text), known, notes)


def _best(path: Path, tables: Iterator[list[list[Cell]]], known: Callable[[str], bool], notes: tuple[str, ...] = ()) -> Table:
    """The table with the most known headings; the first one of equals."""
    most, found, head = 0, None, 0
    for rows in tables:
        for k, row in enumerate(rows[:_HEADING_WITHIN]):
            number = sum(known(cell) for cell in row if isinstance(cell, str))
            if number > most:
                most, found, head = number, rows, k
    if found is None:
        raise CatalogError(f"{path}: no row with known column names was found; name the columns in the first row")
    headings = tuple(" ".join(str(cell).split()) if cell is not None else "" for cell in found[head])
    return Table(path, headings, head + 1, tuple(_rows(path, found, head, headings)), notes)


def _rows(path: Path, rows: list[list[Cell]], head: int, headings: Sequence[str]) -> Iterator[TableRow]:
    width = len(headings)
    for number, row in enumerate(rows[head + 1 :], start=head + 2):
        if all(cell is None for cell in row):
            continue
        if any(cell is not None for cell in row[width:]):
            raise CatalogError(
                f"{path}, row {number}: has {len(row)} cells, the heading has {width}; put a cell with the separator"
                " in it in quotes"
            )
        yield TableRow(number, tuple([*row[:width], *[None] * (width - len(row))]))


def _text(path: Path, data: bytes) -> tuple[str, tuple[str, ...]]:
    """The text of a file in UTF-8, in UTF-16 with its mark, or in the western code page of older spreadsheets."""
    try:
        if data.startswith((b"\xff\xfe", b"\xfe\xff")):
            return data.decode("utf-16"), ()
        if b"\0" in data:
            raise CatalogError(f"{path}: is no text; save it as .csv in UTF-8, or as .xlsx")
        return data.decode("utf-8-sig"), ()
    except UnicodeDecodeError as problem:
        line = data.count(b"\n", 0, problem.start) + 1
        try:
            text = data.decode("cp1252")
        except UnicodeDecodeError:
            raise CatalogError(f"{path}, line {line}: has a character that is not UTF-8; save the file in UTF-8") from None
        return text, (f"{path}: is not in UTF-8 (line {line}); read as Windows-1252, check accents and currency signs",)


def _separated(path: Path, text: str) -> Iterator[list[list[Cell]]]:
    """Rows by each separator that the text may have."""
    problem: CatalogError | None = None
    some = False
    for mark in _SEPARATORS:
        if mark not in text and mark != ",":
            continue
        rows: list[list[Cell]] = []
        try:
            for row in csv.reader(io.StringIO(text, newline=""), delimiter=mark, strict=True):
                rows.append([cell.strip() or None for cell in row])
        except csv.Error as error:
            problem = CatalogError(f"{path}, row {len(rows) + 1}: the quotes do not match ({error}); correct the row")
            continue
        some = True
        yield rows
    if problem is not None and not some:
        raise problem


def _sheets(path: Path, data: bytes) -> Iterator[list[list[Cell]]]:
    """Rows of each visible sheet of a workbook."""
    _check_package(path, data)
    import warnings

    import openpyxl

    book = None
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            book = openpyxl.load_workbook(io.BytesIO(data), read_only=True, data_only=True, keep_links=False)
            for sheet in book.worksheets:
                if sheet.sheet_state == "visible":
                    yield [_plain(row) for row in sheet.iter_rows(max_col=_COLUMNS, max_row=_ROWS, values_only=True)]
    except (CatalogError, GeneratorExit, MemoryError):
        raise
    except Exception as error:
        # Damaged packages end in errors of many kinds (of zip, XML, dates, missing parts).
        reason = " ".join(str(error).split())[:120]
        raise CatalogError(f"{path}: is a damaged workbook ({reason}); save it again") from None
    finally:
        if book is not None:
            book.close()


def _plain(row: Sequence[object]) -> list[Cell]:
    cells = [_cell(value) for value in row]
    while cells and cells[-1] is None:
        cells.pop()
    return cells


def _cell(value: object) -> Cell:
    if isinstance(value, str):
        return value.strip() or None
    if value is None or isinstance(value, (bool, int, float, date, time)):
        return value
    return str(value)


def _check_package(path: Path, data: bytes) -> None:
    """Refuse what is no workbook, unpacks to far more than a list can be, or draws on other files."""
    try:
        parts = zipfile.ZipFile(io.BytesIO(data)).infolist()
    except (zipfile.BadZipFile, ValueError, OverflowError):
        raise CatalogError(f"{path}: is no .xlsx workbook, or it is damaged or locked by a password; save it again") from None
    size = sum(part.file_size for part in parts)
    if size > _UNPACKED or (size > 50_000_000 and size > _PACKED_RATIO * len(data)):
        raise CatalogError(f"{path}: would be {size / 1e6:,.0f} MB unpacked, which is no list; save the one sheet as .csv")
    if any(part.filename.casefold().startswith("xl/externallinks/") for part in parts):
        raise CatalogError(f"{path}: takes values from other workbooks; save it with values in place of the links, or as .csv")
