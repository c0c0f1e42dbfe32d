"""Files of datasheets: CSV, XLSX, TOML and the JSON of an open standard, to records and back.

The ending of the file decides the form; the forms are described in `catalog.sheets_csv`, `catalog.sheets_xlsx`,
`catalog.sheets_toml` and `catalog.sheets_json`, the fields in `catalog.records`.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from catalog.errors import CatalogError
from catalog.records import Inverter, Module
from catalog.sheet_entries import checked_records, records_of
from catalog.sheet_reading import Entry, Reading

if TYPE_CHECKING:
    from catalog.sheet_tables import Settle

ENDINGS = (".csv", ".xlsx", ".toml", ".json")

_LARGEST = 100 * 2**20  # [bytes]


@dataclass(frozen=True, slots=True)
class SheetFile:
    """What a file holds: records, and notes on what was left out, assumed, or is odd (one line each)."""

    modules: list[Module]
    inverters: list[Inverter]
    notes: list[str]


def read_sheets(
    path: str | Path,
    *,
    settle: Settle | None = None,
    kind: str | None = None,
    given: Mapping[str, str] | None = None,
) -> SheetFile:
    """Read the datasheets of a file.

    Parameters
    ----------
    path : str or Path
    settle : callable, optional
        Settles what the columns of a table are, where its headings are not the project's own: gets the
        `catalog.column_map.ColumnMap` that is proposed, returns the one to use. Without it, every column must
        be beyond doubt.
    kind : {"module", "inverter"}, optional
        What the rows of a table are, where it does not tell.
    given : mapping, optional
        Values by field for all records that state none, as texts; they get the origin ``entered``.

    Returns
    -------
    SheetFile
        Records in the order of the file. Values have the origin `stated` unless the file marks them.

    Raises
    ------
    CatalogError
        If the file cannot be read, or one of its values is missing, unreadable or impossible: one line with
        file, row and field, and how to mend it.
    """
    path = Path(path)
    ending = _ending(path, "reads")
    reading = Reading(path, given or {})
    data = _data(path, reading)
    records = _plain(data, reading) if ending == ".csv" and kind is None else None
    if records is None:
        records = records_of(_entries(ending, data, reading, settle, kind), reading)
    if not records:
        raise reading.fault("has a heading and no rows; enter at least one module or inverter")
    modules = [r for r in records if isinstance(r, Module)]
    return SheetFile(modules, [r for r in records if isinstance(r, Inverter)], reading.notes)


def _plain(data: bytes, reading: Reading) -> list[Module | Inverter] | None:
    """Records of a CSV file in the project's own plain form; ``None`` if it is not plain."""
    from catalog import sheets_csv
    from catalog.plain_tables import plain_records

    (table,) = sheets_csv.read_tables(_text(data, reading), reading)
    found = plain_records(table, reading)
    return None if found is None else checked_records(*found, reading)


def _entries(
    ending: str, data: bytes, reading: Reading, settle: Settle | None, kind: str | None
) -> Sequence[Entry]:
    if ending == ".toml":
        from catalog import sheets_toml

        return sheets_toml.read_entries(_text(data, reading), reading)
    if ending == ".json":
        from catalog import sheets_json

        return sheets_json.read_entries(_text(data, reading), reading)
    from catalog.sheet_tables import entries_of, heading_row

    if ending == ".xlsx":
        from catalog import sheets_xlsx

        tables = sheets_xlsx.read_tables(data, reading)
        # A sheet of remarks beside one of records is no fault.
        found = [table for table in tables if heading_row(table.rows)[1] > 1] or tables[:1]
        for table in tables:
            if table not in found:
                reading.note("has no columns of datasheets; left out", f"sheet {table.name!r}")
    else:
        from catalog import sheets_csv

        found = sheets_csv.read_tables(_text(data, reading), reading)
    return [entry for table in found for entry in entries_of(table, reading, settle, kind)]


def write_sheets(path: str | Path, modules: Sequence[Module], inverters: Sequence[Inverter]) -> None:
    """Write datasheets to a file; `read_sheets` reads it back without loss.

    Parameters
    ----------
    path : str or Path
        Overwritten if it exists.
    modules, inverters : sequence of Module, of Inverter
        Written in this order. Ids and revision numbers belong to a catalog and are not written.

    Raises
    ------
    CatalogError
        If the ending is not known, or the file cannot be written.
    """
    path = Path(path)
    ending = _ending(path, "writes")
    if ending == ".toml":
        from catalog.sheets_toml import write_toml as write
    elif ending == ".json":
        from catalog.sheets_json_write import write_json as write
    elif ending == ".xlsx":
        from catalog.sheets_xlsx import write_xlsx as write
    else:
        from catalog.sheets_csv import write_csv as write
    try:
        write(path, [*modules, *inverters])
    except OSError as problem:
        raise CatalogError(f"{path}: cannot be written ({problem.strerror}); name another file") from None


def _ending(path: Path, verb: str) -> str:
    ending = path.suffix.casefold()
    if ending not in ENDINGS:
        raise CatalogError(
            f"{path}: Ferrule {verb} datasheets in files that end in {', '.join(ENDINGS[:-1])} or {ENDINGS[-1]}"
        )
    return ending


def _data(path: Path, reading: Reading) -> bytes:
    try:
        if path.stat().st_size > _LARGEST:
            raise reading.fault(f"is larger than {_LARGEST // 2**20} MB; part it")
        data = path.read_bytes()
    except OSError as problem:
        raise CatalogError(f"{path}: cannot be read ({problem.strerror}); check the path") from None
    if not data.strip():
        raise reading.fault("is empty; enter at least one module or inverter")
    return data


def _text(data: bytes, reading: Reading) -> str:
    if data.startswith((b"\xff\xfe", b"\xfe\xff")) or b"\0" in data:
        raise reading.fault("is no UTF-8 text; save the file in UTF-8")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as problem:
        line = data.count(b"\n", 0, problem.start) + 1
        raise reading.fault(
            "has a character that is not UTF-8; save the file in UTF-8", f"line {line}"
        ) from None
