"""From the table of a CSV file or a worksheet to entries: the heading found, its columns settled, cells taken apart.

A table under the project's own field names is read as it is. One under headings as people write them is read by a
`catalog.column_map.ColumnMap`, which is proposed from the headings and settled by whoever asks for the file.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from catalog.cells import composed_cells, unpacked
from catalog.column_map import ColumnMap, proposed
from catalog.errors import CatalogError
from catalog.headings import meaning, spec_of
from catalog.records import FieldSpec
from catalog.sheet_entries import ABOUT, KINDS, fields_of
from catalog.sheet_needs import AN
from catalog.sheet_reading import Entry, Reading
from catalog.units import unit_of

FIELDS = {kind: fields_of(kind) for kind in KINDS}
KNOWN = tuple(
    dict.fromkeys(("kind", *(n for names in FIELDS.values() for n in names if n not in ABOUT), *ABOUT))
)

#: How far down a heading may stand, below titles and remarks.
_HEADING_WITHIN = 20

#: Settles a map that was proposed: returns it as it is to be used, or raises CatalogError.
Settle = Callable[[ColumnMap], ColumnMap]


@dataclass(frozen=True, slots=True)
class Table:
    """Rows of cells as a file has them; the first is row 1. ``name`` is that of its worksheet.

    ``guarded`` tells that an apostrophe ahead of a text keeps spreadsheets from taking it for a formula.
    """

    rows: Sequence[Sequence[Any]]
    name: str = ""
    guarded: bool = False

    def place(self, number: int) -> str:
        """Where a row stands."""
        return f"sheet {self.name!r}, row {number}" if self.name else f"row {number}"


@dataclass(slots=True)
class _Columns:
    """The field of every column (``None``: left out), units by field, and likely meant names by field."""

    fields: list[str | None]
    units: dict[str, str] = field(default_factory=dict)
    meant: dict[str, str] = field(default_factory=dict)
    kind: str | None = None


def key_of(heading: str) -> str:
    """Heading without case, blanks and brackets: "Voc [V]" is voc_v."""
    return re.sub(r"[^a-z0-9]+", "_", heading.casefold()).strip("_")


_BY_KEY = {key_of(name): name for name in KNOWN}


def own_fields(heading: Sequence[Any]) -> list[str | None]:
    """Field of every cell of a heading that is one of the project's own; ``None`` for any other."""
    return [_BY_KEY.get(key_of(str(cell))) for cell in heading]


def heading_row(rows: Sequence[Sequence[Any]]) -> tuple[int, int]:
    """Index of the row that is most like a heading, and how many of its cells are known."""
    best, most = 0, 0
    for k, row in enumerate(rows[:_HEADING_WITHIN]):
        texts = [cell for cell in row if isinstance(cell, str) and cell.strip()]
        known = sum(key_of(text) in _BY_KEY for text in texts)
        if known < 2:
            known = max(known, *(sum(meaning(text, kind).sure for text in texts) for kind in KINDS))
        if known > most:
            best, most = k, known
        if known > 2 and known * 2 > len(texts):
            break
    return best, most


def entries_of(
    table: Table, reading: Reading, settle: Settle | None = None, kind: str | None = None
) -> list[Entry]:
    """Entries of a table.

    Parameters
    ----------
    table : Table
    reading : Reading
        Of the file.
    settle : callable, optional
        Settles the columns where not all headings are the project's own; else they must be beyond doubt.
    kind : {"module", "inverter"}, optional
        What the rows are, where the table does not tell.

    Raises
    ------
    CatalogError
        If it has no heading that is understood, or a row cannot be taken apart.
    """
    at, known = heading_row(table.rows)
    if not known:
        raise reading.fault(
            "no known column name; name the columns like maker, model, technology, pmax_w, voc_v",
            table.place(1),
        )
    heading = [_text(cell) for cell in table.rows[at]]
    rows = list(enumerate(table.rows[at + 1 :], start=at + 2))
    own = own_fields(heading)
    named = sum(1 for text in heading if text)
    # Headings such as "Voc (V)" are those of others, though they mean the same.
    exact = sum(
        text.casefold() == (name or "").casefold() for text, name in zip(heading, own, strict=True) if text
    )
    if "kind" in own or 2 * exact >= named:
        columns = _own_columns(heading, own, table.place(at + 1), reading)
        columns.kind = kind if "kind" not in own else None
    else:
        rows, units = _unit_row(rows, heading)
        columns = _foreign_columns(heading, units, settle, kind, table.place(at + 1), reading)
    reading.signs.look(_numbers(rows, columns, table))
    return _entries(rows, columns, len(heading), table, reading)


def _own_columns(heading: list[str], own: list[str | None], place: str, reading: Reading) -> _Columns:
    for name in set(own) - {None}:
        if own.count(name) > 1:
            raise reading.fault("two columns have this name; take one out", place, name)
    columns = _Columns(own)
    left = []
    for k, text in enumerate(heading):
        if not text or own[k]:
            continue
        found = next((m for m in (meaning(text, kind) for kind in KINDS) if m.sure), None)
        if found and found.field in KNOWN and found.field not in columns.fields:
            columns.fields[k] = found.field
            if found.unit:
                columns.units[found.field] = found.unit
        else:
            left.append(text)
    columns.meant = reading.unknown(left, [name for name in KNOWN if name not in columns.fields], "column")
    return columns


