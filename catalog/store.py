"""The catalog: what is known of modules, inverters and sites, kept in one place.

    with Catalog.open("catalog.sqlite", create=True) as catalog:
        catalog.load(modules, inverters)
        module = catalog.module(17)
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import UTC, datetime
from pathlib import Path
from types import TracebackType
from typing import TYPE_CHECKING, Any

from catalog import history, revisions, schema, sitelist
from catalog.database import Database, open_database
from catalog.loading import LoadReport, Progress, load
from catalog.records import Inverter, Module, Site, Source
from catalog.rows import CURRENT, RECORD_TYPES, checked_kind, id_condition, kind_of, read_records, read_sites

if TYPE_CHECKING:
    from catalog.names import Named, NameIndex
    from catalog.where import Condition
    from catalog.stock import StockItem

#: How many computed things are kept; the oldest give way.
_KEPT = 200

#: Keys of what people said begin so; it does not give way.
SAID = "said/"


class Catalog:
    """An open catalog. Changes are made at once, each in a transaction of its own."""

    def __init__(self, database: Database) -> None:
        self._database = database

    @classmethod
    def open(cls, location: str | Path, *, create: bool = False, readonly: bool = False) -> Catalog:
        """Open a catalog; use it as a context manager, or `close` it.

        Parameters
        ----------
        location : str or Path
            A file, or a URL such as ``postgresql+psycopg://user@host/name``.
        create : bool
            Make the catalog if it does not exist.
        readonly : bool
            Change nothing, also not by mistake.

        Raises
        ------
        CatalogError
            If it does not exist, is no catalog, is damaged, or of a newer Ferrule.
        """
        database = open_database(location, create=create, readonly=readonly)
        try:
            schema.ensure(database, create=create)
        except BaseException:
            database.close()
            raise
        return cls(database)

    def close(self) -> None:
        """Let go of the file or connection."""
        self._database.close()

    def __enter__(self) -> Catalog:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    # Records

    def modules(self, ids: Iterable[int] | None = None) -> list[Module]:
        """Modules as they count now: all of them, or those of some ids, by id."""
        return self._records("module", ids)

    def inverters(self, ids: Iterable[int] | None = None) -> list[Inverter]:
        """Inverters as they count now: all of them, or those of some ids, by id."""
        return self._records("inverter", ids)

    def module(self, id_: int, revision: int | None = None) -> Module:
        """A module as it counts now, or as it was at a revision.

        Raises
        ------
        CatalogError
            If there is no such record or revision.
        """
        with self._database.reading() as run:
            return revisions.current_record(run, "module", id_, revision)

    def inverter(self, id_: int, revision: int | None = None) -> Inverter:
        """An inverter as it counts now, or as it was at a revision; raises as `module` does."""
        with self._database.reading() as run:
            return revisions.current_record(run, "inverter", id_, revision)

    def names(self, kind: str) -> list[Named]:
        """Names of all records of a kind ("module" or "inverter"), by id."""
        from catalog.names import Named

        sql = 'SELECT r."id", r."maker", r."model" FROM record r WHERE r."kind" = :kind ORDER BY r."id"'
        with self._database.reading() as run:
            return [Named(*row) for row in run(sql, {"kind": checked_kind(kind)})]

    def matching(self, kind: str, condition: Condition) -> list[int]:
        """Ids of the records of a kind that meet a condition (see `catalog.where`), by maker and model."""
        sql = (
            f'SELECT r."id" FROM record r JOIN {checked_kind(kind)}_revision v ON v."record_id" = r."id"'
            f' WHERE r."kind" = :kind AND {CURRENT} AND {condition.sql} ORDER BY r."maker", r."model", r."id"'
        )
        with self._database.reading() as run:
            return [id_ for (id_,) in run(sql, {"kind": kind} | condition.params)]

    def load(
        self, modules: Iterable[Module], inverters: Iterable[Inverter], progress: Progress | None = None
    ) -> LoadReport:
        """Load records in one transaction: all or nothing, and safe to repeat.

        Parameters
        ----------
        modules, inverters : iterable
            Records; their id and revision do not matter.
        progress : callable, optional
            Called with the number of records done and their total.

        Raises
        ------
        CatalogError
            If a record is impossible or stands twice; nothing is loaded then.
        """
        return load(self._database, modules, inverters, _now(), progress)

    # Revisions

    def enter(self, record: Module | Inverter, note: str = "") -> Module | Inverter:
        """Add a record that a person entered, and return it with its id.

        Raises
        ------
        CatalogError
            If it is impossible, or a record of that name exists.
        """
        with self._database.writing() as (session, run):
            id_ = revisions.enter(session, run, record, _now(), note)
            return revisions.current_record(run, kind_of(record), id_)

    def amend(
        self,
        kind: str,
        id_: int,
        changes: Mapping[str, Any],
        source: Source,
        *,
        note: str = "",
        expected: int | None = None,
    ) -> Module | Inverter:
        """Give some values of a record anew, as a new revision; the others stay as they count at this moment.

        Parameters
        ----------
        kind : {"module", "inverter"}
            Of which kind the record is.
        id_ : int
            Its id.
        changes : mapping
            Values by field; ``None`` takes a value away. ``inputs`` is a list of `Inputs`.
        source : Source
            The document that the values were read from. They are of the origin ``entered``.
        note : str
            A remark for the history.
        expected : int, optional
            The revision that the change was decided on; if another one counts by now, it is refused.

        Returns
        -------
        Module or Inverter
            The record as it counts now.

        Raises
        ------
        CatalogError
            If there is no such record or field, the result is impossible, or the revision is not the expected
            one.
        """
        with self._database.writing() as (session, run):
            revisions.amend(
                session, run, checked_kind(kind), id_, changes, source, _now(), note=note, expected=expected
            )
            return revisions.current_record(run, kind, id_)

    def undo(self, kind: str, id_: int, *, expected: int | None = None) -> Module | Inverter:
        """Make what counted before the last change count again, as a new revision; return the record.

        Repeated, it goes further back. A load is undone as a whole. ``expected`` is as in `amend`.

        Raises
        ------
        CatalogError
            If there is no such record, or nothing before.
        """
        with self._database.writing() as (session, run):
            revisions.undo(session, run, checked_kind(kind), id_, _now(), expected=expected)
            return revisions.current_record(run, kind, id_)

    def history(self, kind: str, id_: int) -> list[history.Revision]:
        """All revisions of a record, oldest first, each with the fields that it changed.

        Raises
        ------
        CatalogError
            If there is no such record.
        """
        with self._database.reading() as run:
            return history.history(run, checked_kind(kind), id_)

    # Sites

    def sites(self) -> list[Site]:
        """All sites by name."""
        with self._database.reading() as run:
            return read_sites(run)

    def site(self, name: str) -> Site:
        """The site of a name, whatever its case.

        Raises
        ------
        CatalogError
            If there is none; the nearest names are told.
        """
        return sitelist.site_of(self.sites(), name)

    def add_site(self, site: Site, *, replace: bool = False) -> None:
        """Keep a site; with ``replace``, in the place of one with the same name.

        Raises
        ------
        CatalogError
            If its values are impossible, or the name is taken.
        """
        with self._database.writing() as (session, _):
            sitelist.add(session, site, replace=replace)

    def drop_site(self, name: str) -> None:
        """Forget a site; raises as `site` does."""
        with self._database.writing() as (session, run):
            sitelist.drop(session, run, name)

    # Stock

    def stock(self) -> list[StockItem]:
        """All lines of the stock lists that are kept, in their order."""
        from catalog.stock import read_stock

        with self._database.reading() as run:
            return read_stock(run)

    def load_stock(self, items: Iterable[StockItem], *, add: bool = False) -> list[StockItem]:
        """Match the articles of a list to records, and keep the list in one transaction; return it as it is kept.

        It takes the place of all that was in stock; with ``add`` only of the same articles in the same places.
        """
        from catalog.stock import keep_list, matched, read_decisions

        names = self.name_indexes()
        with self._database.reading() as run:
            decisions = read_decisions(run)
        items = matched(items, names, decisions)
        with self._database.writing() as (session, run):
            keep_list(session, run, items, _now(), add=add)
        return items

    def match_waiting(self) -> list[StockItem]:
        """Match the articles that wait for a decision once more, as records may have come since; return the matched."""
        from catalog.stock import keep_matches, matched, read_decisions

        waiting = {item.id: item for item in self.stock() if item.open}
        if not waiting:
            return []
        names = self.name_indexes()
        with self._database.reading() as run:
            decisions = read_decisions(run)
        changed = [i for i in matched(waiting.values(), names, decisions) if i.confidence != waiting[i.id].confidence]
        if changed:
            with self._database.writing() as (session, _):
                keep_matches(session, changed)
        return [item for item in changed if not item.open]

    def decide_stock(self, item: StockItem, record: tuple[str, int] | None) -> int:
        """Keep which record (kind, id) an article means, ``None`` for none; see `catalog.stock.keep_decision`."""
        from catalog.stock import keep_decision

        with self._database.writing() as (session, run):
            return keep_decision(session, run, item, record, _now())

    def name_indexes(self) -> dict[str, NameIndex]:
        """Names of each kind as an index, for resolving many texts."""
        from catalog.names import NameIndex

        return {kind: NameIndex(self.names(kind)) for kind in RECORD_TYPES}

    # What was computed

    def kept(self, key: str) -> bytes | None:
        """Something computed that was kept; ``None`` if it was not."""
        with self._database.reading() as run:
            rows = run('SELECT k."data" FROM kept k WHERE k."key" = :key', {"key": key})
        return bytes(rows[0][0]) if rows else None

    def keep(self, key: str, data: bytes) -> bool:
        """Keep something, if that is possible at once; tell whether it was.

        What was computed gives way to newer things, as it can be computed again. What a person said, such as what
        the columns of a file are, has a key that begins with `SAID` and stays.
        """
        return self._database.attempt(
            [
                (
                    'INSERT INTO kept ("key", "data", "made_at") VALUES (:key, :data, :made_at)'
                    ' ON CONFLICT ("key") DO UPDATE'
                    ' SET "data" = excluded."data", "made_at" = excluded."made_at"',
                    {"key": key, "data": data, "made_at": datetime.now(UTC).isoformat()},
                ),
                (
                    'DELETE FROM kept WHERE "key" NOT LIKE :said AND "key" NOT IN'
                    ' (SELECT k."key" FROM kept k ORDER BY k."made_at" DESC LIMIT :most)',
                    {"most": _KEPT, "said": f"{SAID}%"},
                ),
            ]
        )

    # Copies

    def backup(self, path: str | Path) -> Path:
        """Write a copy of the whole catalog to a new file, as of this moment, and return its path.

        It is a catalog of its own. `catalog.backup.restore` brings it back.

        Raises
        ------
        CatalogError
            If the file exists, its folder does not, or it cannot be written.
        """
        from catalog.backup import backup

        path = Path(path).expanduser()
        backup(self._database, path)
        return path

    def _records(self, kind: str, ids: Iterable[int] | None) -> list:
        if ids is None:
            with self._database.reading() as run:
                return read_records(run, kind)
        ids = list(dict.fromkeys(ids))
        with self._database.reading() as run:
            found = read_records(run, kind, f"{CURRENT} AND {id_condition(ids)}")
            if len(found) < len(ids):
                known = {record.id for record in found}
                revisions.current_record(run, kind, next(id_ for id_ in ids if id_ not in known))
        return found


def _now() -> str:
    return datetime.now(UTC).isoformat(timespec="seconds")
