"""Opening the database of a catalog: a SQLite file, or PostgreSQL by its URL.

Reading goes by plain SQL (`Run`) that both understand. On a SQLite file it takes the standard library alone,
so that commands that only read need not wait for the import of sqlmodel. Writing goes by a session of
SQLModel.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from contextlib import AbstractContextManager
from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

from catalog.errors import CatalogError

if TYPE_CHECKING:
    from sqlmodel import Session

#: How long to wait for another process that is writing [s].
WAIT_S = 20.0

#: Runs one SQL statement with its parameters (``:name`` in the statement) and returns all rows.
Run = Callable[[str, dict[str, Any]], Sequence[Sequence[Any]]]


class Database(Protocol):
    """What the catalog asks of a database."""

    label: str
    readonly: bool

    def reading(self) -> AbstractContextManager[Run]:
        """Read several statements as of one moment."""

    def writing(self) -> AbstractContextManager[tuple[Session, Run]]:
        """Write, all or nothing, as the only one who writes; the second is for reading meanwhile."""

    def attempt(self, statements: Sequence[tuple[str, dict[str, Any]]]) -> bool:
        """Write if that is possible at once; tell whether it was."""

    def writable(self) -> AbstractContextManager[Database]:
        """This database, opened so that it can be written to."""

    def has_table(self, name: str | None = None) -> bool:
        """Whether there is a table of a name, or any at all."""

    def keep_copy(self, tag: str) -> None:
        """Keep a copy as it is now, where that is possible."""

    def missing_line(self) -> str:
        """What to tell the user where there is no catalog yet."""

    def close(self) -> None:
        """Let go of the file or connection."""


def open_database(location: str | Path, *, create: bool, readonly: bool) -> Database:
    """Open a database; its tables need not be there yet.

    Parameters
    ----------
    location : str or Path
        Path of a file, or a URL ``sqlite:///path`` or ``postgresql+psycopg://user@host/name``.
    create : bool
        Make a file that does not exist, and its folder.
    readonly : bool
        Never write.

    Raises
    ------
    CatalogError
        If it cannot be opened.
    """
    path = file_of(location)
    if path is not None:
        from catalog.sqlitefile import SqliteFile

        return SqliteFile.open(path, create=create, readonly=readonly)
    scheme, _, rest = str(location).partition("://")
    if scheme.partition("+")[0] in ("postgresql", "postgres"):
        from catalog.server import Server

        return Server(f"postgresql+psycopg://{rest}", readonly=readonly)
    raise CatalogError(
        "a catalog is a file or a PostgreSQL database (postgresql+psycopg://user@host/name),"
        f" not {scheme}://..."
    )


def file_of(location: str | Path) -> Path | None:
    """The file that a location names; ``None`` for the URL of a server."""
    scheme, separator, rest = str(location).partition("://")
    if isinstance(location, Path) or not separator:
        return Path(location).expanduser()
    return Path(rest.removeprefix("/")).expanduser() if scheme.partition("+")[0] == "sqlite" else None
