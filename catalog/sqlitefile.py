"""A catalog in one SQLite file.

The rollback journal is used, not the write-ahead log: a catalog at rest is then one file that can be copied,
mailed and opened on a read-only disk, and after a crash the next one who opens it finds it as it was before.
Writers take their lock at once (BEGIN IMMEDIATE), so that nobody finds out at the end that another was first.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator, Sequence
from contextlib import closing, contextmanager, suppress
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

from catalog import database
from catalog.errors import CatalogError
from catalog.faults import told

if TYPE_CHECKING:
    from sqlalchemy import Engine
    from sqlmodel import Session

    from catalog.database import Run

_ATTEMPT_S = 0.2


class SqliteFile:
    """One connection to a SQLite file; see `catalog.database.Database`."""

    def __init__(self, path: Path, connection: sqlite3.Connection, *, readonly: bool) -> None:
        self.path = path
        self.label = str(path)
        self.readonly = readonly
        self._connection = connection

    @classmethod
    def open(cls, path: Path, *, create: bool, readonly: bool) -> SqliteFile:
        """Open a file, or make an empty one."""
        with told(str(path)):
            try:
                there = path.exists()
                if there and not path.is_file():
                    what = "a folder" if path.is_dir() else "no file"
                    raise CatalogError(f"{path} is {what}: a catalog is one file, give its name too")
                if not there and not create:
                    raise CatalogError(_missing_line(path))
                if not there:
                    path.parent.mkdir(parents=True, exist_ok=True)
            except (OSError, ValueError) as error:
                reason = getattr(error, "strerror", None) or error
                raise CatalogError(f"the catalog {path} cannot be opened: {reason}") from error
            return cls(path, connect(path, "rw" if there else "rwc", readonly=readonly), readonly=readonly)

    @contextmanager
    def reading(self) -> Iterator[Run]:
        with told(self.label):
            self._connection.execute("BEGIN")
            try:
                yield self._run
            finally:
                if self._connection.in_transaction:
                    self._connection.execute("ROLLBACK")

    @contextmanager
    def writing(self) -> Iterator[tuple[Session, Run]]:
        from sqlmodel import Session

        if self.readonly:
            raise CatalogError(f"the catalog {self.label} is opened for reading only")
        with told(self.label), Session(self._engine) as session:
            session.connection().exec_driver_sql("BEGIN IMMEDIATE")
            yield session, self._run
            session.commit()

    def attempt(self, statements: Sequence[tuple[str, dict[str, Any]]]) -> bool:
        if self.readonly:
            return False
        self._wait(_ATTEMPT_S)
        try:
            self._connection.execute("BEGIN IMMEDIATE")
            for sql, params in statements:
                self._connection.execute(sql, params)
            self._connection.execute("COMMIT")
            return True
        except sqlite3.Error:
            if self._connection.in_transaction:
                with suppress(sqlite3.Error):
                    self._connection.execute("ROLLBACK")
            return False
        finally:
            self._wait(database.WAIT_S)

    @contextmanager
    def writable(self) -> Iterator[SqliteFile]:
        if not self.readonly:
            yield self
            return
        with closing(SqliteFile.open(self.path, create=False, readonly=False)) as other:
            yield other

    def has_table(self, name: str | None = None) -> bool:
        sql = "SELECT m.name FROM sqlite_master m WHERE m.type = 'table'"
        with told(self.label):
            names = [row[0] for row in self._connection.execute(sql)]
        return bool(names) if name is None else name in names

    def keep_copy(self, tag: str) -> None:
        from catalog.filecopy import copy_file, free_name

        copy_file(self.path, free_name(self.path, tag))

    def missing_line(self) -> str:
        return _missing_line(self.path)

    def close(self) -> None:
        if "_engine" in self.__dict__:
            self._engine.dispose()
        self._connection.close()

    def _run(self, sql: str, params: dict[str, Any]) -> list[tuple]:
        return self._connection.execute(sql, params).fetchall()

    def _wait(self, seconds: float) -> None:
        self._connection.execute(f"PRAGMA busy_timeout = {int(seconds * 1000)}")

    @cached_property
    def _engine(self) -> Engine:
        """An engine over this very connection, so that there is one place that sets it up."""
        from sqlalchemy.pool import StaticPool
        from sqlmodel import create_engine

        return create_engine("sqlite://", creator=lambda: self._connection, poolclass=StaticPool)


def connect(path: Path, mode: str, *, readonly: bool = False) -> sqlite3.Connection:
    """Connect to a SQLite file.

    Parameters
    ----------
    path : Path
        The file.
    mode : {"rw", "rwc", "ro"}
        As in SQLite's URIs. With ``rw`` a file that is write-protected opens for reading.
    readonly : bool
        Refuse to write. The mode stays ``rw`` where it can be: a reader too must be able to roll back what a
        writer that was killed has left.

    Returns
    -------
    sqlite3.Connection
        It begins no transactions by itself.
    """
    connection = sqlite3.connect(
        f"{path.absolute().as_uri()}?mode={mode}", uri=True, timeout=database.WAIT_S, isolation_level=None
    )
    # Without spilling, readers need not wait for a load before its last moment.
    for pragma in ("foreign_keys = ON", "cache_spill = OFF", "trusted_schema = OFF", "synchronous = FULL"):
        connection.execute(f"PRAGMA {pragma}")
    if readonly:
        connection.execute("PRAGMA query_only = ON")
    return connection


def _missing_line(path: Path) -> str:
    what = "is empty" if path.exists() else "does not exist"
    return (
        f"the catalog {path} {what}: 'ferrule sheet load cec' makes it and loads the public tables,"
        " 'ferrule demo' shows an example"
    )
