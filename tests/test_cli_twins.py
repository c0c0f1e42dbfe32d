"""``ferrule sheet twins``: the same model under several makers, as a user asks for it."""

from __future__ import annotations

from dataclasses import replace

from catalog_records import INVERTERS, MODULES

from catalog.store import Catalog


def test_the_same_model_under_two_makers_is_reported(ferrule, small_catalog):
    assert "No model stands under two makers' names." in ferrule("sheet", "twins").out
    again = replace(MODULES[0], maker="Another Brand", model=MODULES[0].model.lower().replace("-", " "))
    with Catalog.open(small_catalog) as catalog:
        catalog.load([again], [])
    ran = ferrule("sheet", "twins")
    assert ran.status == 0
    assert "1 model under two or more makers' names." in ran.out
    assert MODULES[0].maker in ran.out and "Another Brand" in ran.out
    assert "No model" in ferrule("sheet", "twins", "--kind", "inverter").out
    assert INVERTERS[0].model not in ran.out


def test_twins_of_the_public_table(ferrule, cec_catalog, monkeypatch):
    monkeypatch.setenv("FERRULE_CATALOG", str(cec_catalog))
    ran = ferrule("sheet", "twins", "--kind", "inverter", "--limit", "3")
    assert ran.status == 0 and "... and" in ran.out
    assert all(len(line) <= 100 for line in ran.out.splitlines())
