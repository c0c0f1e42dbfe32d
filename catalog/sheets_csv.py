"""Datasheets in a CSV file: one row per record, one column per field.

Cells that hold more than one value: ``inputs`` (see `catalog.inputs_text`); ``entered``, ``derived`` and
``assumed``, field names with blanks between; ``sources``, like ``max_dc_voltage_v = Installation manual
[rev. 3]``, parted by ``|``. A backslash takes its meaning from a mark in a source's name.
"""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from catalog.errors import CatalogError
from catalog.inputs_text import format_inputs, parse_inputs
from catalog.records import Inverter, Module, Source, specs
from catalog.sheet_entries import ABOUT, KINDS, MARKED_ORIGINS, cells_of, fields_of
from catalog.sheet_reading import Entry, Reading

_FIELDS = {kind: fields_of(kind) for kind in KINDS}
_VALUES = [name for names in _FIELDS.values() for name in names if name not in ABOUT]
_KNOWN = tuple(dict.fromkeys(("kind", *_VALUES, *ABOUT)))
_LISTS = tuple(origin.value for origin in MARKED_ORIGINS)


def _key(heading: str) -> str:
    """Heading without case, blanks and brackets: "Voc [V]" is voc_v."""
    return re.sub(r"[^a-z0-9]+", "_", heading.casefold()).strip("_")


_BY_KEY = {_key(name): name for name in _KNOWN}


def read_entries(text: str, reading: Reading) -> list[Entry]:
    """Entries of a CSV text.

    The separator is a comma, a semicolon or a tab, whichever makes the heading readable.

    Raises
    ------
    CatalogError
        If the text is no such table.
    """
    rows = _rows(text, reading)
    heading = rows[0] if rows else []
    columns = [_BY_KEY.get(_key(cell)) for cell in heading]
    for name in set(columns) - {None}:
        if columns.count(name) > 1:
            raise reading.fault("two columns have this name; take one out", "row 1", name)
    blank = {k for k, cell in enumerate(heading) if not cell.strip()}
    meant = reading.unknown(
        [cell.strip() for k, (cell, name) in enumerate(zip(heading, columns)) if not name and k not in blank],
        [name for name in _KNOWN if name not in columns],
        "column",
    )
    entries = []
    for number, row in enumerate(rows[1:], start=2):
        where = f"row {number}"
        if not any(cell.strip() for cell in row):
            continue
        if len(row) > len(heading) and any(cell.strip() for cell in row[len(heading) :]):
            raise reading.fault(
                f"has {len(row)} cells, the heading has {len(heading)}; put a cell with the separator in it"
                " in quotes",
                where,
            )
        cells = {name: cell.strip() for name, cell in zip(columns, row) if name}
        name = " ".join(f"{cells.get('maker', '')} {cells.get('model', '')}".split())
        where += f" ({name})" if name else ""
        kind = _kind(cells, where, reading)
        entries.append(Entry(where, kind, _unpacked(cells, where, reading), meant))
    return entries


def _rows(text: str, reading: Reading) -> list[list[str]]:
    """Rows by the separator that makes most headings known."""
    line = text.lstrip("\r\n").partition("\n")[0]
    known = {
        mark: sum(_key(cell.strip('" \r')) in _BY_KEY for cell in line.split(mark))
        for mark in (",", ";", "\t")
    }
    mark = max(known, key=known.__getitem__)
    if not known[mark]:
        raise reading.fault(
            "no known column name; name the columns like maker, model, technology, pmax_w, voc_v", "row 1"
        )
    rows: list[list[str]] = []
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=mark, strict=True)
    try:
        rows.extend(reader)
    except csv.Error as problem:
        raise reading.fault(
            f"the quotes do not match ({problem}); correct the row", f"row {len(rows) + 1}"
        ) from None
    # Blank lines above the heading count as rows below it, so that row numbers stay those of the file.
    first = next(k for k, row in enumerate(rows) if row)
    return [rows[first], *[[]] * first, *rows[first + 1 :]]


def _kind(cells: Mapping[str, str], where: str, reading: Reading) -> str:
    """Kind of a row: its ``kind`` cell, else told by the fields that only one kind has."""
    only = {
        kind: [n for n in names if cells.get(n) and n not in _FIELDS[other]] for kind, names, other in _PAIRS
    }
    stated = cells.get("kind", "").casefold().removesuffix("s")
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
            f"is a field of {_AN[other]}, and the row has those of {_AN[kind]}; {mend}", where, only[other][0]
        )
    return kind


_PAIRS = (("module", _FIELDS["module"], "inverter"), ("inverter", _FIELDS["inverter"], "module"))
_AN = {"module": "a module", "inverter": "an inverter"}


def _unpacked(cells: Mapping[str, str], where: str, reading: Reading) -> dict[str, Any]:
    """Cells of a row, those with more than one value taken apart."""
    found: dict[str, Any] = dict(cells)
    for name in _LISTS:
        if cells.get(name):
            found[name] = re.split(r"[\s,;]+", cells[name])
    for name, parse in (("inputs", parse_inputs), ("sources", _parse_sources)):
        if cells.get(name):
            try:
                found[name] = parse(cells[name])
            except CatalogError as problem:
                raise reading.fault(problem, where, name) from None
    return found


def _parse_sources(text: str) -> dict[str, dict[str, str]]:
    found = {}
    for part in re.findall(r"(?:\\.|[^|\\])+", text):
        match = re.fullmatch(
            r"\s*(\w+)\s*=\s*((?:\\.|[^\[\\])+?)\s*(?:\[((?:\\.|[^\]\\])*)\])?\s*", part, re.DOTALL
        )
        if not match:
            raise CatalogError(
                f"{part.strip()!r} is not understood; write it like 'max_dc_voltage_v = Manual [rev. 3]'"
            )
        name, revision = (re.sub(r"\\(.)", r"\1", some or "", flags=re.DOTALL) for some in match.groups()[1:])
        found[match[1]] = {"name": name, "revision": revision}
    return found


def _format_sources(sources: Mapping[str, Source]) -> str:
    def guarded(text: str) -> str:
        return re.sub(r"([\\|\[\]])", r"\\\1", text)

    return " | ".join(
        f"{field} = {guarded(source.name)}" + (f" [{guarded(source.revision)}]" if source.revision else "")
        for field, source in sources.items()
    )


def write_csv(path: Path, records: Sequence[Module | Inverter]) -> None:
    """Write records to a CSV file; columns in which no record has a value are left out."""
    rows = [_packed(record) for record in records]
    used = {name for row in rows for name in row}
    needed = {
        name
        for r in {type(r) for r in records} or {Module}
        for name, spec in specs(r).items()
        if spec.required
    }
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, [name for name in _KNOWN if name in used | needed], lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


def _packed(record: Module | Inverter) -> dict[str, str]:
    cells = cells_of(record)
    row = {"kind": "module" if isinstance(record, Module) else "inverter"}
    for name, cell in cells.items():
        if name in _LISTS:
            row[name] = " ".join(cell)
        elif name == "inputs":
            row[name] = format_inputs(cell)
        elif name == "sources":
            row[name] = _format_sources(cell)
        elif isinstance(cell, bool):
            row[name] = "yes" if cell else "no"
        else:
            row[name] = repr(cell).removesuffix(".0") if isinstance(cell, float) else str(cell)
    return row
