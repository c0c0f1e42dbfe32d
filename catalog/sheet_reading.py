"""What is gathered while a file of datasheets is read: entries, notes, and the place of every error."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from catalog.errors import CatalogError
from catalog.sheet_values import DecimalSigns


@dataclass(frozen=True, slots=True)
class Entry:
    """One record as a file has it: where it stands there, its kind, and its cells by field name.

    ``meant`` holds names of the file that are not known, by the field that they may mean; ``units`` the unit of a
    field's number where it is another one than the field's. ``fault`` says why its cells could not be taken apart;
    then it is no record.
    """

    where: str
    kind: str
    cells: Mapping[str, Any]
    meant: Mapping[str, str] = field(default_factory=dict)
    units: Mapping[str, str] = field(default_factory=dict)
    fault: str = ""


@dataclass(slots=True)
class Reading:
    """What is gathered while one file is read.

    ``given`` holds values that a person gives for all records of the file that state none.
    """

    path: Path
    given: Mapping[str, str] = field(default_factory=dict)
    notes: list[str] = field(default_factory=list)
    signs: DecimalSigns = field(default_factory=DecimalSigns)

    def fault(self, message: object, *place: str) -> CatalogError:
        """Error with file and place before its message."""
        return CatalogError(f"{', '.join((str(self.path), *filter(None, place)))}: {message}")

    def note(self, message: str, *place: str) -> None:
        """Keep a note with its place."""
        self.notes.append(f"{', '.join((str(self.path), *filter(None, place)))}: {message}")

    def unknown(
        self, names: Sequence[str], known: Sequence[str], what: str, place: str = ""
    ) -> dict[str, str]:
        """Note names that are not known; return the likely meant ones, by what was meant."""
        meant = {}
        for name in names:
            near = nearest(name, known)
            if near:
                meant[near] = name
            hint = f"; did you mean {near}?" if near else ""
            self.note(f"{what} {name!r} is not known and was left out{hint}", place)
        return meant


def nearest(name: str, known: Sequence[str]) -> str | None:
    """The known field name that a text most likely means; ``None`` if none is near."""
    from rapidfuzz import fuzz, process, utils

    found = process.extractOne(
        name, known, scorer=fuzz.ratio, processor=utils.default_process, score_cutoff=70
    )
    return found[0] if found else None
