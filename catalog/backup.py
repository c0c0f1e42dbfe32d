"""Backups of a catalog: made while it is in use, checked before they are brought back.

A backup is one SQLite file, also that of a catalog in PostgreSQL; it is a catalog itself and opens as one.
"""

from __future__ import annotations

import os
import shutil
import tempfile
from contextlib import closing, suppress
from pathlib import Path
from typing import TYPE_CHECKING

from catalog import schema
from catalog.database import Database, file_of, open_database
from catalog.errors import CatalogError
from catalog.filecopy import copy_file, copy_over, finished, free_name
from catalog.sqlitefile import SqliteFile

if TYPE_CHECKING:
    from sqlmodel import Session

    from catalog.database import Run

_CHUNK = 2000


def backup(source: Database, path: Path) -> None:
    """Write a copy of a catalog to a new file; see `catalog.store.Catalog.backup`."""
    if path.exists():
        raise CatalogError(f"{path} exists already: name a new file for the backup")
    if not path.parent.is_dir():
        raise CatalogError(f"{path}: there is no folder {path.parent}; make it, or name a file in one that is there")
    if isinstance(source, SqliteFile):
        copy_file(source.path, path)
        return
    with (
        finished(path) as unfinished,
        closing(open_database(unfinished, create=True, readonly=False)) as target,
    ):
        schema.ensure(target, create=True)
        _transfer(source, target)


def restore(location: str | Path, path: Path) -> Path | None:
    """Bring a backup back in the place of a catalog.

    The backup is checked first, and what the catalog held until now is kept in a file of its own. Others who
    have the catalog open see it as before, and from one moment on as restored.

    Parameters
    ----------
    location : str or Path
        The catalog, a file or a database; it need not exist, and may be damaged.
    path : Path
        The backup.

    Returns
    -------
    Path or None
        Where the former catalog is kept; ``None`` if there was none.

    Raises
    ------
    CatalogError
        If the backup is damaged, no catalog, or of a newer Ferrule. The catalog stays as it is then.
    """
    check_file(path)
    target = file_of(location)
    if target is None:
        return _restore_server(str(location), path)
    if not target.exists() or (target.is_file() and os.path.getsize(target) == 0):
        copy_file(path, target)
        return None
    if target.samefile(path):
        raise CatalogError(f"{path} is the catalog itself, not a backup of it")
    kept = free_name(target, "replaced")
    if damage(target) is None:
        with closing(SqliteFile.open(target, create=False, readonly=True)) as file:
            schema.checked_version(file)
        copy_file(target, kept)
        try:
            copy_over(path, target)
        except BaseException:
            kept.unlink()
            raise
        return kept
    try:
        shutil.copyfile(target, kept)
        # A journal belongs to the file that it lies beside: left there, it would be rolled back into the new
        # one.
        for ending in ("-journal", "-wal", "-shm"):
            with suppress(FileNotFoundError):
                os.replace(f"{target}{ending}", f"{kept}{ending}")
    except OSError as error:
        raise CatalogError(f"the damaged catalog {target} cannot be set aside: {error.strerror}") from error
    copy_file(path, target)
    return kept


def check_file(path: Path) -> None:
    """Read a catalog file whole.

    Raises
    ------
    CatalogError
        If it is missing, damaged, no catalog, or of a newer Ferrule.
    """
    if not path.exists():
        raise CatalogError(f"the backup {path} does not exist")
    wrong = damage(path)
    if wrong:
        raise CatalogError(wrong)
    with closing(SqliteFile.open(path, create=False, readonly=True)) as file:
        if schema.checked_version(file) is None:
            raise CatalogError(f"{path} is empty: it is no backup")


def damage(path: Path) -> str | None:
    """What is damaged about a SQLite file, found by reading it whole; ``None`` for a sound one.

    Raises
    ------
    CatalogError
        If it is no file, or cannot be opened at all.
    """
    if not path.is_file():
        raise CatalogError(f"{path} is no file")
    if not os.access(path, os.R_OK):
        raise CatalogError(f"{path} cannot be read: you have no permission")
    try:
        with closing(SqliteFile.open(path, create=False, readonly=True)) as file, file.reading() as run:
            answer = str(run("PRAGMA integrity_check(1)", {})[0][0])
            if answer == "ok" and not run("PRAGMA foreign_key_check", {}):
                return None
            return f"{path} is damaged ({' '.join(answer.split())}): take another copy"
    except CatalogError as error:
        if getattr(error.__cause__, "sqlite_errorname", "").startswith(("SQLITE_CORRUPT", "SQLITE_NOTADB")):
            return str(error)
        raise


def _restore_server(location: str, path: Path) -> Path | None:
    with closing(open_database(location, create=True, readonly=False)) as target:
        kept = free_name(path, "replaced") if target.has_table("meta") else None
        schema.ensure(target, create=True)
        if kept is not None:
            backup(target, kept)
        # A backup of an older schema is brought up to date in a copy.
        with tempfile.TemporaryDirectory() as folder:
            copy = Path(folder) / "backup.sqlite"
            copy_file(path, copy)
            with closing(open_database(copy, create=False, readonly=False)) as source:
                schema.ensure(source, create=False)
                _transfer(source, target)
    return kept


def _transfer(source: Database, target: Database) -> None:
    """Put all rows of one catalog in the place of all rows of another, as one transaction."""
    from sqlalchemy import delete

    from catalog.tables import SQLModel

    tables = SQLModel.metadata.sorted_tables
    with source.reading() as read, target.writing() as (session, _):
        for table in reversed(tables):
            session.connection().execute(delete(table))
        for table in tables:
            _transfer_table(read, session, table.name, [column.name for column in table.columns])


def _transfer_table(read: Run, session: Session, table: str, columns: list[str]) -> None:
    from sqlalchemy import insert

    from catalog.tables import SQLModel

    listed = ", ".join(f't."{name}"' for name in columns)
    rows = [dict(zip(columns, row, strict=True)) for row in read(f"SELECT {listed} FROM {table} t", {})]
    for start in range(0, len(rows), _CHUNK):
        session.connection().execute(insert(SQLModel.metadata.tables[table]), rows[start : start + _CHUNK])
