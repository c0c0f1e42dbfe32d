"""Tables that people keep in spreadsheets: rows of cells of a CSV or XLSX file, under the heading that is found in it.

What the headings mean is for the caller to say (``known``); what is found by it is the row that holds the headings,
the separator of a CSV file, and the sheet of a workbook. Lines above the heading, such as a title, are left out.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from catalog.errors import CatalogError
from catalog.raw_tables import Fault, separated_rows, worksheet_rows

ENDINGS = (".csv", ".tsv", ".txt", ".xlsx", ".xlsm")

#: What a cell holds; blank ones hold ``None``, texts are stripped.
Cell = str | int | float | bool | None

#: The heading is looked for in so many rows.
_HEADING_WITHIN = 30

_SEPARATORS = ",;\t|"

#: Rows that are too wide are told one by one up to this number.
_TOLD = 10


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

    def fault(message: str, *place: str) -> CatalogError:
        return CatalogError(f"{', '.join((str(path), *place))}: {message}")

    if ending in (".xlsx", ".xlsm"):
        return _best(path, _sheets(data, fault), known)
    text, notes = _text(path, data)
    return _best(path, _separated(text, fault), known, notes)


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
    below = [(n, row) for n, row in enumerate(rows[head + 1 :], start=head + 2) if any(c is not None for c in row)]
    wide = [(n, len(row)) for n, row in below if any(cell is not None for cell in row[width:])]
    if wide:
        lines = [f"{path}, row {n}: has {cells} cells, the heading has {width}" for n, cells in wide[:_TOLD]]
        more = [f"... and {len(wide) - _TOLD:,} more"] if len(wide) > _TOLD else []
        raise CatalogError("\n  ".join([*lines, *more]) + "; put a cell with the separator in it in quotes")
    for number, row in below:
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


def _separated(text: str, fault: Fault) -> Iterator[list[list[Cell]]]:
    """Rows by each separator that the text may have."""
    problem: CatalogError | None = None
    some = False
    for mark in _SEPARATORS:
        if mark not in text and mark != ",":
            continue
        try:
            rows = separated_rows(text, mark, fault)
        except CatalogError as error:
            problem = error
            continue
        some = True
        yield [[_cell(cell) for cell in row] for row in rows]
    if problem is not None and not some:
        raise problem


def _sheets(data: bytes, fault: Fault) -> Iterator[list[list[Cell]]]:
    """Rows of each visible sheet of a workbook, without blank cells at their ends."""
    for _, rows in worksheet_rows(data, fault):
        plain = [[_cell(cell) for cell in row] for row in rows]
        for row in plain:
            while row and row[-1] is None:
                row.pop()
        yield plain


def _cell(value: Cell) -> Cell:
    return value.strip() or None if isinstance(value, str) else value
