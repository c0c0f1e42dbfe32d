"""Errors of the database as one line that says what to do."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager

from catalog.errors import CatalogError

UNCHANGED = "nothing in it was changed"

BUSY = (
    "the catalog {0} is in use by another program that is writing to it: wait until that is done and"
    " try again; " + UNCHANGED
)

_LINES = {
    "SQLITE_BUSY": BUSY,
    "SQLITE_LOCKED": "the catalog {0} is in use by another program: try again; " + UNCHANGED,
    "SQLITE_FULL": "no room is left for the catalog {0}: free some space on its disk and try again; "
    + UNCHANGED,
    "SQLITE_READONLY": "the catalog {0}, or the folder that holds it, is read-only: make both writable, or"
    " name another catalog with --catalog; " + UNCHANGED,
    "SQLITE_NOTADB": "{0} is not a catalog: it is no SQLite file, or it is damaged; name another with"
    " --catalog, or bring back a copy with 'ferrule sheet restore'",
    "SQLITE_CORRUPT": "the catalog {0} is damaged: bring back a copy with 'ferrule sheet restore'",
    "SQLITE_CANTOPEN": "the catalog {0} cannot be opened: see that it and its folder exist and that you may"
    " use them",
    "SQLITE_PERM": "the catalog {0} cannot be opened: you have no permission",
    "SQLITE_AUTH": "the catalog {0} cannot be opened: you have no permission",
    "SQLITE_IOERR": "the catalog {0} cannot be read or written: its disk reports an error ({1})",
    "SQLITE_TOOBIG": "a value is too long for the catalog {0}; " + UNCHANGED,
    "SQLITE_INTERRUPT": "interrupted; " + UNCHANGED,
}

#: PostgreSQL's error classes and codes (its manual, appendix A) that have a line of their own.
_STATES = {
    "55P03": BUSY,
    "40001": BUSY,
    "40P01": BUSY,
    "53100": _LINES["SQLITE_FULL"],
    "25006": "the database {0} is read-only; " + UNCHANGED,
    "42501": "you have no permission to do this in the database {0}: {1}",
    "22021": "a text holds a character that the database {0} cannot keep; " + UNCHANGED,
}


def line(error: BaseException, where: str) -> str | None:
    """What went wrong with the database at ``where``, as one line; ``None`` for an error of another kind."""
    cause = getattr(error, "orig", None) or error
    name = getattr(cause, "sqlite_errorname", None)
    if name is not None:
        # Extended names are the plain ones with a word more, "SQLITE_READONLY_DBMOVED".
        plain = "_".join(name.split("_")[:2])
        return _LINES.get(plain, "the catalog {0} answers: {1}").format(where, _short(cause))
    if hasattr(cause, "sqlstate"):
        return _STATES.get(cause.sqlstate, "the database {0} answers: {1}").format(where, _short(cause))
    if isinstance(cause, sqlite3.Error):
        return f"the catalog {where} answers: {_short(cause)}"
    if isinstance(error, (UnicodeError, OverflowError)):
        return f"a value cannot be kept in the catalog {where} ({_short(error)}); {UNCHANGED}"
    return None


@contextmanager
def told(where: str) -> Iterator[None]:
    """Turn errors of the database into `CatalogError`.

    Parameters
    ----------
    where : str
        The path, or the URL without its password.
    """
    try:
        yield
    except CatalogError:
        raise
    except Exception as error:
        text = line(error, where)
        if text is None:
            raise
        raise CatalogError(text) from error


def _short(error: BaseException) -> str:
    return " ".join(str(error).split())[:200]
