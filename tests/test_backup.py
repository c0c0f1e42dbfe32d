"""Backup and restore: a copy is a catalog, comes back whole, and takes the place of nothing that is sound by mistake."""

from __future__ import annotations

import shutil
import sqlite3
from contextlib import closing
from pathlib import Path

import pytest
from catalog_records import INVERTER, MODULES, REV_C, SITE, TWO_GROUPS
from store_workers import many_modules

from catalog import database
from catalog.backup import restore
from catalog.errors import CatalogError
from catalog.store import Catalog


def test_a_backup_is_a_catalog_and_comes_back(store_location: str, tmp_path: Path) -> None:
    copy = tmp_path / "monday.sqlite"
    with Catalog.open(store_location, create=True) as catalog:
        catalog.load(MODULES, [INVERTER, TWO_GROUPS])
        catalog.amend("inverter", 3, {"max_dc_voltage_v": 600.0}, REV_C)
        catalog.keep("year", b"\x00\x01")
        catalog.add_site(SITE)
        records = catalog.modules(), catalog.inverters(), catalog.history("inverter", 3)
        assert catalog.backup(copy) == copy
        with pytest.raises(CatalogError, match="exists already"):
            catalog.backup(copy)
        catalog.amend("inverter", 3, {"max_dc_voltage_v": 550.0}, REV_C)
        catalog.drop_site(SITE.name)
    kept = restore(store_location, copy)
    for location in (store_location, copy):
        with Catalog.open(location, readonly=True) as catalog:
            assert (catalog.modules(), catalog.inverters(), catalog.history("inverter", 3)) == records
            assert (catalog.sites(), catalog.kept("year")) == ([SITE], b"\x00\x01")
    with Catalog.open(kept, readonly=True) as catalog:
        assert catalog.inverter(3).max_dc_voltage_v == 550.0
        assert catalog.sites() == []


def test_a_backup_becomes_a_catalog_where_there_is_none(store_location: str, small_catalog: Path) -> None:
    assert restore(store_location, small_catalog) is None
    with Catalog.open(store_location) as catalog:
        assert len(catalog.modules()) == 2
        assert catalog.load(MODULES, []).unchanged == 2


def test_a_damaged_catalog_is_replaced_and_kept(small_catalog: Path, tmp_path: Path) -> None:
    damaged = tmp_path / "damaged.sqlite"
    damaged.write_bytes(small_catalog.read_bytes()[:6000])
    Path(f"{damaged}-journal").write_bytes(b"\xd9\xd5\x05\xf9\x20\xa1\x63\xd7" + bytes(600))
    kept = restore(damaged, small_catalog)
    assert kept.read_bytes() == small_catalog.read_bytes()[:6000]
    with Catalog.open(damaged, readonly=True) as catalog:
        assert len(catalog.modules()) == 2


def test_a_catalog_that_is_open_sees_what_was_restored(small_catalog: Path, tmp_path: Path) -> None:
    copy = tmp_path / "copy.sqlite"
    with Catalog.open(small_catalog) as catalog:
        catalog.backup(copy)
        catalog.load(many_modules(30), [])
        restore(small_catalog, copy)
        assert len(catalog.modules()) == 2
        assert catalog.load(many_modules(30), []).new == 30


def test_what_is_no_sound_backup_is_not_restored(small_catalog: Path, tmp_path: Path) -> None:
    before = small_catalog.read_bytes()
    cut, other, empty, newer = (tmp_path / f"{name}.sqlite" for name in ("cut", "other", "empty", "newer"))
    cut.write_bytes(before[: len(before) - 8192])
    other.write_text("no database at all " * 100)
    empty.touch()
    shutil.copy(small_catalog, newer)
    with closing(sqlite3.connect(newer)) as file:
        file.execute("UPDATE meta SET value = '99'")
        file.commit()
    wrong = [
        (tmp_path / "none.sqlite", "does not exist"),
        (tmp_path, "is no file"),
        (cut, "damaged"),
        (other, "not a catalog"),
        (empty, "is empty"),
        (newer, "newer Ferrule"),
        (small_catalog, "is the catalog itself"),
    ]
    for path, line in wrong:
        with pytest.raises(CatalogError, match=line) as refused:
            restore(small_catalog, path)
        assert "\n" not in str(refused.value)
    assert small_catalog.read_bytes() == before
    assert list(tmp_path.glob("small*")) == [small_catalog]


def test_a_catalog_in_use_is_not_replaced(
    small_catalog: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    copy = tmp_path / "copy.sqlite"
    shutil.copy(small_catalog, copy)
    monkeypatch.setattr(database, "WAIT_S", 0.1)
    before = small_catalog.read_bytes()
    with closing(sqlite3.connect(small_catalog, isolation_level=None)) as other:
        other.execute("BEGIN IMMEDIATE")
        with pytest.raises(CatalogError, match="in use by another program"):
            restore(small_catalog, copy)
        other.execute("ROLLBACK")
    assert small_catalog.read_bytes() == before
    assert list(tmp_path.glob("small*")) == [small_catalog]
