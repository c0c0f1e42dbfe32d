"""Broken-off and killed writers, and many at once: a catalog is as before or as after, and no update is lost."""

from __future__ import annotations

import os
import shutil
import sqlite3
from contextlib import closing
from pathlib import Path

import pytest
from catalog_records import MODULES
from store_workers import AS_BEFORE, crowd, fork, kill_loads, many_modules

from catalog.store import Catalog

needs_fork = pytest.mark.skipif(not hasattr(os, "fork"), reason="processes are forked here")


# Crashes


def test_a_load_that_is_broken_off_leaves_nothing(store_location: str) -> None:
    def break_off(*_: int) -> None:
        raise KeyboardInterrupt

    with Catalog.open(store_location, create=True) as catalog:
        catalog.load(MODULES, [])
        with pytest.raises(KeyboardInterrupt):
            catalog.load(many_modules(3000), [], break_off)
        assert len(catalog.modules()) == 2
        assert catalog.load(many_modules(3), []).new == 3


@needs_fork
def test_kills_leave_the_catalog_as_before_or_after(tmp_path: Path) -> None:
    seen = kill_loads(tmp_path / "catalog.sqlite", kills=6, count=400)
    assert sum(seen.values()) == 6
    assert seen[AS_BEFORE] > 0


def test_what_a_killed_writer_left_is_rolled_back_by_the_next_reader(
    small_catalog: Path, tmp_path: Path
) -> None:
    """A copy of file and journal in the midst of a transaction is what a kill leaves."""
    crashed = tmp_path / "crashed.sqlite"
    with closing(sqlite3.connect(small_catalog, isolation_level=None)) as writer:
        writer.execute("PRAGMA cache_size = 1")
        writer.execute("BEGIN")
        writer.execute("UPDATE module_revision SET voc_v = 1.0")
        writer.executemany("INSERT INTO kept VALUES (?, ?, '')", [(str(n), bytes(4000)) for n in range(50)])
        shutil.copy(small_catalog, crashed)
        shutil.copy(f"{small_catalog}-journal", f"{crashed}-journal")
    assert crashed.read_bytes() != small_catalog.read_bytes()
    with Catalog.open(crashed, readonly=True) as catalog:
        assert [m.voc_v for m in catalog.modules()] == [m.voc_v for m in MODULES]


# Many at once


@needs_fork
def test_a_crowd_loses_no_update(store_location: str, tmp_path: Path) -> None:
    done = crowd(store_location, tmp_path, writers=3, readers=3, seconds=1.5)
    assert done.errors == []
    assert min(done.written, done.read, done.loads) > 0


@needs_fork
def test_two_may_make_the_same_catalog_at_once(store_location: str, tmp_path: Path) -> None:
    def make() -> int:
        with Catalog.open(store_location, create=True) as catalog:
            return catalog.load(many_modules(50), []).new

    children = [fork(make, tmp_path / f"{n}.json") for n in range(4)]
    assert [os.waitpid(child, 0)[1] for child in children] == [0] * 4
    assert sorted((tmp_path / f"{n}.json").read_text() for n in range(4)) == ['{"answer": 0}'] * 3 + [
        '{"answer": 50}'
    ]
