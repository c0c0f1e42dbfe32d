"""Values that a person gives for all records of a file which state none."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

from catalog.errors import CatalogError
from catalog.inputs_text import parse_inputs
from catalog.records import FieldSpec, Inputs, Origin, names_cells, specs
from catalog.sheet_entries import ABOUT, KINDS, fields_of
from catalog.sheet_needs import what_is_needed
from catalog.sheet_reading import Entry, Reading, nearest
from catalog.sheet_values import DecimalSigns, value_of


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
        _check(name, reading.given[name], kinds)
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


def _check(name: str, text: str, kinds: Iterable[str]) -> None:
    """Refuse a value that cannot be, before it is told of the first row that it would stand in."""
    spec = _spec(name, kinds)
    if not any(c.isalnum() for c in text):
        want = what_is_needed(spec) if spec else "what the datasheets say"
        raise CatalogError(f"--set {name}={text}: says nothing; write {want}")
    if spec is None:
        return
    try:
        value_of(text, spec, DecimalSigns())
    except CatalogError as problem:
        raise CatalogError(f"--set {name}: {problem}") from None
    if name == "technology" and not names_cells(text):
        raise CatalogError(f"--set technology={text}: names no kind of cell; write the {what_is_needed(spec)}")


def _spec(name: str, kinds: Iterable[str]) -> FieldSpec | None:
    return next((specs(KINDS[kind])[name] for kind in kinds if name in specs(KINDS[kind])), None)


def _given_inputs(text: str) -> tuple[Inputs, ...]:
    try:
        return parse_inputs(text)
    except CatalogError as problem:
        raise CatalogError(f"--set inputs: {problem}") from None
