"""A catalog without permission, without room, or in use by others: nothing is lost, and one line says what to do."""

from __future__ import annotations

import os
import pickle
import shutil
import sqlite3
import tempfile
from collections.abc import Callable, Iterator
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import pytest
from catalog_records import INVERTER, SITE
from store_workers import fork, many_modules, refusal

from catalog import database, sqlitefile
from catalog.errors import CatalogError
from catalog.store import Catalog

needs_fork = pytest.mark.skipif(not hasattr(os, "fork"), reason="processes are forked here")


def as_nobody(work: Callable[[Path], object], folder: Path) -> object:
    """What a function says that runs without the rights of the superuser, whom permissions do not bind."""
    answer = folder.parent / f"{folder.name}.answer"
    answer.touch()
    answer.chmod(0o666)

    def run() -> None:
        if os.getuid() == 0:
            os.setgid(65534)
            os.setuid(65534)
        answer.write_bytes(pickle.dumps(work(folder)))

    _, status = os.waitpid(fork(run), 0)
    assert status == 0
    return pickle.loads(answer.read_bytes())


@pytest.fixture
def shared_folder(small_catalog: Path) -> Iterator[Path]:
    """A folder with a catalog in it, that everybody can read."""
    import catalog.filecopy
    import catalog.plausible_inverters  # noqa: F401  (a process without rights may import nothing more)

    with tempfile.TemporaryDirectory() as outer:
        os.chmod(outer, 0o755)
        folder = Path(outer) / "shared"
        folder.mkdir()
        shutil.copy(small_catalog, folder / "catalog.sqlite")
        os.chmod(folder / "catalog.sqlite", 0o444)
        os.chmod(folder, 0o555)
        yield folder
        os.chmod(folder, 0o755)


def _use(folder: Path) -> list[str]:
    """Read, keep, then write to a catalog; what each came to."""
    said = []
    with Catalog.open(folder / "catalog.sqlite") as catalog:
        catalog.keep("year", b"x")
        said.append(f"{len(catalog.modules())} modules, kept {catalog.kept('year')}")
        for write in (
            lambda: catalog.add_site(replace(SITE, name="East")),
            lambda: catalog.load([], [INVERTER]),
        ):
            try:
                write()
                said.append("written")
            except CatalogError as error:
                said.append(str(error))
        try:
            catalog.backup(folder / "copy.sqlite")
        except CatalogError as error:
            said.append(str(error))
    try:
        Catalog.open(folder / "new.sqlite", create=True)
    except CatalogError as error:
        said.append(str(error))
    return said


@needs_fork
def test_a_read_only_catalog_can_be_read(shared_folder: Path) -> None:
    before = (shared_folder / "catalog.sqlite").read_bytes()
    read, site, load, copy, new = as_nobody(_use, shared_folder)
    assert read == "2 modules, kept None"
    assert "read-only" in site and "nothing in it was changed" in site
    # Loading what is known already writes nothing, so it may either way.
    assert load == "written" or "read-only" in load
    assert "copy.sqlite" in copy
    assert "new.sqlite" in new
    assert (shared_folder / "catalog.sqlite").read_bytes() == before


@needs_fork
def test_a_read_only_folder_is_told(shared_folder: Path) -> None:
    os.chmod(shared_folder / "catalog.sqlite", 0o666)
    before = (shared_folder / "catalog.sqlite").read_bytes()
    read, site, *_ = as_nobody(_use, shared_folder)
    assert read == "2 modules, kept None"
    assert "folder" in site
    assert (shared_folder / "catalog.sqlite").read_bytes() == before


@needs_fork
def test_a_catalog_that_may_not_be_read_is_told(shared_folder: Path) -> None:
    os.chmod(shared_folder / "catalog.sqlite", 0o000)
    line = as_nobody(lambda folder: refusal(folder / "catalog.sqlite", readonly=True), shared_folder)
    assert "cannot be opened" in line


def test_no_room_loses_nothing(small_catalog: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    connect = sqlitefile.connect

    def connect_to_full_disk(*args: object, **how: object) -> sqlite3.Connection:
        connection = connect(*args, **how)
        pages = connection.execute("PRAGMA page_count").fetchone()[0]
        connection.execute(f"PRAGMA max_page_count = {pages + 4}")
        return connection

    monkeypatch.setattr(sqlitefile, "connect", connect_to_full_disk)
    with Catalog.open(small_catalog) as catalog:
        with pytest.raises(CatalogError, match="no room is left .*nothing in it was changed"):
            catalog.load(many_modules(500), [])
        catalog.keep("year", bytes(100_000))
        assert catalog.kept("year") is None
        assert len(catalog.modules()) == 2
        catalog.add_site(replace(SITE, name="East"))
        assert len(catalog.sites()) == 2


def test_waiting_for_another_writer_ends_in_a_line(
    small_catalog: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(database, "WAIT_S", 0.1)
    with (
        closing(sqlite3.connect(small_catalog, isolation_level=None)) as other,
        Catalog.open(small_catalog) as catalog,
    ):
        other.execute("BEGIN IMMEDIATE")
        assert len(catalog.modules()) == 2
        with pytest.raises(CatalogError, match="in use by another program .*try again"):
            catalog.load(many_modules(3), [])
        catalog.keep("year", b"x")
        other.execute("ROLLBACK")
        assert catalog.load(many_modules(3), []).new == 3
        other.execute("BEGIN EXCLUSIVE")
        with pytest.raises(CatalogError, match="in use by another program"):
            catalog.modules()


def test_waiting_on_a_server_ends_in_a_line(postgres_server, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(database, "WAIT_S", 0.1)
    url = postgres_server.new_schema()
    with Catalog.open(url, create=True) as catalog, Catalog.open(url) as other:
        with (
            other._database.writing(),
            pytest.raises(CatalogError, match="in use by another program .*try again"),
        ):
            catalog.load(many_modules(3), [])
        assert catalog.load(many_modules(3), []).new == 3


def test_a_server_is_told_without_what_may_be_secret(postgres_server) -> None:
    line = refusal(postgres_server.new_schema() + "&password=sesame")
    assert "holds no catalog yet" in line and "ferrule sheet load cec" in line and "sesame" not in line
