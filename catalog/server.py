"""A catalog in a PostgreSQL database, for a team."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

from catalog import database
from catalog.errors import CatalogError
from catalog.faults import told

if TYPE_CHECKING:
    from sqlalchemy import Connection
    from sqlmodel import Session

    from catalog.database import Run

#: Key of the advisory lock that makes one writer at a time ("FERR").
_LOCK = 0x46455252

_CONNECT_S = 10


class Server:
    """Connections to a PostgreSQL database; see `catalog.database.Database`."""

    def __init__(self, url: str, *, readonly: bool) -> None:
        from sqlalchemy.engine import make_url
        from sqlalchemy.exc import ArgumentError
        from sqlmodel import create_engine

        try:
            parsed = make_url(url)
        except (ArgumentError, ValueError) as error:
            raise CatalogError(
                "the catalog's URL is not of the form postgresql+psycopg://user@host/name"
            ) from error
        # What follows the "?" may hold a password too.
        self.label = parsed.set(query={}).render_as_string(hide_password=True)
        self.readonly = readonly
        try:
            self._engine = create_engine(parsed, connect_args={"connect_timeout": _CONNECT_S})
        except ImportError as error:
            raise CatalogError(
                "a catalog in PostgreSQL needs psycopg: pip install 'ferrule[postgres]'"
            ) from error

    @contextmanager
    def reading(self) -> Iterator[Run]:
        options = {"isolation_level": "REPEATABLE READ", "postgresql_readonly": True}
        with told(self.label), self._engine.connect() as connection:
            yield _runner(connection.execution_options(**options))

    @contextmanager
    def writing(self) -> Iterator[tuple[Session, Run]]:
        from sqlmodel import Session

        if self.readonly:
            raise CatalogError(f"the catalog {self.label} is opened for reading only")
        with told(self.label), Session(self._engine) as session:
            run = _runner(session.connection())
            _take_lock(run, database.WAIT_S)
            yield session, run
            session.commit()

    def attempt(self, statements: Sequence[tuple[str, dict[str, Any]]]) -> bool:
        from sqlalchemy.exc import SQLAlchemyError

        if self.readonly:
            return False
        try:
            with self._engine.begin() as connection:
                run = _runner(connection)
                _take_lock(run, 0.2)
                for sql, params in statements:
                    run(sql, params)
            return True
        except SQLAlchemyError:
            return False

    @contextmanager
    def writable(self) -> Iterator[Server]:
        if not self.readonly:
            yield self
            return
        other = Server(self._engine.url.render_as_string(hide_password=False), readonly=False)
        try:
            yield other
        finally:
            other.close()

    def has_table(self, name: str | None = None) -> bool:
        sql = "SELECT t.table_name FROM information_schema.tables t WHERE t.table_schema = current_schema()"
        with self.reading() as run:
            names = [row[0] for row in run(sql, {})]
        return bool(names) if name is None else name in names

    def keep_copy(self, tag: str) -> None:
        """Copies are the administrator's (pg_dump); a migration is one transaction anyway."""

    def missing_line(self) -> str:
        return (
            f"the database {self.label} holds no catalog yet: 'ferrule sheet load cec' makes one and loads"
            " the public tables"
        )

    def close(self) -> None:
        self._engine.dispose()


def _runner(connection: Connection) -> Run:
    from sqlalchemy import text

    def run(sql: str, params: dict[str, Any]) -> Sequence[Sequence[Any]]:
        result = connection.execute(text(sql), params)
        return result.fetchall() if result.returns_rows else []

    return run


def _take_lock(run: Run, seconds: float) -> None:
    run(f"SET LOCAL lock_timeout = {int(seconds * 1000)}", {})
    run(f"SELECT pg_advisory_xact_lock({_LOCK})", {})
