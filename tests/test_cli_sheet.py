"""``ferrule sheet``: load, find, show."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import pytest

from catalog.records import Inputs, Inverter, Module, specs
from catalog.store import Catalog

MODULE_SHEET = """
source = "Alderfell datasheet"
source_revision = "rev B"

[[module]]
maker = "Alderfell Solar"
model = "AF6K-270P"
technology = "Multi-c-Si"
bifacial = false
pmax_w = 270
voc_v = 38.2
isc_a = 9.2
vmp_v = 31.1
imp_a = 8.68
voc_coef_pct = -0.31
"""


@pytest.fixture
def sheet(tmp_path) -> Path:
    path = tmp_path / "alderfell.toml"
    path.write_text(MODULE_SHEET)
    return path


def first_rows(table: Path, target: Path, rows: int) -> Path:
    """A CEC table cut to its heading (3 lines) and some rows."""
    lines = table.read_text(encoding="utf-8").splitlines(keepends=True)
    target.write_text("".join(lines[: 3 + rows]), encoding="utf-8")
    return target


@pytest.fixture
def few_modules(cec_modules_path, tmp_path) -> Path:
    return first_rows(cec_modules_path, tmp_path / "modules.csv", 5)


@pytest.fixture
def few_inverters(cec_inverters_path, tmp_path) -> Path:
    return first_rows(cec_inverters_path, tmp_path / "inverters.csv", 4)


# Loading


def test_load_makes_the_catalog_and_tells_what_is_new(ferrule, sheet, tmp_path):
    ran = ferrule("sheet", "load", sheet)
    assert ran.status == 0
    assert "1 module and 0 inverters: 1 new, 0 changed, 0 unchanged" in ran.out
    assert str(tmp_path / "small.sqlite") in ran.out.replace("\n", "")
    with Catalog.open(tmp_path / "small.sqlite") as catalog:
        assert [m.name for m in catalog.modules()] == ["Alderfell Solar AF6K-270P"]


def test_load_again_changes_nothing_and_a_new_value_makes_a_revision(ferrule, sheet):
    ferrule("sheet", "load", sheet)
    assert "0 new, 0 changed, 1 unchanged" in ferrule("sheet", "load", sheet).out
    sheet.write_text(MODULE_SHEET.replace("38.2", "38.4"))
    assert "0 new, 1 changed, 0 unchanged" in ferrule("sheet", "load", sheet).out
    values = {
        rev: json.loads(ferrule("sheet", "show", "af6k270p", "--at", rev, "--json").out) for rev in (1, 2)
    }
    assert [values[rev]["values"]["voc_v"]["value"] for rev in (1, 2)] == [38.2, 38.4]


def test_load_takes_several_files_all_or_nothing(ferrule, sheet, tmp_path):
    bad = tmp_path / "bad.toml"
    bad.write_text(MODULE_SHEET.replace("AF6K-270P", "AF6K-275P").replace("31.1", "41.1"))
    ran = ferrule("sheet", "load", sheet, bad)
    assert ran.status == 2
    assert "bad.toml" in ran.err and "AF6K-275P" in ran.err and ran.err.count("\n") == 1
    assert not (tmp_path / "small.sqlite").exists()


def test_load_cec_with_one_table_loads_only_that(ferrule, few_modules, few_inverters):
    assert "5 modules and 0 inverters: 5 new" in ferrule("sheet", "load", "cec", "--modules", few_modules).out
    assert (
        "0 modules and 4 inverters: 4 new"
        in ferrule("sheet", "load", "cec", "--inverters", few_inverters).out
    )
    both = ferrule("sheet", "load", "cec", "--modules", few_modules, "--inverters", few_inverters).out
    assert "5 modules and 4 inverters: 0 new, 0 changed, 9 unchanged" in both


def test_load_cec_takes_the_installed_tables(ferrule, monkeypatch, few_modules, few_inverters, tmp_path):
    from catalog import cec_table

    # The whole tables take seconds, and are loaded elsewhere; here only which ones are asked for.
    monkeypatch.setattr(cec_table, "_installed", {"module": few_modules, "inverter": few_inverters}.get)
    assert "5 modules and 4 inverters: 9 new" in ferrule("sheet", "load", "cec").out


def test_a_newer_cec_table_makes_new_revisions_of_what_changed(ferrule, few_modules):
    ferrule("sheet", "load", "cec", "--modules", few_modules)
    with few_modules.open(newline="", encoding="utf-8") as file:
        rows = list(csv.reader(file))
    fourth = rows[3 + 3]
    noct = rows[0].index("T_NOCT")
    old, fourth[noct] = float(fourth[noct]), "51.5"
    with few_modules.open("w", newline="", encoding="utf-8") as file:
        csv.writer(file).writerows(rows)
    assert "0 new, 1 changed, 4 unchanged" in ferrule("sheet", "load", "cec", "--modules", few_modules).out
    shown = [json.loads(ferrule("sheet", "show", fourth[0], "--json", *at).out) for at in ((), ("--at", 1))]
    assert [s["values"]["noct_c"]["value"] for s in shown] == [51.5, old]
    assert [(s["revision"], s["current_revision"]) for s in shown] == [(2, 2), (1, 2)]


def test_a_cec_table_given_by_its_path_is_recognised(ferrule, few_modules, few_inverters):
    assert "5 modules and 4 inverters: 9 new" in ferrule("sheet", "load", few_modules, few_inverters).out


def test_load_keeps_what_is_odd_and_says_so(ferrule, sheet):
    sheet.write_text(MODULE_SHEET + "isc_coef_pct = -0.05\n")
    ran = ferrule("sheet", "load", sheet)
    assert ran.status == 0 and "1 new" in ran.out
    assert "isc_coef_pct" in ran.err and "check the sign" in " ".join(ran.err.split())
    shown = ferrule("sheet", "show", "af6k 270p").out
    assert "odd: isc_coef_pct" in shown


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("cec", "x.toml"), "by itself"),
        (("x.toml", "--modules", "y.csv"), "--modules belongs to 'ferrule sheet load cec'"),
        (("nowhere.toml",), "nowhere.toml: cannot be read"),
        (("cecc",), "'cec' for the public tables"),
        (("cec", "--modules", "nowhere.csv"), "nowhere.csv"),
        (("pyproject.docx",), ".xlsx, .toml or .json"),
    ],
)
def test_load_refuses_in_one_line(ferrule, tmp_path, arguments, said):
    ran = ferrule("sheet", "load", *arguments)
    assert ran.status == 2
    assert said in ran.err and ran.err.count("\n") == 1
    assert not (tmp_path / "small.sqlite").exists()


def test_load_of_a_cut_table_loads_nothing(ferrule, few_modules, few_inverters, tmp_path):
    few_modules.write_text(few_modules.read_text(encoding="utf-8")[:-40], encoding="utf-8")
    ran = ferrule("sheet", "load", "cec", "--modules", few_modules, "--inverters", few_inverters)
    assert ran.status == 2
    assert "row 8" in ran.err and "cut off" in ran.err
    assert not (tmp_path / "small.sqlite").exists()


def test_an_interrupted_load_leaves_nothing(ferrule, sheet, monkeypatch, tmp_path):
    from contextlib import contextmanager

    from cli import sheet_load

    def interrupt(done: int, total: int) -> None:
        if done == total:
            raise KeyboardInterrupt

    @contextmanager
    def progress():
        yield interrupt

    monkeypatch.setattr(sheet_load, "_progress", progress)
    ran = ferrule("sheet", "load", sheet)
    assert ran.status == 130 and "interrupted" in ran.err and ran.err.count("\n") == 1
    with Catalog.open(tmp_path / "small.sqlite") as catalog:
        assert catalog.modules() == []


# Finding


def test_find_shows_key_ratings_of_both_kinds(ferrule, small_catalog):
    ran = ferrule("sheet", "find", "af")
    assert ran.status == 0
    assert all(text in ran.out for text in ("AF6K-270P", "270.0", "38.20", "AF9B-440", "Mono-c-Si"))
    ran = ferrule("sheet", "find", "quillon")
    assert "150 to 480" in ran.out and "200 to 850" in ran.out
    assert "(1)" in ran.out, "a tracker that is only assumed stands in brackets"


def test_find_takes_words_in_any_order_and_unfinished(ferrule, small_catalog):
    assert "AF6K-270P" in ferrule("sheet", "find", "270", "alder").out
    assert "QN-8000 Duo" in ferrule("sheet", "find", "du", "--kind", "inverter").out


def test_find_ranks_the_name_itself_first(ferrule, cec_catalog):
    # SunPower SPR-E20-327 stands in the CEC table beside longer names that begin like it.
    found = json.loads(ferrule("sheet", "find", "spr-e20-327", "--json", "--catalog", cec_catalog).out)[
        "found"
    ]
    assert found[0]["model"] == "SPR-E20-327"
    assert len(found) > 3
    assert all("SPR-E20-327" in entry["model"] for entry in found)


def test_find_heeds_kind_and_limit(ferrule, small_catalog):
    found = json.loads(ferrule("sheet", "find", "a", "--limit", 1, "--json").out)["found"]
    assert len(found) == 1
    inverters = json.loads(ferrule("sheet", "find", "q", "--kind", "inverter", "--json").out)["found"]
    assert {entry["kind"] for entry in inverters} == {"inverter"}
    assert {entry["trackers"] for entry in inverters} == {1, 3}
    assert ferrule("sheet", "find", "quillon", "--kind", "module", "--json").status == 1
    assert "1 of 2 records shown" in ferrule("sheet", "find", "alderfell", "--limit", 1).out
    assert "2 records." in ferrule("sheet", "find", "alderfell").out


def test_find_says_where_names_are_merely_near(ferrule, small_catalog):
    ran = ferrule("sheet", "find", "af6k", "290p")
    assert "No name holds all of 'af6k 290p'" in ran.out and "AF6K-270P" in ran.out


def test_find_nothing_is_status_1(ferrule, small_catalog):
    ran = ferrule("sheet", "find", "zzzzzzzz")
    assert ran.status == 1 and "No module or inverter" in ran.out
    assert json.loads(ferrule("sheet", "find", "zzzzzzzz", "--json").out)["found"] == []


def test_find_with_an_unknown_kind(ferrule, small_catalog):
    ran = ferrule("sheet", "find", "x", "--kind", "battery")
    assert ran.status == 2 and "module or inverter" in ran.err


def test_an_empty_catalog_says_how_to_fill_it(ferrule, tmp_path):
    with Catalog.open(tmp_path / "small.sqlite", create=True):
        pass
    for command in ("find", "show"):
        ran = ferrule("sheet", command, "x")
        assert ran.status == 2 and "ferrule sheet load cec" in ran.err


# Showing


def rows_of(screen: str) -> dict[str, list[str]]:
    """Words of each line by the first."""
    return {line.split()[0]: line.split() for line in screen.splitlines() if line.strip()}


def test_show_tells_value_unit_origin_and_source_of_every_field(ferrule, small_catalog):
    lines = ferrule("sheet", "show", "af6k 270p").out.splitlines()
    assert lines[0] == "Alderfell Solar AF6K-270P (module, revision 1)"
    rows = rows_of("\n".join(lines))
    assert set(specs(Module)) - {"maker", "model"} <= set(rows)
    assert rows["voc_v"][1:5] == ["38.2", "V", "stated", "1"]
    assert rows["voc_coef_pct"][1:4] == ["-0.31", "%/K", "stated"]
    assert rows["max_system_voltage_v"][1:4] == ["V", "not", "stated"]
    assert "src 1: Harbour table, 2019-03-05" in lines


def test_show_tells_origins_other_sources_and_tracker_groups(ferrule, small_catalog):
    assert rows_of(ferrule("sheet", "show", "AF9B-440").out)["bifaciality"][1:3] == ["0.7", "assumed"]
    out = ferrule("sheet", "show", "qn-8000 duo").out
    rows = rows_of(out)
    assert rows["start_voltage_v"][1:5] == ["180", "V", "stated", "2"]
    assert "src 2: datasheet rev C, page 2" in out
    assert rows["1"] == ["1", "1", "2", "22", "30", "not", "stated"]
    assert rows["2"] == ["2", "2", "1", "11", "15", "4,000"]
    assert "(assumed, src 1)" in ferrule("sheet", "show", "qn-5000").out


def test_show_as_a_document_holds_null_for_what_is_not_known(ferrule, small_catalog):
    document = json.loads(ferrule("sheet", "show", "qn-8000 duo", "--json").out)
    assert document["schema"] == "ferrule.sheet/1"
    assert set(document["values"]) == set(specs(Inverter)) - {"maker", "model"}
    assert document["values"]["ac_voltage_v"] == {"value": None, "unit": "V", "origin": None, "source": None}
    assert document["values"]["start_voltage_v"]["source"] == {
        "name": "datasheet rev C, page 2",
        "revision": "",
    }
    assert [set(group) for group in document["inputs"]["groups"]] == [set(specs(Inputs))] * 2
    assert document["inputs"]["groups"][0]["max_power_w"] is None


def test_show_an_old_revision_says_that_it_no_longer_counts(ferrule, small_catalog):
    from catalog_records import SHEET

    with Catalog.open(small_catalog) as catalog:
        id_ = next(m.id for m in catalog.modules() if m.model == "AF6K-270P")
        catalog.amend("module", id_, {"max_system_voltage_v": 1000.0}, SHEET)
    row = rows_of(ferrule("sheet", "show", "af6k").out)["max_system_voltage_v"]
    assert row[1:5] == ["1,000", "V", "entered", "2"]
    old = ferrule("sheet", "show", "af6k", "--at", 1).out
    assert "revision 1, not the one that counts, which is 2" in old
    ran = ferrule("sheet", "show", "af6k", "--at", 9)
    assert ran.status == 2 and "9" in ran.err


def test_show_an_unknown_name_tells_the_nearest(ferrule, small_catalog):
    # Digits decide: a 275 W type is no typing error for the 270 W type (common practice, no source).
    ran = ferrule("sheet", "show", "af6k 275p")
    assert ran.status == 2 and not ran.out
    assert "no module or inverter is called 'af6k 275p'" in ran.err and "Alderfell Solar AF6K-270P" in ran.err


def test_show_an_ambiguous_name_lists_the_candidates_and_guesses_none(ferrule, small_catalog):
    ran = ferrule("sheet", "show", "quillon")
    assert ran.status == 2 and not ran.out
    assert "could be several" in ran.err
    assert "Quillon QN-5000 [240V]" in ran.err and "Quillon QN-8000 Duo" in ran.err
    assert ferrule("sheet", "show", "quillon", "--kind", "module").status == 2


def test_show_asks_for_the_kind_where_both_have_the_name(ferrule, sheet):
    inverter = sheet.with_name("inverter.toml")
    inverter.write_text(
        '[[inverter]]\nmaker = "Alderfell Solar"\nmodel = "AF6K-270P"\n'
        "ac_power_w = 250\nmppt_low_v = 22\nmppt_high_v = 48\n"
        'inputs = [{trackers = 1}]\nsource = "a leaflet"\n'
    )
    assert ferrule("sheet", "load", sheet, inverter).status == 0
    ran = ferrule("sheet", "show", "af6k-270p")
    assert ran.status == 2 and "(--kind inverter)" in ran.err and "(--kind module)" in ran.err
    assert "(inverter, revision 1)" in ferrule("sheet", "show", "af6k-270p", "--kind", "inverter").out
