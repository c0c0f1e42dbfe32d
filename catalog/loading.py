"""Loading tables and sheets into the catalog: many records at once, all or nothing, safe to repeat."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from operator import itemgetter
from typing import TYPE_CHECKING, Any

from catalog.errors import CatalogError
from catalog.guard import check_records
from catalog.merging import merged, same
from catalog.records import Inverter, Module
from catalog.revisions import FAMILY, LOADED, MERGED, Sources, record_row, revision_row
from catalog.rows import id_condition, inputs_rows, read_records

if TYPE_CHECKING:
    from sqlalchemy import Connection, Table
    from sqlmodel import Session

    from catalog.database import Database, Run

#: Tells how many records are done, of how many.
Progress = Callable[[int, int], None]

_CHUNK = 2000


@dataclass(frozen=True, slots=True)
class LoadReport:
    """How many records a load brought, changed, and found as they were."""

    new: int
    changed: int
    unchanged: int


def load(
    database: Database,
    modules: Iterable[Module],
    inverters: Iterable[Inverter],
    created_at: str,
    progress: Progress | None = None,
) -> LoadReport:
    """Load records in one transaction.

    A record is compared with what the same table or sheet (the same source by name) last said of it. If that
    is the same, nothing happens. Otherwise the loaded values become a revision of their own; where people
    amended the record meanwhile, another one follows in which their values are kept (see `catalog.merging`).

    Raises
    ------
    CatalogError
        If a record is impossible, or stands twice. Nothing is loaded then.
    """
    batches: list[tuple[str, Sequence]] = [("module", list(modules)), ("inverter", list(inverters))]
    for _, records in batches:
        _refuse_twins(records)
        check_records(records)
    with database.writing() as (session, run):
        counter = _Counter(sum(len(records) for _, records in batches), progress)
        for kind, records in batches:
            if records:
                _load_kind(session, run, kind, records, created_at, counter)
        return LoadReport(counter.new, counter.changed, counter.unchanged)


class _Counter:
    """Counts what is done, and tells it."""

    def __init__(self, total: int, progress: Progress | None) -> None:
        self.new = self.changed = self.unchanged = 0
        self._total = total
        self._progress = progress

    def tell(self) -> None:
        if self._progress:
            self._progress(self.new + self.changed + self.unchanged, self._total)


def _refuse_twins(records: Iterable[Module | Inverter]) -> None:
    seen = set()
    for record in records:
        key = (record.maker, record.model)
        if key in seen:
            raise CatalogError(
                f"{record.name} stands twice in what is loaded; take one out; nothing was kept"
            )
        seen.add(key)


def _load_kind(
    session: Session, run: Run, kind: str, records: Sequence, created_at: str, counter: _Counter
) -> None:
    rows = run('SELECT r."maker", r."model", r."id" FROM record r WHERE r."kind" = :kind', {"kind": kind})
    known = {(maker, model): id_ for maker, model, id_ in rows}
    next_id = run('SELECT COALESCE(MAX(r."id"), 0) + 1 FROM record r', {})[0][0]
    sources = Sources(session, run, created_at)
    batch = _Batch(session, kind, sources, created_at)

    old = [r for r in records if (r.maker, r.model) in known]
    before = _last_said(run, kind, {r.source.name for r in old})
    changed = []
    for record in old:
        id_ = known[record.maker, record.model]
        said = before[record.source.name].get(id_)
        if said is not None and same(record, said):
            counter.unchanged += 1
        else:
            changed.append((id_, record, said))
    current = _current(run, kind, [id_ for id_, _, _ in changed])
    for id_, record, said in changed:
        if _is_current(record, current[id_]):
            counter.unchanged += 1
            continue
        batch.change(current[id_], record, said)
        counter.changed += 1
    counter.tell()

    for record in records:
        if (record.maker, record.model) not in known:
            batch.add(next_id, record)
            next_id += 1
            counter.new += 1
            if len(batch) >= _CHUNK:
                batch.flush()
                counter.tell()
    batch.flush()
    counter.tell()


def _is_current(record: Module | Inverter, current: Module | Inverter) -> bool:
    """Whether a record says what counts already, sources included: an export that comes back."""
    return record.source == current.source and same(record, current)


def _last_said(run: Run, kind: str, families: Iterable[str]) -> dict[str, dict[int, Any]]:
    """What each table or sheet last said, by its name and the record's id."""
    return {
        family: {r.id: r for r in read_records(run, kind, FAMILY[kind], {"family": family})}
        for family in families
    }


