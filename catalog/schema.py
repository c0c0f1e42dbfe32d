"""The schema version of a catalog, and the way from an older one to this one.

To change a table: change it in `catalog.tables`, add one to `VERSION`, and add to `MIGRATIONS`, under the new
version, a function that brings a catalog from the version before to it. Migrations are SQL of their time and
use nothing of `catalog.tables`, which goes on changing. A migration runs in one transaction; for a file, a
copy is kept beside it first.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import TYPE_CHECKING

from catalog.errors import CatalogError
from catalog.faults import UNCHANGED

if TYPE_CHECKING:
    from sqlmodel import Session

    from catalog.database import Database, Run

VERSION = 3


def _add_stock(session: Session) -> None:
    """Version 2: stock lists, and what people decided on their articles."""
    for statement in (
        """CREATE TABLE stock (
            id INTEGER NOT NULL, kind VARCHAR, record_id INTEGER, quantity INTEGER NOT NULL, unit_price FLOAT,
            currency VARCHAR, place VARCHAR NOT NULL, article VARCHAR NOT NULL, text TEXT NOT NULL,
            confidence VARCHAR NOT NULL, source_id INTEGER NOT NULL, loaded_at VARCHAR NOT NULL,
            PRIMARY KEY (id), FOREIGN KEY(record_id) REFERENCES record (id),
            FOREIGN KEY(source_id) REFERENCES source (id))""",
        """CREATE TABLE stock_decision (
            article_key VARCHAR NOT NULL, text_key TEXT NOT NULL, record_id INTEGER,
            decided_at VARCHAR NOT NULL,
            PRIMARY KEY (article_key, text_key), FOREIGN KEY(record_id) REFERENCES record (id))""",
    ):
        session.connection().exec_driver_sql(statement)


def _add_named(session: Session) -> None:
    """Version 3: the full name that a stock list gives an article beside its text, to match it again later."""
    session.connection().exec_driver_sql("ALTER TABLE stock ADD COLUMN named TEXT NOT NULL DEFAULT ''")


#: By the version that they lead to.
MIGRATIONS: Mapping[int, Callable[[Session], None]] = {2: _add_stock, 3: _add_named}


def stored_version(run: Run) -> int | None:
    """Schema version of a catalog; ``None`` if its tables are not there.

    Raises
    ------
    CatalogError
        If the version is no number.
    """
    rows = run("SELECT m.value FROM meta m WHERE m.key = 'schema'", {})
    if not rows:
        return None
    if not str(rows[0][0]).isdigit():
        raise CatalogError(f"the catalog tells no schema version but {rows[0][0]!r}: it is damaged")
    return int(rows[0][0])


def ensure(database: Database, *, create: bool) -> None:
    """See that a catalog has the tables of this version: make them, or migrate an older catalog.

    Raises
    ------
    CatalogError
        If the catalog is newer than this program, is no catalog, or does not exist and is not to be made.
    """
    version = checked_version(database)
    if version == VERSION:
        return
    if version is None and not create:
        raise CatalogError(database.missing_line())
    with database.writable() as writer, writer.writing() as (session, run):
        # Another process may have been first.
        version = stored_version(run) if version is not None else None
        if version is None and not writer.has_table("meta"):
            _make(session)
        elif version is not None and version < VERSION:
            writer.keep_copy(f"schema-{version}")
            _migrate(session, version)


def checked_version(database: Database) -> int | None:
    """Schema version of a catalog that this program can use or migrate; ``None`` if there are no tables yet.

    Raises
    ------
    CatalogError
        If the catalog is of a newer program, or it is another database.
    """
    if not database.has_table("meta"):
        if not database.has_table():
            return None
        # Another process may have made the tables between the two looks.
        if not database.has_table("meta"):
            raise CatalogError(f"{database.label} is a database, but no catalog of Ferrule's: name another")
    with database.reading() as run:
        version = stored_version(run)
    if version is None:
        raise CatalogError(f"{database.label} is a database, but no catalog of Ferrule's: name another")
    if version > VERSION:
        raise CatalogError(
            f"the catalog {database.label} was last used by a newer Ferrule (its schema is {version}, this"
            f" one knows up to {VERSION}): update with 'pip install --upgrade ferrule'; {UNCHANGED}"
        )
    if any(step not in MIGRATIONS for step in range(version + 1, VERSION + 1)):
        raise CatalogError(f"the catalog {database.label} has a schema {version} that no Ferrule has written")
    return version


def _make(session: Session) -> None:
    from catalog.tables import MetaRow, SQLModel

    SQLModel.metadata.create_all(session.connection())
    session.add(MetaRow(key="schema", value=str(VERSION)))


def _migrate(session: Session, version: int) -> None:
    from sqlalchemy import text

    for step in range(version + 1, VERSION + 1):
        MIGRATIONS[step](session)
    session.connection().execute(
        text("UPDATE meta SET value = :value WHERE key = 'schema'"), {"value": str(VERSION)}
    )
