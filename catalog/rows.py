"""Records from rows of the database, and rows from records.

The SQL for reading is made from the same field lists as the tables. It is kept to what SQLite and PostgreSQL
both understand; every column is qualified and quoted.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from operator import attrgetter
from typing import TYPE_CHECKING, Any

from catalog.errors import CatalogError
from catalog.records import Inputs, Inverter, Module, Origin, Site, Source, specs

if TYPE_CHECKING:
    from catalog.database import Run

RECORD_TYPES: Mapping[str, type[Module] | type[Inverter]] = {"module": Module, "inverter": Inverter}

#: The revision that counts; a condition on ``r`` (record) and ``v`` (its revisions).
CURRENT = 'v."revision" = r."current"'


@dataclass(frozen=True, slots=True)
class RevisionRow:
    """What the catalog notes of a revision beside its values; see `catalog.tables.RevisionBase`."""

    revision: int
    previous: int | None
    act: str
    source: Source
    created_at: str
    note: str


def kind_of(record: Module | Inverter) -> str:
    """Kind of a record, "module" or "inverter"."""
    return "module" if isinstance(record, Module) else "inverter"


def checked_kind(kind: str) -> str:
    """The kind as it is, if there is such a kind."""
    if kind not in RECORD_TYPES:
        raise CatalogError(f"there is no kind {kind!r} of record: it is module or inverter")
    return kind


@cache
def value_names(kind: str) -> tuple[str, ...]:
    """Fields of a kind that are columns of its revisions."""
    return tuple(name for name in specs(RECORD_TYPES[kind]) if name not in ("maker", "model"))


@cache
def content_names(kind: str) -> tuple[str, ...]:
    """Fields of a kind that have an origin: the values, and an inverter's inputs."""
    return value_names(kind) + (("inputs",) if kind == "inverter" else ())


def read_records(run: Run, kind: str, where: str = CURRENT, params: dict[str, Any] | None = None) -> list:
    """Records of a kind, by id and revision.

    Parameters
    ----------
    run : Run
        Runs the statements, all within one transaction.
    kind : {"module", "inverter"}
        What to read.
    where : str
        Which revisions: a condition on ``r`` (record) and ``v`` (its revisions).
    params : dict, optional
        Parameters of the condition.
    """
    names = value_names(kind)
    columns = ", ".join(f'v."{name}"' for name in names)
    params = {"kind": kind} | (params or {})
    origin = f'{_from(kind)} WHERE r."kind" = :kind AND {where}'
    rows = run(
        'SELECT r."id", v."revision", r."maker", r."model", v."source_id", v."origins", v."sources",'
        f' {columns} FROM {origin} ORDER BY r."id", v."revision"',
        params,
    )
    if not rows:
        return []
    inputs = _read_inputs(run, where, params) if kind == "inverter" else None
    try:
        return _records(kind, rows, read_sources(run), inputs)
    except (LookupError, ValueError, TypeError, AttributeError) as error:
        raise CatalogError(
            f"the catalog is damaged, some {kind}s cannot be read:"
            " bring back a copy with 'ferrule sheet restore'"
        ) from error


def read_sources(run: Run) -> dict[int, Source]:
    """All sources by id."""
    rows = run('SELECT s."id", s."name", s."revision" FROM source s', {})
    return {id_: Source(name, revision) for id_, name, revision in rows}


def read_revision_rows(run: Run, kind: str, id_: int) -> list[RevisionRow]:
    """What is noted of all revisions of one record, oldest first."""
    rows = run(
        'SELECT v."revision", v."previous", v."act", s."name", s."revision", v."created_at", v."note"'
        f' FROM {kind}_revision v JOIN source s ON s."id" = v."act_source_id" WHERE v."record_id" = :id'
        ' ORDER BY v."revision"',
        {"id": id_},
    )
    return [
        RevisionRow(revision, previous, act, Source(name, source_revision), created_at, note)
        for revision, previous, act, name, source_revision, created_at, note in rows
    ]