def _foreign_columns(
    heading: list[str],
    units: list[str],
    settle: Settle | None,
    kind: str | None,
    place: str,
    reading: Reading,
) -> _Columns:
    shown = [f"{text} [{unit}]" if unit and text else text for text, unit in zip(heading, units, strict=True)]
    try:
        found = proposed(shown, kind)
        settled = settle(found) if settle else _beyond_doubt(found)
    except CatalogError as problem:
        raise reading.fault(problem, place) from None
    left = [repr(c.heading) for c in settled.columns if c.field is None and c.heading]
    if left:
        reading.note(f"columns left out: {', '.join(left)}", place if place.startswith("sheet") else "")
    units_of = {c.field: c.unit for c in settled.columns if c.field and c.unit}
    return _Columns([c.field for c in settled.columns], units_of, {}, settled.kind)


def _beyond_doubt(found: ColumnMap) -> ColumnMap:
    if found.doubtful:
        raise CatalogError("not sure what these columns are: " + "; ".join(map(str, found.doubtful)))
    return found


def _unit_row(rows: list[tuple[int, Sequence[Any]]], heading: list[str]) -> tuple[list, list[str]]:
    """Rows below a row of units, and these units."""
    none = [""] * len(heading)
    if rows:
        cells = [_text(cell) for cell in rows[0][1]][: len(heading)]
        stated = [cell for cell in cells if cell not in ("", "-")]
        inner = [cell.strip("[]() ") for cell in cells]
        if len(stated) > 1 and all(unit_of(cell) for cell in inner if cell not in ("", "-")):
            return rows[1:], [*(cell.strip("-") for cell in inner), *none[len(inner) :]]
    return rows, none


def _numbers(rows: Sequence[tuple[int, Sequence[Any]]], columns: _Columns, table: Table) -> Any:
    """Texts of all cells that hold numbers, with their places, for the decimal sign of the file."""
    numeric = [(k, name) for k, name in enumerate(columns.fields) if name and _is_number(spec_of(name))]
    for number, row in rows:
        for k, name in numeric:
            if k < len(row) and isinstance(row[k], str):
                yield row[k], f"{table.place(number)}, {name}"


def _is_number(spec: FieldSpec | None) -> bool:
    return spec is not None and spec.type in (int, float)


def _entries(
    rows: Sequence[tuple[int, Sequence[Any]]], columns: _Columns, width: int, table: Table, reading: Reading
) -> list[Entry]:
    used = [(k, name) for k, name in enumerate(columns.fields) if name]
    foreign = columns.kind is not None
    entries = []
    for number, row in rows:
        filled = sum(1 for cell in row if cell is not None and cell != "" and not str(cell).isspace())
        if not filled:
            continue
        where = table.place(number)
        if len(row) > width and any(_text(cell) for cell in row[width:]):
            raise reading.fault(
                f"has {len(row)} cells, the heading has {width}; put a cell with the separator in it in quotes",
                where,
            )
        cells = {name: _cell(row[k], table.guarded) for k, name in used if k < len(row)}
        if foreign and filled == 1 and not cells.get("model"):
            reading.note("holds a remark and no record; left out", where)
            continue
        name = " ".join(f"{cells.get('maker', '')} {cells.get('model', '')}".split())
        if name:
            where += f" ({name[:80]})"
        kind = columns.kind or _kind(cells, where, reading)
        fault = ""
        try:
            cells = unpacked(cells, where, reading)
            if foreign:
                cells = composed_cells(cells, columns.units, where, reading)
        except CatalogError as problem:
            # Kept, so that it is told together with the faults of other rows.
            fault = str(problem)
        entries.append(Entry(where, kind, cells, columns.meant, columns.units, fault))
    return entries


def _cell(cell: Any, guarded: bool) -> Any:
    """A cell without blanks around it and without the guard of a text."""
    if cell is None:
        return ""
    if isinstance(cell, str):
        cell = cell.strip()
        return cell[1:] if guarded and len(cell) > 1 and cell[0] == "'" and cell[1] in "=+-@'" else cell
    return cell


def _text(cell: Any) -> str:
    return "" if cell is None else str(cell).strip()


def _kind(cells: Mapping[str, Any], where: str, reading: Reading) -> str:
    """Kind of a row: its ``kind`` cell, else told by the fields that only one kind has."""
    only = {
        kind: [n for n in names if cells.get(n) not in (None, "") and n not in FIELDS[other]]
        for kind, names, other in _PAIRS
    }
    stated = _text(cells.get("kind")).casefold().removesuffix("s")
    if stated and stated not in KINDS:
        raise reading.fault(f"{cells['kind']!r} is neither module nor inverter", where, "kind")
    kind = stated or max(only, key=lambda k: len(only[k]))
    if not stated and not only[kind]:
        raise reading.fault(
            "is neither a module (pmax_w) nor an inverter (ac_power_w); fill in its values", where
        )
    (other,) = set(KINDS) - {kind}
    if only[other]:
        mend = (
            "correct the kind or empty the cell"
            if stated
            else "part the two, or say which it is in a column 'kind'"
        )
        raise reading.fault(
            f"is a field of {AN[other]}, and the row has those of {AN[kind]}; {mend}", where, only[other][0]
        )
    return kind


_PAIRS = (("module", FIELDS["module"], "inverter"), ("inverter", FIELDS["inverter"], "module"))
