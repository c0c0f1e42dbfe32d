"""Tables in plain form, read column by column: tens of thousands of rows in a fraction of a second.

Plain means the project's own headings and numbers that are digits and a decimal point. Whatever is not plain, or wrong,
is left to `catalog.sheet_tables`, which reads cell by cell and says where and what; both give the same records.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from typing import Any

from catalog.cells import LISTS, parse_sources
from catalog.errors import CatalogError
from catalog.inputs_text import parse_inputs
from catalog.records import FieldSpec, Inputs, Inverter, Module, Origin, Source, specs
from catalog.sheet_entries import KINDS, fields_of, marked_fields
from catalog.sheet_reading import Reading
from catalog.sheet_tables import Table, own_fields

_PLAIN_NUMBERS = re.compile(r"[0-9.eE+\-\n]*")
_LOOSE_ENDS = (" \n", "\n ", "\t", "\u00a0")
_FLAGS = {"yes": True, "no": False}
_SUSPECT = ("'", "\u2212")


class _NotPlain(Exception):
    """The table is to be read cell by cell."""


def plain_records(table: Table, reading: Reading) -> tuple[list[Module | Inverter], list[str]] | None:
    """Records of a plain table and their places; ``None`` if it is not plain.

    Parameters
    ----------
    table : Table
        Of texts.
    reading : Reading
        Of the file.
    """
    if not table.rows or reading.given:
        return None
    fields = own_fields(table.rows[0])
    width = len(fields)
    # An empty line is a row without cells.
    numbers = [number for number, row in enumerate(table.rows[1:], start=2) if row]
    rows = [row for row in table.rows[1:] if row]
    if not rows or None in fields or len(set(fields)) < width or set(map(len, rows)) != {width}:
        return None
    columns = dict(zip(fields, zip(*rows, strict=True), strict=True))
    try:
        found = [_of_kind(kind, columns, chosen, reading) for kind, chosen in _kinds(columns).items()]
    except (_NotPlain, CatalogError, ValueError, KeyError):
        return None
    records = [record for some in found for record in some]
    if len({(type(r), r.maker, r.model) for r in records}) < len(records):
        return None
    places = [
        number
        for chosen in _kinds(columns).values()
        for number in (numbers if chosen is None else [numbers[k] for k in chosen])
    ]
    return records, [
        f"{table.place(number)} ({record.name})" for number, record in zip(places, records, strict=True)
    ]


def _kinds(columns: dict[str, Sequence[str]]) -> dict[str, list[int] | None]:
    """Rows of each kind; ``None``: all of them."""
    if "kind" not in columns:
        (kind,) = [k for k in KINDS if all(name in fields_of(k) for name in columns)]
        return {kind: None}
    stated = columns["kind"]
    if not set(stated) <= set(KINDS):
        raise _NotPlain
    if len(set(stated)) == 1:
        return {stated[0]: None}
    return {kind: [k for k, own in enumerate(stated) if own == kind] for kind in KINDS}


def _of_kind(
    kind: str, columns: dict[str, Sequence[str]], chosen: list[int] | None, reading: Reading
) -> list[Module | Inverter]:
    type_ = KINDS[kind]
    own = fields_of(kind)
    cells = {}
    for name, column in columns.items():
        some = column if chosen is None else [column[k] for k in chosen]
        if name in own:
            cells[name] = some
        elif name != "kind" and any(some):
            raise _NotPlain
    number = len(next(iter(cells.values())))
    values = {}
    for name, spec in specs(type_).items():
        if name in cells:
            values[name] = _column(cells[name], spec)
        elif spec.required:
            raise _NotPlain
    if type_ is Inverter and "inputs" in cells:
        assumed = (Inputs(trackers=1),)
        values["inputs"] = _once(cells["inputs"], lambda text: parse_inputs(text) if text else assumed)
    marked = frozenset(marked_fields(type_))
    about = _provenance(cells, number, reading, marked, type_ is Inverter)
    names = tuple(values)
    found = []
    for row, (source, origins, sources) in zip(zip(*values.values(), strict=True), about, strict=True):
        record = type_(**dict(zip(names, row, strict=True)), source=source, origins=origins, sources=sources)
        if origins and any(getattr(record, name) is None for name in origins):
            raise _NotPlain
        found.append(record)
    return found


def _column(cells: Sequence[str], spec: FieldSpec) -> list[Any]:
    """Values of one column."""
    text = "\n".join(cells)
    loose = text != text.strip(" ") or any(mark in text for mark in _LOOSE_ENDS)
    if loose or text.count("\n") >= len(cells):
        raise _NotPlain
    if spec.required and "" in cells:
        raise _NotPlain
    if spec.type is str:
        if text.startswith(_SUSPECT) or "\n'" in text or not text.replace("\n", "").isprintable():
            raise _NotPlain
        return [cell or None for cell in cells]
    if spec.type is bool:
        return [_FLAGS[cell] for cell in cells]
    if not _PLAIN_NUMBERS.fullmatch(text):
        raise _NotPlain
    values = [spec.type(cell) if cell else None for cell in cells]
    known = [value for value in values if value is not None]
    # A number outside the possible range may be one with a point between thousands.
    if known and (min(known) < _low(spec) or max(known) > _high(spec)):
        raise _NotPlain
    return values


def _low(spec: FieldSpec) -> float:
    return spec.low if spec.low is not None else -1e300


def _high(spec: FieldSpec) -> float:
    return spec.high if spec.high is not None else 1e300


def _once(cells: Sequence[str], read: Callable[[str], Any]) -> list[Any]:
    """What a function makes of each cell; like cells are read once."""
    seen = {cell: read(cell) for cell in set(cells)}
    return [seen[cell] for cell in cells]


def _provenance(
    cells: dict[str, Sequence[str]], number: int, reading: Reading, marked: frozenset[str], inverter: bool
) -> list[tuple[Source, dict[str, Origin], dict[str, Source]]]:
    """Source, origins and sources of each record; like ones are one object."""
    names = [n for n in ("source", "source_revision", *LISTS, "sources") if n in cells]
    blank = [""] * number
    stated = [cells[name] for name in names]
    given = cells.get("inputs", blank) if inverter else ["yes"] * number
    file = reading.path.name

    def read(row: tuple[str, ...]) -> tuple[Source, dict[str, Origin], dict[str, Source]]:
        own = dict(zip((*names, "inputs"), row, strict=True))
        text = "".join(row[:-1])
        if not text.isprintable() or any(cell != cell.strip() or cell.startswith(_SUSPECT) for cell in row):
            raise _NotPlain
        origins = {}
        for origin in LISTS:
            for name in own.get(origin, "").split():
                if name in origins or name not in marked:
                    raise _NotPlain
                origins[name] = Origin(origin)
        if not own["inputs"]:
            origins["inputs"] = Origin.ASSUMED
        sources = {}
        for name, source in parse_sources(own.get("sources", "")).items():
            if name not in marked:
                raise _NotPlain
            sources[name] = Source(source["name"].strip(), source["revision"].strip())
        return Source(own.get("source") or file, own.get("source_revision", "")), origins, sources

    seen: dict[tuple[str, ...], Any] = {}
    found = []
    for row in zip(*stated, [bool(g) * "yes" for g in given], strict=True):
        if row not in seen:
            seen[row] = read(row)
        found.append(seen[row])
    return found
