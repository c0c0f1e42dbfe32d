"""The form of a CEC table: find the file, read it by columns, and say which row and column cannot be read.

A table is a CSV file: a heading, a row of units, a row of variable names, then one row per type. What the
columns mean is in ``catalog.cec``.
"""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from importlib.util import find_spec
from math import isfinite
from pathlib import Path
from typing import Any

from catalog.errors import CatalogError

_BLANK = frozenset({"", "n/a", "na", "nan", "-"})
_ROW_LABELS = frozenset({"units", "[0]"})  # first cells of the rows under the heading that are no type
_TAKE_OUT = "correct it or take the row out"


@dataclass(frozen=True)
class CecTable:
    """A CEC table by columns; ``rows`` are the row numbers that a spreadsheet shows."""

    path: Path
    cells: Mapping[str, Sequence[str]]
    rows: Sequence[int]

    def error(self, k: int, column: str, message: str) -> CatalogError:
        """The error for one cell, of the ``k``-th type of the table."""
        return CatalogError(f"{self.path}, row {self.rows[k]}, column {column}: {message}")

    def each(self, column: str, read: Callable[[str], Any]) -> list[Any]:
        """Read every cell of a column; ``read`` raises ValueError for what it cannot read."""
        known: dict[str, Any] = {}
        for k, cell in enumerate(self.cells[column]):
            if cell not in known:
                try:
                    known[cell] = read(cell.strip())
                except ValueError as problem:
                    raise self.error(k, column, f"{problem}; {_TAKE_OUT}") from None
        return [known[cell] for cell in self.cells[column]]

    def numbers(self, column: str) -> list[float | None]:
        """Numbers of a column; ``None`` where a cell is blank."""
        try:
            values = list(map(float, self.cells[column]))
        except ValueError:
            return self.each(column, number)
        return values if isfinite(sum(values)) else self.each(column, number)

    def needed(self, column: str) -> list[float]:
        """Numbers of a column that must not be blank."""
        values = self.numbers(column)
        if None in values:
            raise self.error(values.index(None), column, "is blank; fill it in or take the row out")
        return values

    def revision(self, column: str) -> str:
        """Date of the table: from the file's name, else the newest in a column of dates (month/day/year)."""
        cells = set(self.cells.get(column, ()))
        dates = (re.fullmatch(r"(\d{1,2})/(\d{1,2})/(\d{4})", cell.strip()) for cell in cells)
        return _date_in_name(self.path) or max((_iso(d[3], d[1], d[2]) for d in dates if d), default="")


def read_table(
    kind: str, path: Path | None, columns: Sequence[str], other_names: Mapping[str, str] | None = None
) -> CecTable:
    """Read a CEC table and check its heading and the width of every row.

    Parameters
    ----------
    kind : str
        "module" or "inverter".
    path : Path or None
        The CSV file; ``None`` for the newest table of that kind that pvlib installs.
    columns : sequence of str
        Columns that the table must have.
    other_names : mapping, optional
        What newer tables call a column, by the name in ``columns``.

    Raises
    ------
    CatalogError
        If the file is missing, cut off or no such table.
    """
    path = _installed(kind) if path is None else Path(path)
    lines = _lines(path)
    heading = [cell.strip() for cell in lines[0]] if lines else []
    for name, other in (other_names or {}).items():
        if name not in heading and other in heading:
            heading[heading.index(other)] = name
    missing = [name for name in columns if name not in heading]
    if len(missing) > len(columns) // 2:
        shape = f"no heading of a CEC {kind} table ({', '.join(columns[:4])} ...)"
        raise CatalogError(f"{path}, row 1: {shape}; give another file")
    if missing:
        names = ", ".join(missing)
        raise CatalogError(f"{path}, row 1, column {names}: is missing; get the whole CEC {kind} table")

    first = 1
    while first < min(3, len(lines)) and lines[first] and lines[first][0].strip().casefold() in _ROW_LABELS:
        first += 1
    rows = [k + 1 for k in range(first, len(lines)) if lines[k]]
    body = [lines[row - 1] for row in rows]
    for row, line in zip(rows, body):
        if len(line) != len(heading):
            mend = "the file looks cut off, get it again" if row == rows[-1] else _TAKE_OUT
            at = f"{path}, row {row}, column {heading[min(len(line), len(heading)) - 1]}"
            raise CatalogError(f"{at}: the row has {len(line)} cells, the heading has {len(heading)}; {mend}")
    if not body:
        raise CatalogError(f"{path}, row {first + 1}: the CEC {kind} table has no rows; get it again")
    return CecTable(path, dict(zip(heading, zip(*body))), rows)


def number(cell: str) -> float | None:
    """Number in a cell; ``None`` for a blank one.

    Raises
    ------
    ValueError
        If the cell holds neither; the message names the cell's text.
    """
    if cell.casefold() in _BLANK:
        return None
    try:
        value = float(cell)
    except ValueError:
        value = float("nan")
    if not isfinite(value):
        raise ValueError(f"{cell!r} is no number")
    return value


def _lines(path: Path) -> list[list[str]]:
    try:
        return list(csv.reader(io.StringIO(path.read_text(encoding="utf-8-sig"), newline="")))
    except FileNotFoundError:
        raise CatalogError(f"{path}: no such file; give the path of a CEC table (CSV)") from None
    except OSError as problem:
        reason = f"cannot be read ({problem.strerror})"
        raise CatalogError(f"{path}: {reason}; give the path of a CEC table (CSV)") from None
    except (UnicodeDecodeError, csv.Error) as problem:
        reason = f"no CSV text in UTF-8 ({problem})"
        raise CatalogError(f"{path}: {reason}; save the table as CSV in UTF-8") from None


def _installed(kind: str) -> Path:
    """Newest CEC table of a kind in pvlib's data folder; pvlib itself is not imported."""
    spec = find_spec("pvlib")
    if spec is None or not spec.submodule_search_locations:
        raise CatalogError(f"no CEC {kind} table, as pvlib is not installed; install it or give a file")
    folder = Path(spec.submodule_search_locations[0]) / "data"
    found = list(folder.glob(f"sam-library-cec-{kind}s-*.csv"))
    if not found:
        raise CatalogError(f"{folder}: holds no sam-library-cec-{kind}s-*.csv; give the table's file instead")
    return max(found, key=lambda path: (_date_in_name(path), path.name))


def _date_in_name(path: Path) -> str:
    found = re.search(r"(\d{4})-(\d{1,2})-(\d{1,2})", path.name)
    return _iso(*found.groups()) if found else ""


def _iso(year: str, month: str, day: str) -> str:
    return f"{year}-{month:0>2}-{day:0>2}"
