"""The catalog: what goes in comes out, a load is all or nothing, no edit loses anything."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import fields, replace
from pathlib import Path

import pytest
from catalog_records import (
    GLASS,
    INVERTER,
    INVERTERS,
    MODULE,
    MODULES,
    REV_C,
    SHEET,
    SITE,
    TABLE_2024,
    TWO_GROUPS,
)

from catalog.errors import CatalogError
from catalog.loading import LoadReport
from catalog.records import Inputs, Inverter, Module, Origin, Source
from catalog.store import Catalog


@pytest.fixture
def catalog(store_location: str) -> Iterator[Catalog]:
    """A new catalog with two modules and two inverters."""
    with Catalog.open(store_location, create=True) as opened:
        opened.load(MODULES, INVERTERS)
        yield opened


def id_of(catalog: Catalog, record: Module | Inverter) -> int:
    kind = "module" if isinstance(record, Module) else "inverter"
    return next(n.id for n in catalog.names(kind) if n.name == record.name)


def says(record: Module | Inverter) -> dict:
    """All of a record but its id and revision."""
    return {f.name: getattr(record, f.name) for f in fields(record) if f.name not in ("id", "revision")}


def test_records_come_back_as_they_went_in(catalog: Catalog) -> None:
    assert [says(m) for m in catalog.modules()] == [says(m) for m in MODULES]
    assert [says(i) for i in catalog.inverters()] == [says(i) for i in INVERTERS]
    assert [m.revision for m in catalog.modules()] == [1, 1]


def test_records_by_id(catalog: Catalog) -> None:
    id_ = id_of(catalog, TWO_GROUPS)
    assert says(catalog.inverter(id_)) == says(TWO_GROUPS)
    assert [i.model for i in catalog.inverters([id_])] == [TWO_GROUPS.model]
    assert catalog.inverters([]) == []


def test_unknown_values_stay_unknown(catalog: Catalog) -> None:
    module = catalog.module(id_of(catalog, GLASS))
    assert module.noct_c is None
    assert module.origin("noct_c") is None
    assert module.origin("bifaciality") is Origin.ASSUMED
    assert module.origin("voc_v") is Origin.STATED


def test_flags_are_flags_and_whole_numbers_whole(catalog: Catalog) -> None:
    module = catalog.module(id_of(catalog, MODULE))
    assert module.bifacial is False
    assert type(module.cells_in_series) is int
    assert type(module.pmax_w) is float


@pytest.mark.parametrize("kind", ["module", "inverter"])
def test_an_unknown_id_is_one_line(catalog: Catalog, kind: str) -> None:
    with pytest.raises(CatalogError, match=f"no {kind} with the id 999"):
        getattr(catalog, kind)(999)
    with pytest.raises(CatalogError, match=f"no {kind} with the id 999"):
        getattr(catalog, f"{kind}s")([999])


def test_a_module_is_no_inverter(catalog: Catalog) -> None:
    with pytest.raises(CatalogError, match="no inverter with the id"):
        catalog.inverter(id_of(catalog, MODULE))


def test_names(catalog: Catalog) -> None:
    assert [n.name for n in catalog.names("inverter")] == [i.name for i in INVERTERS]
    with pytest.raises(CatalogError, match="no kind 'battery'"):
        catalog.names("battery")


# Loading


def test_a_second_load_changes_nothing(catalog: Catalog) -> None:
    assert catalog.load(MODULES, INVERTERS) == LoadReport(new=0, changed=0, unchanged=4)
    assert [len(catalog.history("module", m.id)) for m in catalog.modules()] == [1, 1]


def test_a_newer_table_revises_only_what_changed(catalog: Catalog) -> None:
    newer = replace(MODULE, voc_v=38.4, source=TABLE_2024)
    other = replace(MODULE, model="AF6K-275P", source=TABLE_2024)
    same = replace(INVERTER, source=TABLE_2024)
    assert catalog.load([newer, other], [same]) == LoadReport(new=1, changed=1, unchanged=1)
    id_ = id_of(catalog, MODULE)
    assert (catalog.module(id_).voc_v, catalog.module(id_).revision) == (38.4, 2)
    assert catalog.module(id_).source == TABLE_2024
    assert says(catalog.module(id_, revision=1)) == says(MODULE)
    assert catalog.inverter(id_of(catalog, INVERTER)).revision == 1


def test_a_load_with_one_impossible_record_loads_nothing(catalog: Catalog) -> None:
    new = replace(MODULE, model="AF6K-300P")
    wrong = replace(MODULE, model="AF6K-301P", vmp_v=39.0)  # above Voc
    with pytest.raises(CatalogError, match="Alderfell Solar AF6K-301P: vmp_v"):
        catalog.load([new, wrong], [])
    assert len(catalog.names("module")) == 2


@pytest.mark.parametrize(
    ("change", "line"),
    [
        ({"voc_v": "38.2"}, "voc_v: '38.2' is not a number"),
        ({"bifacial": 1}, "bifacial: 1 is not yes or no"),
        ({"cells_in_series": 60.0}, "cells_in_series: 60.0 is not a whole number"),
        ({"noct_c": float("nan")}, "noct_c"),
        ({"model": "AF\x00"}, "model: .* cannot be printed"),
        ({"model": "AF\udcff"}, "model: .* cannot be printed"),
        ({"model": " "}, "model: is blank"),
        ({"model": "A" * 1001}, "model: .* longer than 1000"),
        ({"origins": {"colour": Origin.STATED}}, "'colour'"),
        ({"source": Source("")}, "source: is blank"),
    ],
)
def test_what_cannot_be_kept_is_refused(catalog: Catalog, change: dict, line: str) -> None:
    with pytest.raises(CatalogError, match=line) as refusal:
        catalog.load([replace(MODULE, **change)], [])
    assert "\n" not in str(refusal.value)


def test_several_impossible_records_are_counted(catalog: Catalog) -> None:
    wrong = [replace(MODULE, model=f"AF-{n}", voc_v=-1.0) for n in range(3)]
    with pytest.raises(CatalogError, match=r"AF-0: voc_v .*\(and 2 more records like it\)"):
        catalog.load(wrong, [])


def test_a_record_that_stands_twice_is_refused(catalog: Catalog) -> None:
    with pytest.raises(CatalogError, match="AF6K-270P stands twice"):
        catalog.load([MODULE, MODULE], [])


def test_progress_ends_at_the_total(catalog: Catalog) -> None:
    told: list[tuple[int, int]] = []
    catalog.load(
        [replace(MODULE, model=f"AF-{n}") for n in range(5)], INVERTERS, lambda *done: told.append(done)
    )
    assert told[-1] == (7, 7)


# Loading over what people entered


def test_a_newer_table_keeps_what_was_entered(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0, "mppt_low_v": 160.0}, REV_C)
    newer = replace(INVERTER, ac_power_w=5050.0, mppt_low_v=155.0, source=TABLE_2024)
    assert catalog.load([], [newer]) == LoadReport(new=0, changed=1, unchanged=0)
    now = catalog.inverter(id_)
    assert (now.max_dc_voltage_v, now.mppt_low_v, now.ac_power_w) == (600.0, 160.0, 5050.0)
    assert now.origin("mppt_low_v") is Origin.ENTERED
    assert (now.source_of("mppt_low_v"), now.source_of("ac_power_w")) == (REV_C, TABLE_2024)
    # The table's own values stay readable.
    assert says(catalog.inverter(id_, now.revision - 1)) == says(newer)
    assert catalog.load([], [newer]) == LoadReport(new=0, changed=0, unchanged=1)
    assert catalog.inverter(id_) == now


def test_amended_records_do_not_count_as_changed(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    amended = catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0}, REV_C)
    assert catalog.load(MODULES, INVERTERS) == LoadReport(new=0, changed=0, unchanged=4)
    assert catalog.inverter(id_) == amended


def test_a_value_that_was_taken_away_stays_away(catalog: Catalog) -> None:
    id_ = id_of(catalog, MODULE)
    catalog.amend("module", id_, {"noct_c": None}, REV_C)
    catalog.load([replace(MODULE, noct_c=46.0, source=TABLE_2024)], [])
    assert catalog.module(id_).noct_c is None


def test_a_sheet_fills_and_replaces_what_a_table_said(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    sheet = replace(
        INVERTER,
        source=SHEET,
        max_dc_voltage_v=600.0,
        weighted_efficiency_pct=None,
        mppt_low_v=140.0,
        inputs=(Inputs(trackers=2, max_isc_a=18.0),),
        origins={},
    )
    catalog.load([], [sheet])
    now = catalog.inverter(id_)
    assert (now.max_dc_voltage_v, now.mppt_low_v, now.inputs) == (600.0, 140.0, sheet.inputs)
    assert now.weighted_efficiency_pct == 97.0  # of the table, which alone states it
    assert now.source_of("weighted_efficiency_pct") == INVERTER.source
    # The table loaded again leaves the sheet's values; a newer one changes only what is still its own.
    catalog.load([], [INVERTER])
    assert catalog.inverter(id_) == now
    catalog.load([], [replace(INVERTER, mppt_low_v=120.0, weighted_efficiency_pct=96.5, source=TABLE_2024)])
    later = catalog.inverter(id_)
    assert (later.mppt_low_v, later.weighted_efficiency_pct, later.inputs) == (140.0, 96.5, sheet.inputs)


def test_an_assumed_value_replaces_no_stated_one(catalog: Catalog) -> None:
    id_ = id_of(catalog, TWO_GROUPS)
    table = replace(
        TWO_GROUPS, inputs=(Inputs(trackers=1),), origins={"inputs": Origin.ASSUMED}, source=TABLE_2024
    )
    catalog.load([], [table])
    assert catalog.inverter(id_).inputs == TWO_GROUPS.inputs


def test_an_export_that_comes_back_changes_nothing(catalog: Catalog) -> None:
    catalog.amend("inverter", id_of(catalog, INVERTER), {"max_dc_voltage_v": 600.0}, REV_C)
    catalog.load([], [replace(INVERTER, ac_power_w=5050.0, source=TABLE_2024)])
    records = catalog.modules(), catalog.inverters()
    assert catalog.load(*records) == LoadReport(new=0, changed=0, unchanged=4)
    assert (catalog.modules(), catalog.inverters()) == records


def test_an_edited_export_takes_effect(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    amended = catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0}, REV_C)
    catalog.load([], [replace(amended, max_dc_voltage_v=550.0)])
    assert catalog.inverter(id_).max_dc_voltage_v == 550.0


# Amending


def test_amending_makes_a_revision_and_keeps_the_old_one(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    now = catalog.amend("inverter", id_, {"max_dc_voltage_v": 600}, REV_C, note="asked for by a check")
    assert (now.revision, now.max_dc_voltage_v) == (2, 600.0)
    assert now.origin("max_dc_voltage_v") is Origin.ENTERED
    assert (now.source_of("max_dc_voltage_v"), now.source) == (REV_C, INVERTER.source)
    assert now.origin("inputs") is Origin.ASSUMED
    assert says(catalog.inverter(id_, revision=1)) == says(INVERTER)
    assert catalog.inverter(id_) == now
    with pytest.raises(CatalogError, match="no revision 3: its revisions are 1 to 2"):
        catalog.inverter(id_, revision=3)


def test_amending_inputs(catalog: Catalog) -> None:
    groups = [Inputs(trackers=2, strings_per_tracker=1, max_isc_a=15.0)]
    now = catalog.amend("inverter", id_of(catalog, INVERTER), {"inputs": groups}, REV_C)
    assert now.inputs == tuple(groups)
    assert now.origin("inputs") is Origin.ENTERED


def test_amending_to_what_is_known_already_adds_no_revision(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    first = catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0}, REV_C)
    assert catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0}, REV_C) == first


@pytest.mark.parametrize(
    ("kind", "changes", "line"),
    [
        ("inverter", {"max_dc_volts": 600.0}, "no field 'max_dc_volts'; near to it: max_dc_voltage_v"),
        ("inverter", {"max_dc_voltage_v": 400.0}, "Quillon QN-5000 .*max_dc_voltage_v|mppt_high_v"),
        ("inverter", {"mppt_low_v": None}, "mppt_low_v: lower end of the MPPT window is missing"),
        ("inverter", {"max_dc_voltage_v": "600"}, "max_dc_voltage_v: '600' is not a number"),
        ("inverter", {"inputs": []}, "inputs: at least one group"),
        ("inverter", {"inputs": 2}, "inputs: at least one group"),
        ("module", {"model": "AF"}, "the model is the record's name"),
        ("battery", {"model": "AF"}, "no kind 'battery'"),
    ],
)
def test_amending_refuses(catalog: Catalog, kind: str, changes: dict, line: str) -> None:
    id_ = id_of(catalog, MODULE if kind == "module" else INVERTER)
    with pytest.raises(CatalogError, match=line):
        catalog.amend(kind, id_, changes, REV_C)
    assert catalog.load(MODULES, INVERTERS).unchanged == 4


def test_a_change_decided_on_an_older_revision_is_refused(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0}, REV_C, expected=1)
    with pytest.raises(CatalogError, match="changed by someone else meanwhile"):
        catalog.amend("inverter", id_, {"max_dc_voltage_v": 550.0}, REV_C, expected=1)
    with pytest.raises(CatalogError, match="changed by someone else meanwhile"):
        catalog.undo("inverter", id_, expected=1)
    assert catalog.inverter(id_).max_dc_voltage_v == 600.0


def test_history_tells_who_from_what_and_when(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0}, REV_C, note="read by phone")
    first, second = catalog.history("inverter", id_)
    assert (first.number, first.act, first.source) == (1, "loaded", INVERTER.source)
    assert {c.field for c in first.changes} >= {"ac_power_w", "mppt_low_v"}
    assert all(c.old is None for c in first.changes)
    assert (second.act, second.source, second.note) == ("amended", REV_C, "read by phone")
    assert second.created_at.tzinfo is not None
    (change,) = second.changes
    assert (change.field, change.old, change.new, change.source) == ("max_dc_voltage_v", None, 600.0, REV_C)
    with pytest.raises(CatalogError, match="no inverter with the id 999"):
        catalog.history("inverter", 999)


def test_undo_restores_and_deletes_nothing(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0}, REV_C)
    catalog.amend("inverter", id_, {"max_dc_voltage_v": 550.0}, REV_C)
    assert catalog.undo("inverter", id_).max_dc_voltage_v == 600.0
    assert catalog.undo("inverter", id_).max_dc_voltage_v is None
    with pytest.raises(CatalogError, match="no earlier revision"):
        catalog.undo("inverter", id_)
    acts = [r.act for r in catalog.history("inverter", id_)]
    assert acts == ["loaded", "amended", "amended", "undone", "undone"]
    last = catalog.history("inverter", id_)[-1]
    assert [(c.field, c.old, c.new) for c in last.changes] == [("max_dc_voltage_v", 600.0, None)]
    assert catalog.amend("inverter", id_, {"phases": 3}, REV_C).revision == 6
    assert catalog.undo("inverter", id_).phases == 1


def test_a_load_is_undone_as_a_whole(catalog: Catalog) -> None:
    id_ = id_of(catalog, INVERTER)
    amended = catalog.amend("inverter", id_, {"max_dc_voltage_v": 600.0}, REV_C)
    catalog.load([], [replace(INVERTER, ac_power_w=5050.0, source=TABLE_2024)])
    assert says(catalog.undo("inverter", id_)) == says(amended)


def test_entering_a_record(catalog: Catalog) -> None:
    record = replace(GLASS, model="AF9B-450", origins={"voc_v": Origin.ENTERED})
    entered = catalog.enter(record, note="by hand")
    assert says(entered) == says(record)
    assert catalog.module(entered.id) == entered
    assert catalog.history("module", entered.id)[0].act == "entered"
    with pytest.raises(CatalogError, match="AF9B-450 is in the catalog already: .*sheet amend"):
        catalog.enter(replace(record, model="af9b-450"))
    with pytest.raises(CatalogError, match="voc_v"):
        catalog.enter(replace(record, model="AF9B-460", voc_v=0.0))


# Sites


def test_sites(catalog: Catalog) -> None:
    catalog.add_site(SITE)
    assert catalog.sites() == [SITE]
    assert catalog.site("low  WHARF") == SITE
    with pytest.raises(CatalogError, match="'Low Wharf' already"):
        catalog.add_site(replace(SITE, name="LOW WHARF"))
    warmer = replace(SITE, name="Low wharf", design_high_c=40.0)
    catalog.add_site(warmer, replace=True)
    assert catalog.sites() == [warmer]
    with pytest.raises(CatalogError, match="no site is called 'Low Warf'; near to it: Low wharf"):
        catalog.site("Low Warf")
    catalog.drop_site("LOW WHARF")
    assert catalog.sites() == []
    with pytest.raises(CatalogError, match="ferrule site add"):
        catalog.drop_site("Low Wharf")


def test_an_impossible_site_is_refused(catalog: Catalog) -> None:
    with pytest.raises(CatalogError, match="95 degC"):
        catalog.add_site(replace(SITE, design_high_c=95.0))
    assert catalog.sites() == []


# What was computed


def test_keeping(catalog: Catalog) -> None:
    assert catalog.kept("year") is None
    catalog.keep("year", b"\x00\xff")
    catalog.keep("year", b"\x01\x00")
    assert catalog.kept("year") == b"\x01\x00"


def test_the_oldest_kept_things_give_way(catalog: Catalog) -> None:
    for n in range(205):
        catalog.keep(f"year {n}", b"x")
    assert catalog.kept("year 0") is None
    assert catalog.kept("year 204") == b"x"


def test_reading_only(catalog: Catalog, store_location: str) -> None:
    with Catalog.open(store_location, readonly=True) as reader:
        assert len(reader.modules()) == 2
        reader.keep("year", b"x")
        assert reader.kept("year") is None
        with pytest.raises(CatalogError, match="for reading only"):
            reader.add_site(SITE)


# The public tables


def test_the_public_tables_come_back_whole(cec_catalog: Path) -> None:
    from catalog.cec import read_cec_inverters, read_cec_modules

    with Catalog.open(cec_catalog, readonly=True) as catalog:
        assert [says(m) for m in catalog.modules()] == [says(m) for m in read_cec_modules()]
        assert [says(i) for i in catalog.inverters()] == [says(i) for i in read_cec_inverters()]
