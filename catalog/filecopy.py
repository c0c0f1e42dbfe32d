"""Copies of SQLite files, of one moment and complete or not there at all."""

from __future__ import annotations

import os
import time
from collections.abc import Iterator
from contextlib import closing, contextmanager, suppress
from pathlib import Path

from catalog import database
from catalog.errors import CatalogError
from catalog.faults import BUSY, told
from catalog.sqlitefile import connect


def copy_file(source: Path, target: Path) -> None:
    """Copy a SQLite file as of one moment, also while it is written to.

    The target appears, or is replaced, when the copy is complete.

    Raises
    ------
    CatalogError
        If one cannot be read or the other not written.
    """
    with finished(target) as unfinished:
        copy_over(source, unfinished)


def copy_over(source: Path, target: Path) -> None:
    """Copy a SQLite file over another one as a transaction: others see the one, then the other.

    Raises
    ------
    CatalogError
        If one cannot be read or the other not written.
    """
    started = time.monotonic()

    def waited(_status: int, _remaining: int, _total: int) -> None:
        if time.monotonic() - started > database.WAIT_S:
            raise CatalogError(BUSY.format(target))

    with told(str(source)), closing(connect(source, "rw", readonly=True)) as old:
        # Reading first tells a damaged source from a target that cannot be written.
        old.execute("SELECT m.name FROM sqlite_master m").fetchall()
        with told(str(target)), closing(connect(target, "rwc")) as new:
            old.backup(new, progress=waited)


def free_name(path: Path, tag: str) -> Path:
    """A name beside a file that is not taken: "catalog.<tag>.sqlite", "catalog.<tag>-2.sqlite"."""
    number, target = 1, path.with_name(f"{path.stem}.{tag}{path.suffix}")
    while target.exists():
        number += 1
        target = path.with_name(f"{path.stem}.{tag}-{number}{path.suffix}")
    return target


@contextmanager
def finished(target: Path) -> Iterator[Path]:
    """A file to be written that gets its name when it is complete, and vanishes if it never is."""
    unfinished = target.with_name(f".{target.name}.{os.getpid()}.part")
    try:
        with _os_told(target):
            target.parent.mkdir(parents=True, exist_ok=True)
            unfinished.touch()
        yield unfinished
        with _os_told(target):
            os.replace(unfinished, target)
    finally:
        for ending in ("", "-journal"):
            with suppress(OSError):
                os.unlink(f"{unfinished}{ending}")


@contextmanager
def _os_told(path: Path) -> Iterator[None]:
    try:
        yield
    except OSError as error:
        raise CatalogError(f"{path} cannot be written: {error.strerror}") from error