def _current(run: Run, kind: str, ids: Sequence[int]) -> dict[int, Any]:
    found = {}
    for start in range(0, len(ids), _CHUNK):
        condition = f'v."revision" = r."current" AND {id_condition(ids[start : start + _CHUNK])}'
        found |= {r.id: r for r in read_records(run, kind, condition)}
    return found


class _Batch:
    """Rows to insert, by table."""

    def __init__(self, session: Session, kind: str, sources: Sources, created_at: str) -> None:
        self._session = session
        self._kind = kind
        self._sources = sources
        self._created_at = created_at
        self._records: list[dict[str, Any]] = []
        self._revisions: list[dict[str, Any]] = []
        self._inputs: list[dict[str, Any]] = []
        self._moved: list[dict[str, Any]] = []

    def __len__(self) -> int:
        return len(self._revisions)

    def add(self, id_: int, record: Module | Inverter) -> None:
        """A new record with its first revision."""
        self._records.append(record_row(self._kind, id_, record))
        self._revise(id_, 1, None, LOADED, record)

    def change(self, current: Any, record: Any, before: Any | None) -> None:
        """What the table says now; and, where that is not all that counts, what counts."""
        number = current.revision + 1
        counts = merged(current, record, before)
        alone = counts.source == record.source and same(counts, record)
        previous = current.revision if alone or before is None else before.revision
        self._revise(current.id, number, previous, LOADED, record)
        if not alone:
            number += 1
            self._revise(current.id, number, current.revision, MERGED, counts, act_source=record.source)
        self._moved.append({"id_": current.id, "number": number})

    def flush(self) -> None:
        """Insert what has gathered."""
        from sqlalchemy import bindparam, update

        from catalog.tables import REVISION_ROWS, InputsRow, RecordRow

        connection = self._session.connection()
        for table, rows in (
            (RecordRow, self._records),
            (REVISION_ROWS[self._kind], self._revisions),
            (InputsRow, self._inputs),
        ):
            if rows:
                _insert(connection, table.__table__, rows)
                rows.clear()
        if self._moved:
            table = RecordRow.__table__
            statement = (
                update(table).where(table.c.id == bindparam("id_")).values(current=bindparam("number"))
            )
            connection.execute(statement, self._moved)
            self._moved.clear()

    def _revise(
        self,
        id_: int,
        number: int,
        previous: int | None,
        act: str,
        record: Any,
        act_source: Any | None = None,
    ) -> None:
        row = revision_row(
            id_,
            number,
            record,
            self._sources,
            previous=previous,
            act=act,
            act_source=act_source,
            created_at=self._created_at,
        )
        self._revisions.append(row)
        if self._kind == "inverter":
            self._inputs += inputs_rows(id_, number, record.inputs)


def _insert(connection: Connection, table: Table, rows: Sequence[dict[str, Any]]) -> None:
    """Insert rows, all with the same columns; to a driver that takes them by position, straight as tuples."""
    from sqlalchemy import insert

    statement = insert(table)
    if not connection.dialect.positional:
        connection.execute(statement, rows)
        return
    compiled = statement.compile(dialect=connection.dialect, column_keys=list(rows[0]))
    connection.exec_driver_sql(str(compiled), list(map(itemgetter(*compiled.positiontup), rows)))