def read_sites(run: Run) -> list[Site]:
    """All sites by name."""
    names = site_names()
    columns = ", ".join(f't."{name}"' for name in names)
    rows = run(f'SELECT {columns} FROM site t ORDER BY t."name_key"', {})
    return [Site(**dict(zip(names, row, strict=True))) for row in rows]


@cache
def site_names() -> tuple[str, ...]:
    """Fields of a site that are columns."""
    return (*specs(Site), "mounting")


def id_condition(ids: Iterable[int]) -> str:
    """Condition that a record is one of some."""
    listed = ", ".join(str(int(id_)) for id_ in ids)
    return f'r."id" IN ({listed})' if listed else "1 = 0"


def values_of(kind: str, record: Module | Inverter) -> dict[str, Any]:
    """Columns of a revision that hold values."""
    return dict(zip(value_names(kind), _values(kind)(record), strict=True))


@cache
def _values(kind: str) -> Callable[[Any], tuple]:
    return attrgetter(*value_names(kind))


def inputs_rows(record_id: int, revision: int, inputs: Sequence[Inputs]) -> list[dict[str, Any]]:
    """Rows of an inverter's inputs."""
    names = tuple(specs(Inputs))
    return [
        {"record_id": record_id, "revision": revision, "position": position}
        | {name: getattr(group, name) for name in names}
        for position, group in enumerate(inputs)
    ]


@cache
def _from(kind: str) -> str:
    return f'record r JOIN {kind}_revision v ON v."record_id" = r."id"'


def _read_inputs(run: Run, where: str, params: dict[str, Any]) -> dict[tuple[int, int], tuple[Inputs, ...]]:
    """Inputs by record and revision; like groups are one object."""
    names = tuple(specs(Inputs))
    columns = ", ".join(f'i."{name}"' for name in names)
    rows = run(
        f'SELECT v."record_id", v."revision", {columns} FROM {_from("inverter")}'
        ' JOIN inputs i ON i."record_id" = v."record_id" AND i."revision" = v."revision"'
        f' WHERE r."kind" = :kind AND {where} ORDER BY v."record_id", v."revision", i."position"',
        params,
    )
    groups: dict[tuple, Inputs] = {}
    found: dict[tuple[int, int], tuple[Inputs, ...]] = {}
    for record_id, revision, *values in rows:
        key = tuple(values)
        group = groups.get(key) or groups.setdefault(key, Inputs(**dict(zip(names, values, strict=True))))
        found[record_id, revision] = (*found.get((record_id, revision), ()), group)
    return found


def _records(
    kind: str,
    rows: Sequence[Sequence[Any]],
    sources: Mapping[int, Source],
    inputs: Mapping[tuple[int, int], tuple[Inputs, ...]] | None,
) -> list:
    record_type = RECORD_TYPES[kind]
    names = ("id", "revision", "maker", "model", *value_names(kind))
    flags = [name for name, spec in specs(record_type).items() if spec.type is bool]
    origins: dict[str, dict[str, Origin]] = {}
    own_sources: dict[str, dict[str, Source]] = {}
    records = []
    for row in rows:
        source_id, origins_text, sources_text = row[4:7]
        if origins_text not in origins:
            origins[origins_text] = {k: Origin(v) for k, v in json.loads(origins_text).items()}
        if sources_text not in own_sources:
            own_sources[sources_text] = {k: sources[v] for k, v in json.loads(sources_text).items()}
        values = dict(zip(names, (*row[:4], *row[7:]), strict=True))
        for name in flags:
            values[name] = bool(values[name])
        if inputs is not None:
            values["inputs"] = inputs[row[0], row[1]]
        records.append(
            record_type(
                source=sources[source_id],
                origins=origins[origins_text],
                sources=own_sources[sources_text],
                **values,
            )
        )
    return records
