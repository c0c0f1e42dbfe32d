"""Files of datasheets that a person can read and edit: CSV and TOML, to records and back.

The ending of the file decides the form; the forms are described in `catalog.sheets_csv` and
`catalog.sheets_toml`, the fields in `catalog.records`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from catalog import sheets_csv, sheets_toml
from catalog.errors import CatalogError
from catalog.records import Inverter, Module
from catalog.sheet_entries import records_of
from catalog.sheet_reading import Reading

ENDINGS = (".csv", ".toml")


@dataclass(frozen=True, slots=True)
class SheetFile:
    """What a file holds: records, and notes on what was left out, assumed, or is odd (one line each)."""

    modules: list[Module]
    inverters: list[Inverter]
    notes: list[str]


def read_sheets(path: str | Path) -> SheetFile:
    """Read the datasheets of a CSV or TOML file.

    Parameters
    ----------
    path : str or Path

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
    reading = Reading(path)
    text = _text(path, reading)
    form = sheets_toml if ending == ".toml" else sheets_csv
    records = records_of(form.read_entries(text, reading), reading)
    if not records:
        raise reading.fault("has a heading and no rows; enter at least one module or inverter")
    modules = [r for r in records if isinstance(r, Module)]
    return SheetFile(modules, [r for r in records if isinstance(r, Inverter)], reading.notes)


def write_sheets(path: str | Path, modules: Sequence[Module], inverters: Sequence[Inverter]) -> None:
    """Write datasheets to a CSV or TOML file; `read_sheets` reads it back without loss.

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
    write = sheets_toml.write_toml if ending == ".toml" else sheets_csv.write_csv
    try:
        write(path, [*modules, *inverters])
    except OSError as problem:
        raise CatalogError(f"{path}: cannot be written ({problem.strerror}); name another file") from None


def _ending(path: Path, verb: str) -> str:
    ending = path.suffix.casefold()
    if ending not in ENDINGS:
        raise CatalogError(f"{path}: Ferrule {verb} datasheets in files that end in {' or '.join(ENDINGS)}")
    return ending


def _text(path: Path, reading: Reading) -> str:
    try:
        data = path.read_bytes()
    except OSError as problem:
        raise CatalogError(f"{path}: cannot be read ({problem.strerror}); check the path") from None
    if not data.strip():
        raise reading.fault("is empty; enter at least one module or inverter")
    if data.startswith((b"\xff\xfe", b"\xfe\xff")) or b"\0" in data:
        raise reading.fault("is no UTF-8 text; save the file in UTF-8")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as problem:
        line = data.count(b"\n", 0, problem.start) + 1
        raise reading.fault(
            "has a character that is not UTF-8; save the file in UTF-8", f"line {line}"
        ) from None
