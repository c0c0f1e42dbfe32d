"""The history of a record: from which document, what, and when."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from typing import TYPE_CHECKING, Any

from catalog.records import Origin, Source
from catalog.revisions import UNDONE, current_record
from catalog.rows import content_names, kind_of, read_records, read_revision_rows

if TYPE_CHECKING:
    from catalog.database import Run


@dataclass(frozen=True, slots=True)
class Change:
    """One field that a revision changed."""

    field: str
    old: Any
    new: Any
    origin: Origin | None
    source: Source | None


@dataclass(frozen=True, slots=True)
class Revision:
    """One entry of a record's history: from which document, what, and when.

    ``act`` is loaded, entered, amended, merged or undone. ``changes`` compares it with revision ``previous``.
    """

    number: int
    previous: int | None
    act: str
    created_at: datetime
    source: Source
    note: str
    changes: tuple[Change, ...]


def history(run: Run, kind: str, id_: int) -> list[Revision]:
    """All revisions of a record, oldest first."""
    records = {r.revision: r for r in read_records(run, kind, 'r."id" = :id', {"id": id_})}
    if not records:
        current_record(run, kind, id_)
    found = []
    for row in read_revision_rows(run, kind, id_):
        # An undone revision differs from the one before it in number, whatever a next undo would go back to.
        base = row.revision - 1 if row.act == UNDONE else row.previous
        found.append(
            Revision(
                row.revision,
                row.previous,
                row.act,
                datetime.fromisoformat(row.created_at),
                row.source,
                row.note,
                _changes(records.get(base), records[row.revision]),
            )
        )
    return found


def _changes(old: Any | None, new: Any) -> tuple[Change, ...]:
    changes = []
    for name in content_names(kind_of(new)):
        was, is_ = getattr(old, name, None), getattr(new, name)
        differs = was != is_
        if old is not None and not differs:
            differs = (old.origins.get(name), old.source_of(name).name) != (
                new.origins.get(name),
                new.source_of(name).name,
            ) and is_ is not None
        if differs:
            source = None if is_ is None else new.source_of(name)
            changes.append(Change(name, was, is_, new.origin(name), source))
    return tuple(changes)
