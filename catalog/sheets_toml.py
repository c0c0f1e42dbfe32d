"""Datasheets in a TOML file: a table ``[[module]]`` or ``[[inverter]]`` per record, one key per field.

``source`` and ``source_revision`` at the top of the file stand for records that name none. An inverter's
``inputs`` are an array of tables; ``entered``, ``derived`` and ``assumed`` are arrays of field names;
``sources`` is a table of ``{name, revision}`` by field name.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import asdict
from pathlib import Path
from typing import Any

from catalog.records import Inverter, Module
from catalog.sheet_entries import KINDS, cells_of, fields_of
from catalog.sheet_reading import Entry, Reading

_TOP = ("source", "source_revision")


def read_entries(text: str, reading: Reading) -> list[Entry]:
    """Entries of a TOML text.

    Raises
    ------
    CatalogError
        If the text is no TOML, or has no such tables.
    """
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as problem:
        raise reading.fault(f"is no valid TOML: {problem}") from None
    top = {name: data[name] for name in _TOP if name in data}
    reading.unknown([name for name in data if name not in (*_TOP, *KINDS)], (*_TOP, *KINDS), "key")
    entries = []
    for kind in KINDS:
        tables = data.get(kind, [])
        if not isinstance(tables, list) or not all(isinstance(table, dict) for table in tables):
            raise reading.fault(f"{kind} is no array of tables; begin each {kind} with [[{kind}]]", kind)
        known = fields_of(kind)
        for number, table in enumerate(tables, start=1):
            name = " ".join(f"{table.get('maker', '')} {table.get('model', '')}".split())
            where = f"{kind} {number}" + (f" ({name})" if name else "")
            meant = reading.unknown(
                [key for key in table if key not in known], [k for k in known if k not in table], "key", where
            )
            # A record's own source does not take the revision of the file's.
            entries.append(Entry(where, kind, table if "source" in table else top | table, meant))
    if not entries:
        raise reading.fault("has neither a [[module]] nor an [[inverter]] table; enter at least one")
    return entries


def write_toml(path: Path, records: Sequence[Module | Inverter]) -> None:
    """Write records to a TOML file; what is not known is left out."""
    import tomli_w

    tables: dict[str, list[dict[str, Any]]] = {kind: [] for kind in KINDS}
    for record in records:
        tables["module" if isinstance(record, Module) else "inverter"].append(_table(cells_of(record)))
    text = tomli_w.dumps({kind: some for kind, some in tables.items() if some})
    path.write_text(text, encoding="utf-8", newline="\n")


def _table(cells: Mapping[str, Any]) -> dict[str, Any]:
    table = {name: _plain(cell) for name, cell in cells.items()}
    if "inputs" in table:
        table["inputs"] = [_known(asdict(group)) for group in cells["inputs"]]
    if "sources" in table:
        table["sources"] = {name: _known(asdict(source)) for name, source in cells["sources"].items()}
    return table


def _known(values: Mapping[str, Any]) -> dict[str, Any]:
    return {name: _plain(value) for name, value in values.items() if value not in (None, "")}


def _plain(value: Any) -> Any:
    """A whole number without a decimal point: 400 reads better than 400.0."""
    return int(value) if isinstance(value, float) and value.is_integer() and abs(value) < 1e15 else value
