"""Revisions: how a record came to be what it is. An edit adds one; none is ever changed or taken away."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from catalog.errors import CatalogError
from catalog.guard import check_records, checked_field, checked_value
from catalog.merging import same
from catalog.records import Inputs, Inverter, Module, Origin, Source, specs
from catalog.rows import (
    inputs_rows,
    kind_of,
    read_records,
    read_revision_rows,
    read_sources,
    values_of,
)

if TYPE_CHECKING:
    from sqlmodel import Session

    from catalog.database import Run

# How a revision came about.
LOADED = "loaded"  # what a table or sheet says, as it says it
ENTERED = "entered"  # a record that a person entered
AMENDED = "amended"  # some values by a person
MERGED = "merged"  # a loaded revision with the values that were amended before
UNDONE = "undone"  # the values of an earlier revision again

_OWN = f"('{LOADED}', '{ENTERED}')"


def _family_condition(kind: str) -> str:
    sources = 'SELECT s."id" FROM source s WHERE s."name" = :family'
    latest = (
        f'SELECT MAX(w."revision") FROM {kind}_revision w WHERE w."record_id" = r."id"'
        f' AND w."act" IN {_OWN} AND w."source_id" IN ({sources})'
    )
    return f'v."revision" = ({latest})'


#: By kind: the condition of the latest revisions in which one document (``:family``, its name) speaks for
#: itself.
FAMILY: Mapping[str, str] = {kind: _family_condition(kind) for kind in ("module", "inverter")}


class Sources:
    """Ids of sources; new ones are added."""

    def __init__(self, session: Session, run: Run, created_at: str) -> None:
        self._session = session
        self._created_at = created_at
        self._ids = {source: id_ for id_, source in read_sources(run).items()}
        self._next = max(self._ids.values(), default=0) + 1

    def id_of(self, source: Source) -> int:
        """Id of a source."""
        if source not in self._ids:
            from sqlalchemy import insert

            from catalog.tables import SourceRow

            row = {"id": self._next, "name": source.name, "revision": source.revision}
            self._session.connection().execute(insert(SourceRow), [row | {"first_seen": self._created_at}])
            self._ids[source] = self._next
            self._next += 1
        return self._ids[source]


def record_row(kind: str, id_: int, record: Module | Inverter) -> dict[str, Any]:
    """Row of a record whose first revision counts."""
    return {"id": id_, "kind": kind, "maker": record.maker, "model": record.model, "current": 1}


def revision_row(
    id_: int,
    number: int,
    record: Module | Inverter,
    sources: Sources,
    *,
    previous: int | None,
    act: str,
    created_at: str,
    act_source: Source | None = None,
    note: str = "",
) -> dict[str, Any]:
    """Row of revision ``number`` of the record with an id."""
    source_id = sources.id_of(record.source)
    return {
        "record_id": id_,
        "revision": number,
        "previous": previous,
        "act": act,
        "source_id": source_id,
        "act_source_id": source_id if act_source is None else sources.id_of(act_source),
        "created_at": created_at,
        "note": note,
        "origins": _compact({name: str(origin) for name, origin in record.origins.items()}),
        "sources": _compact({name: sources.id_of(source) for name, source in record.sources.items()}),
    } | values_of(kind_of(record), record)


def current_record(run: Run, kind: str, id_: int, revision: int | None = None) -> Any:
    """A record as it counts now, or as it was at a revision.

    Raises
    ------
    CatalogError
        If there is no such record or revision.
    """
    which = 'r."current"' if revision is None else ":revision"
    found = read_records(
        run, kind, f'r."id" = :id AND v."revision" = {which}', {"id": id_, "revision": revision}
    )
    if found:
        return found[0]
    if revision is not None:
        latest = current_record(run, kind, id_).revision
        raise CatalogError(f"{kind} {id_} has no revision {revision}: its revisions are 1 to {latest}")
    raise CatalogError(
        f"the catalog holds no {kind} with the id {id_}: 'ferrule sheet find' shows names and ids"
    )


def enter(session: Session, run: Run, record: Module | Inverter, created_at: str, note: str = "") -> int:
    """Add a record that a person entered; returns its id.

    Raises
    ------
    CatalogError
        If it is impossible, or its name is taken.
    """
    check_records([record])
    kind = kind_of(record)
    rows = run('SELECT r."id", r."maker", r."model" FROM record r WHERE r."kind" = :kind', {"kind": kind})
    for id_, maker, model in rows:
        if f"{maker} {model}".casefold() == record.name.casefold():
            raise CatalogError(
                f"{maker} {model} is in the catalog already: change it with 'ferrule sheet amend'"
            )
    id_ = run('SELECT COALESCE(MAX(r."id"), 0) + 1 FROM record r', {})[0][0]
    _insert("record", session, [record_row(kind, id_, record)])
    _add(session, run, replace(record, id=id_, revision=1), None, ENTERED, created_at, note=note)
    return id_


def amend(
    session: Session,
    run: Run,
    kind: str,
    id_: int,
    changes: Mapping[str, Any],
    source: Source,
    created_at: str,
    *,
    note: str = "",
    expected: int | None = None,
) -> None:
    """Give some values of a record anew; see `catalog.store.Catalog.amend`."""
    current = _expected(current_record(run, kind, id_), expected)
    values = {checked_field(kind, name): _checked(kind, name, value) for name, value in changes.items()}
    origins = dict(current.origins) | dict.fromkeys(values, Origin.ENTERED)
    own = {name: s for name, s in current.sources.items() if name not in values}
    if source != current.source:
        own |= dict.fromkeys(values, source)
    amended = replace(current, **values, origins=origins, sources=own, revision=current.revision + 1)
    check_records([amended])
    if not same(amended, current):
        _add(session, run, amended, current.revision, AMENDED, created_at, act_source=source, note=note)


def undo(
    session: Session, run: Run, kind: str, id_: int, created_at: str, *, expected: int | None = None
) -> None:
    """Make what counted before count again; see `catalog.store.Catalog.undo`."""
    current = _expected(current_record(run, kind, id_), expected)
    rows = {row.revision: row for row in read_revision_rows(run, kind, id_)}
    back_to = rows[current.revision].previous
    if back_to is None:
        raise CatalogError(f"{current.name} has no earlier revision to go back to")
    restored = replace(current_record(run, kind, id_, back_to), revision=current.revision + 1)
    # A next undo goes on to what counted before that.
    previous = rows[back_to].previous
    note = f"back to revision {back_to}"
    _add(session, run, restored, previous, UNDONE, created_at, act_source=rows[back_to].source, note=note)


def _expected(current: Any, expected: int | None) -> Any:
    if expected is not None and current.revision != expected:
        raise CatalogError(
            f"{current.name} was changed by someone else meanwhile (revision {current.revision}, you saw"
            f" {expected}): look at it again with 'ferrule sheet history', then repeat; nothing was changed"
        )
    return current


def _checked(kind: str, name: str, value: Any) -> Any:
    if name == "inputs":
        groups = tuple(value) if isinstance(value, Iterable) else ()
        if not groups or not all(isinstance(group, Inputs) for group in groups):
            raise CatalogError("inputs: at least one group of trackers is wanted")
        return groups
    return checked_value(specs(Module if kind == "module" else Inverter)[name], value)


def _add(
    session: Session,
    run: Run,
    record: Any,
    previous: int | None,
    act: str,
    created_at: str,
    *,
    act_source: Source | None = None,
    note: str = "",
) -> None:
    """Insert a revision and let it count."""
    from sqlalchemy import update

    from catalog.tables import RecordRow

    kind = kind_of(record)
    sources = Sources(session, run, created_at)
    row = revision_row(
        record.id,
        record.revision,
        record,
        sources,
        previous=previous,
        act=act,
        created_at=created_at,
        act_source=act_source,
        note=note,
    )
    _insert(f"{kind}_revision", session, [row])
    if kind == "inverter":
        _insert("inputs", session, inputs_rows(record.id, record.revision, record.inputs))
    table = RecordRow.__table__
    session.connection().execute(update(table).where(table.c.id == record.id).values(current=record.revision))


def _insert(table: str, session: Session, rows: list[dict[str, Any]]) -> None:
    from sqlalchemy import insert

    from catalog.tables import SQLModel

    session.connection().execute(insert(SQLModel.metadata.tables[table]), rows)


def _compact(value: Mapping[str, Any]) -> str:
    if not value:
        return "{}"
    return json.dumps(value, sort_keys=True, separators=(",", ":"))
