"""Schema versions: an older catalog is brought to this one with a copy kept, a newer one is left alone."""

from __future__ import annotations

import sqlite3
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import pytest
from catalog_records import INVERTER, MODULE, REV_C, SITE, TWO_GROUPS
from store_workers import refusal

from catalog import schema
from catalog.store import Catalog


@pytest.fixture
def first_schema(tmp_path: Path) -> Path:
    """A catalog as the first version wrote it."""
    path = tmp_path / "old.sqlite"
    with closing(sqlite3.connect(path)) as old:
        old.executescript((Path(__file__).parent / "schema_1.sql").read_text())
    return path


def test_a_catalog_of_the_first_version_opens_with_all_it_held(first_schema: Path) -> None:
    with Catalog.open(first_schema) as catalog:
        assert catalog.modules() == [replace(MODULE, id=1)]
        amended, two_groups = catalog.inverters()
        assert (amended.max_dc_voltage_v, amended.source_of("max_dc_voltage_v")) == (600.0, REV_C)
        assert catalog.inverter(2, revision=1) == replace(INVERTER, id=2)
        assert two_groups == replace(TWO_GROUPS, id=3)
        assert catalog.sites() == [SITE]
        assert catalog.load([MODULE], [INVERTER, TWO_GROUPS]).unchanged == 3


def test_a_migrated_catalog_has_the_tables_of_a_new_one(first_schema: Path, tmp_path: Path) -> None:
    """A field that is added to a record without a migration shows here."""
    Catalog.open(first_schema).close()
    Catalog.open(tmp_path / "new.sqlite", create=True).close()
    assert _columns(first_schema) == _columns(tmp_path / "new.sqlite")


def _columns(path: Path) -> dict[str, set[tuple]]:
    with closing(sqlite3.connect(path)) as file:
        tables = [row[0] for row in file.execute("SELECT name FROM sqlite_master WHERE type = 'table'")]
        return {t: {row[1:4] for row in file.execute(f"PRAGMA table_info({t})")} for t in tables}


@pytest.fixture
def next_version(monkeypatch: pytest.MonkeyPatch) -> None:
    """A Ferrule one version further, which keeps a colour of sites."""

    def add_colour(session) -> None:
        session.connection().exec_driver_sql("ALTER TABLE site ADD COLUMN colour VARCHAR")

    monkeypatch.setattr(schema, "MIGRATIONS", {**schema.MIGRATIONS, schema.VERSION + 1: add_colour})
    monkeypatch.setattr(schema, "VERSION", schema.VERSION + 1)


@pytest.mark.parametrize("readonly", [True, False])
def test_an_older_catalog_is_migrated_and_a_copy_is_kept(
    small_catalog: Path, request: pytest.FixtureRequest, readonly: bool
) -> None:
    old = schema.VERSION
    before = _columns(small_catalog)
    request.getfixturevalue("next_version")
    with Catalog.open(small_catalog, readonly=readonly) as catalog:
        assert len(catalog.modules()) == 2
    assert ("colour", "VARCHAR", 0) in _columns(small_catalog)["site"]
    assert _columns(small_catalog.with_name(f"small.schema-{old}.sqlite")) == before
    Catalog.open(small_catalog).close()
    assert len(list(small_catalog.parent.glob("small*"))) == 2


def test_a_migration_that_fails_changes_nothing(
    small_catalog: Path, next_version: None, monkeypatch: pytest.MonkeyPatch
) -> None:
    before = _columns(small_catalog)

    def fail(session) -> None:
        session.connection().exec_driver_sql("ALTER TABLE site ADD COLUMN colour VARCHAR")
        session.connection().exec_driver_sql("ALTER TABLE nowhere ADD COLUMN colour VARCHAR")

    monkeypatch.setitem(schema.MIGRATIONS, schema.VERSION, fail)
    assert "no such table" in refusal(small_catalog)
    assert _columns(small_catalog) == before


def test_a_newer_catalog_is_refused_politely(store_location: str, monkeypatch: pytest.MonkeyPatch) -> None:
    with monkeypatch.context() as newer:
        newer.setattr(schema, "VERSION", schema.VERSION + 6)
        Catalog.open(store_location, create=True).close()
    for how in ({}, {"readonly": True}, {"create": True}):
        line = refusal(store_location, **how)
        assert "newer Ferrule" in line and "pip install --upgrade ferrule" in line
