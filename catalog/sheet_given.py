"""Values that a person gives for all records of a file which state none."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from catalog.errors import CatalogError
from catalog.inputs_text import parse_inputs
from catalog.records import Inputs, Origin
from catalog.sheet_entries import ABOUT, fields_of
from catalog.sheet_reading import Entry, Reading, nearest


def completed(entries: Sequence[Entry], reading: Reading) -> list[Entry]:
    """Entries with the values that a person gives for all of them, where they state none; marked as entered."""
    kinds = {entry.kind for entry in entries}
    for name in reading.given:
        known = [*dict.fromkeys(n for kind in sorted(kinds) for n in fields_of(kind))]
        if name not in known:
            near = nearest(name, known)
            raise CatalogError(
                f"--set {name}: there is no such field" + (f"; did you mean {near}?" if near else "")
            )
    found = []
    for entry in entries:
        cells = dict(entry.cells)
        units = dict(entry.units)
        marked = cells.get(Origin.ENTERED.value) or []
        for name, text in reading.given.items():
            if name in fields_of(entry.kind) and cells.get(name) in (None, "", [], ()):
                cells[name] = _given_inputs(text) if name == "inputs" else text
                units.pop(name, None)
                if name not in ("maker", "model", *ABOUT):
                    marked = [*marked, name]
        if marked:
            cells[Origin.ENTERED.value] = marked
        found.append(replace(entry, cells=cells, units=units))
    return found


def _given_inputs(text: str) -> tuple[Inputs, ...]:
    try:
        return parse_inputs(text)
    except CatalogError as problem:
        raise CatalogError(f"--set inputs: {problem}") from None
