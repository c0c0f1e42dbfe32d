"""``ferrule sheet``: amend, history, undo, export, and loading tables of others."""

from __future__ import annotations

import json
import shlex

import pytest
from catalog_records import INVERTER, TWO_GROUPS

from catalog.errors import CatalogError
from catalog.assignments import changes_of
from catalog.records import Inputs, Origin
from catalog.store import Catalog
from cli.quoting import amend_command
from matcher.checks import Confirm

SOURCE = ("--source", "datasheet rev C, page 2")


@pytest.fixture
def record(small_catalog):
    """A record of the catalog by its model, as it counts now."""

    def record_(model):
        with Catalog.open(small_catalog, readonly=True) as catalog:
            return next(r for r in [*catalog.modules(), *catalog.inverters()] if r.model == model)

    return record_


def test_amending_keeps_the_old_value_readable(ferrule, record):
    ran = ferrule("sheet", "amend", "af6k 270p", "max_system_voltage_v=1000", *SOURCE)
    assert ran.status == 0
    assert "max_system_voltage_v: not stated -> 1,000 V (entered)" in ran.out
    now = record("AF6K-270P")
    assert (now.max_system_voltage_v, now.revision) == (1000.0, 2)
    assert now.origin("max_system_voltage_v") is Origin.ENTERED
    assert now.source_of("max_system_voltage_v").name == "datasheet rev C, page 2"
    assert now.source_of("voc_v").name == "Harbour table"
    before = json.loads(ferrule("sheet", "show", "af6k 270p", "--at", 1, "--json").out)
    assert before["values"]["max_system_voltage_v"]["value"] is None


def test_history_tells_from_whom_what_and_when(ferrule, small_catalog):
    ferrule(
        "sheet", "amend", "af6k 270p", "noct_c=46", "max_series_fuse_a=20 A", "--note", "by phone", *SOURCE
    )
    out = ferrule("sheet", "history", "af6k 270p").out
    assert "revision 2" in out and "amended, from datasheet rev C, page 2" in out and "note: by phone" in out
    assert "noct_c: 45 degC -> 46 degC (entered)" in out
    document = json.loads(ferrule("sheet", "history", "af6k 270p", "--json").out)
    assert document["schema"] == "ferrule.history/1" and document["current_revision"] == 2
    changes = {c["field"]: (c["old"], c["new"]) for c in document["revisions"][1]["changes"]}
    assert changes == {"noct_c": (45.0, 46.0), "max_series_fuse_a": (None, 20.0)}


def test_undo_goes_back_and_further_back(ferrule, record):
    ferrule("sheet", "amend", "af6k 270p", "noct_c=46", *SOURCE)
    ferrule("sheet", "amend", "af6k 270p", "noct_c=47", *SOURCE)
    assert "noct_c: 47 degC -> 46 degC" in ferrule("sheet", "undo", "af6k 270p").out
    assert "noct_c: 46 degC -> 45 degC" in ferrule("sheet", "undo", "af6k 270p").out
    assert record("AF6K-270P").revision == 5
    ran = ferrule("sheet", "undo", "af6k 270p")
    assert ran.status == 2 and "no earlier revision" in ran.err


def test_what_is_said_already_changes_nothing(ferrule, record):
    ferrule("sheet", "amend", "af6k 270p", "noct_c=46", *SOURCE)
    assert "nothing changed" in ferrule("sheet", "amend", "af6k 270p", "noct_c=46", *SOURCE).out
    assert record("AF6K-270P").revision == 2


def test_groups_of_trackers(ferrule, record):
    assert ferrule("sheet", "amend", "qn-8000 duo", "inputs[2].max_isc_a=16 A", *SOURCE).status == 0
    first, second = record("QN-8000 Duo").inputs
    assert first == TWO_GROUPS.inputs[0]
    assert second == Inputs(
        trackers=2, strings_per_tracker=1, max_current_a=11.0, max_isc_a=16.0, max_power_w=4000.0
    )
    ferrule("sheet", "amend", "qn-8000 duo", "inputs=3 trackers: 20 A", *SOURCE)
    assert record("QN-8000 Duo").inputs == (Inputs(trackers=3, max_current_a=20.0),)


def test_ratings_of_trackers_whose_number_is_assumed_need_the_number(ferrule, record):
    ran = ferrule("sheet", "amend", "qn-5000", "inputs.max_isc_a=20", *SOURCE)
    assert ran.status == 2 and "assumed" in ran.err and "inputs.trackers=" in ran.err
    assert (
        ferrule("sheet", "amend", "qn-5000", "inputs.trackers=2", "inputs.max_isc_a=20", *SOURCE).status == 0
    )
    assert record("QN-5000 [240V]").inputs == (Inputs(trackers=2, max_isc_a=20.0),)


def test_values_in_other_units_and_taken_away(ferrule, record):
    ferrule(
        "sheet",
        "amend",
        "af6k 270p",
        "voc_coef_pct=-118 mV/K",
        "pmax_coef_pct=",
        "max_system_voltage_v=1 kV",
        *SOURCE,
    )
    now = record("AF6K-270P")
    # -0.118 V/K of 38.2 V.
    assert now.voc_coef_pct == pytest.approx(-0.308901, abs=1e-6)
    assert (now.pmax_coef_pct, now.max_system_voltage_v) == (None, 1000.0)


@pytest.mark.parametrize(
    ("values", "says"),
    [
        (["max_dc=600"], "no field 'max_dc'; near to it: max_dc_voltage_v"),
        (["600"], "write a field and its value"),
        (["max_dc_voltage_v=300"], "mppt_high_v 480 V is above max_dc_voltage_v 300 V"),
        (["max_dc_voltage_v=six"], "max_dc_voltage_v: 'six' is no number in V"),
        (["max_dc_voltage_v=600 A"], "is in A, which is no V"),
        (["max_dc_voltage_v=600", "max_dc_voltage_v=650"], "given twice"),
        (["model=other"], "stays"),
        (["inputs[3].max_isc_a=20"], "no group 3 of trackers; it has 1"),
        (["inputs.max_ics_a=20"], "no 'max_ics_a'; near to it: max_isc_a"),
        (["max_isc_a=20"], "write inputs[1].max_isc_a="),
        (["inputs.trackers="], "every group needs trackers"),
        (["phases[1]=1"], "only an inverter's inputs have parts"),
    ],
)
def test_what_is_refused_changes_nothing(ferrule, record, values, says):
    ran = ferrule("sheet", "amend", "qn-5000", *values, *SOURCE)
    assert ran.status == 2 and says in ran.err and ran.err.count("\n") == 1
    assert record("QN-5000 [240V]").revision == 1


def test_a_document_must_be_named(ferrule, small_catalog):
    assert "--source" in ferrule("sheet", "amend", "qn-5000", "phases=1").err
    assert "--source is blank" in ferrule("sheet", "amend", "qn-5000", "phases=1", "--source", " ").err


def test_of_several_groups_one_must_be_meant():
    with pytest.raises(CatalogError, match="there are 2 groups"):
        changes_of(TWO_GROUPS, ["inputs.max_isc_a=20"])


def test_a_value_to_confirm_is_one_command_away(ferrule, small_catalog, record):
    asked = Confirm("inverter", "max_dc_voltage_v", 561.2, "V")
    words = shlex.split(amend_command(INVERTER, asked))
    assert words[0] == "ferrule"
    filled = [word.replace("VALUE", "600").replace("DOCUMENT", "sheet") for word in words[1:]]
    assert ferrule(*filled).status == 0
    assert record("QN-5000 [240V]").max_dc_voltage_v == 600.0


def test_that_command_asks_for_the_number_of_trackers_where_it_is_assumed(ferrule, small_catalog, record):
    asked = Confirm("inverter", "max_isc_a", 14.4, "A", inputs=0)
    words = shlex.split(amend_command(INVERTER, asked).replace("\\\n", ""))
    assert (
        ferrule(*[word.replace("VALUE", "2").replace("DOCUMENT", "sheet") for word in words[1:]]).status == 0
    )
    assert record("QN-5000 [240V]").inputs == (Inputs(trackers=2, max_isc_a=2.0),)
    assert "trackers=" not in amend_command(TWO_GROUPS, Confirm("inverter", "max_isc_a", 14.4, "A", inputs=1))


# ---- export


@pytest.mark.parametrize("ending", ["csv", "xlsx", "toml", "json"])
def test_what_is_exported_comes_back_unchanged(ferrule, small_catalog, tmp_path, ending):
    ferrule("sheet", "amend", "qn-8000 duo", "night_w=1", *SOURCE)
    file = tmp_path / f"all.{ending}"
    assert ferrule("sheet", "export", file).status == 0
    assert "0 new, 0 changed, 4 unchanged" in ferrule("sheet", "load", file).out
    ferrule("sheet", "load", file, "--catalog", tmp_path / "other.sqlite")
    with Catalog.open(small_catalog) as one, Catalog.open(tmp_path / "other.sqlite") as other:
        for kind in ("modules", "inverters"):
            key = lambda r: (r.name, r.source, dict(r.origins), dict(r.sources), getattr(r, "inputs", None))  # noqa: E731
            assert [key(r) for r in getattr(one, kind)()] == [key(r) for r in getattr(other, kind)()]


def test_export_of_some_records(ferrule, small_catalog, tmp_path):
    file = tmp_path / "some.csv"
    assert "1 module and 0 inverters" in ferrule("sheet", "export", file, "af6k 270p").out
    assert "exists" in ferrule("sheet", "export", file).err
    assert (
        "0 modules and 2 inverters" in ferrule("sheet", "export", file, "--kind", "inverter", "--force").out
    )
    assert (
        "0 modules and 1 inverter"
        in ferrule("sheet", "export", file, "--where", "phases == 3", "--force").out
    )
    assert ferrule("sheet", "export", tmp_path / "a.csv", "--where", "phases == 2").status == 2
    assert ".csv, .xlsx" in ferrule("sheet", "export", tmp_path / "a.pdf").err


# ---- tables of others

TABLE = """Manufacturer;Model;Cell type;Pmax (W);Voc (V);Isc (A);Vmp (V);Imp (A);Tempco Voc
Paper Sun;P-400;mono;400;45,6;11,2;37,9;10,56;-0,27
"""


def test_doubtful_columns_are_shown_and_confirmed_and_kept(ferrule, small_catalog, tmp_path, record):
    file = tmp_path / "season.csv"
    file.write_text(TABLE)
    ran = ferrule("sheet", "load", file, "--set", "bifacial=no")
    assert ran.status == 2
    assert "Voc (V)      " in ran.err and "voc_v in V" in ran.err
    assert (
        "1 column to confirm:" in ran.err
        and "--yes" in ran.err
        and '--map "Tempco Voc=voc_coef_pct"' in ran.err
    )
    assert ferrule("sheet", "load", file, "--set", "bifacial=no", "--yes").status == 0
    assert record("P-400").voc_coef_pct == -0.27
    # What was confirmed once holds for the next table with these headings.
    file.write_text(TABLE.replace("P-400", "P-405").replace("400;", "405;").replace("37,9", "38,3"))
    ran = ferrule("sheet", "load", file, "--set", "bifacial=no")
    assert ran.status == 0 and "as kept" in ran.err


def test_a_column_can_be_said(ferrule, small_catalog, tmp_path, record):
    file = tmp_path / "season.csv"
    file.write_text(TABLE)
    ran = ferrule("sheet", "load", file, "--set", "bifacial=no", "--map", "Tempco Voc=voc_coef_pct in V/K")
    assert ran.status == 0
    assert record("P-400").voc_coef_pct == pytest.approx(-0.592105)
    for said, says in (
        ("Tempco=voc_v", "no table with headings of its own has such a column"),
        ("Tempco Voc=voc_w", "no field 'voc_w'"),
        ("Tempco Voc=voc_coef_pct in kg", "'kg' is no unit of voc_coef_pct"),
        ("nothing", "write it like --map"),
    ):
        ran = ferrule("sheet", "load", file, "--set", "bifacial=no", "--yes", "--map", said)
        assert ran.status == 2 and says in ran.err


def test_all_that_a_table_lacks_is_told_at_once_with_the_options_to_add(ferrule, small_catalog, tmp_path):
    file = tmp_path / "season.csv"
    file.write_text(TABLE.replace("Cell type;", "").replace("mono;", ""))
    ran = ferrule("sheet", "load", file)
    assert ran.status == 2 and "1 column to confirm and 2 values that no column gives" in ran.err
    (line,) = [line for line in ran.err.splitlines() if "add to the command" in line]
    options = line.partition(": ")[2].split()
    assert options == ["--yes", "--set", "technology=Mono-c-Si", "--set", "bifacial=no"]
    assert ferrule("sheet", "load", file, *options).status == 0


def test_what_an_inverter_table_lacks_is_told_at_once(ferrule, small_catalog, tmp_path):
    file = tmp_path / "inverters.csv"
    file.write_text("Manufacturer,Model,Power,Max DC (V),Trackers\nPaper Sun,I-5,5000,1000,2\n")
    ran = ferrule("sheet", "load", file)
    assert "2 columns to confirm and 2 values that no column gives" in ran.err
    assert "--yes --set mppt_low_v=... --set mppt_high_v=..." in ran.err


def test_columns_to_confirm_and_bad_rows_are_told_in_one_try(ferrule, small_catalog, tmp_path):
    file = tmp_path / "inverters.csv"
    file.write_text(
        "Manufacturer,Model,AC power (W),MPPT range (V),Trackers,Short circuit current (A)\n"
        "Paper Sun,I-5,five,100-500,1,16\nPaper Sun,I-6,6000,100-,1,16\nPaper Sun,I-7,7000,900-500,1,16\n"
    )
    # Of the inverter's input it is the limit, most of the time: asked about, not left out.
    for more, asked in (((), True), (("--yes",), False)):
        ran = ferrule("sheet", "load", file, *more)
        faults = [line for line in ran.err.splitlines() if line.startswith("ferrule: ")]
        assert ran.status == 2 and ("'Short circuit current (A)' is max_isc_a in A?" in ran.err) == asked
        rows = [line.partition(", row ")[2].split(" ")[0] for line in faults]
        assert rows == ["1:"] * asked + ["2", "3", "4"]


@pytest.mark.parametrize("text", ["...", "Gold"])
def test_a_technology_that_names_no_cells_is_refused_with_those_that_may_stand_there(
    ferrule, small_catalog, tmp_path, text
):
    file = tmp_path / "season.csv"
    file.write_text(TABLE.replace("Cell type;", "").replace("mono;", ""))
    ran = ferrule("sheet", "load", file, "--yes", "--set", f"technology={text}", "--set", "bifacial=no")
    assert ran.status == 2 and f"--set technology={text}: " in ran.err and "Mono-c-Si, Multi-c-Si" in ran.err


def test_a_table_under_our_own_headings_tells_all_that_a_row_lacks(ferrule, small_catalog, tmp_path):
    own, other = tmp_path / "own.csv", tmp_path / "other.csv"
    own.write_text("maker,model,pmax_w,voc_v,isc_a,vmp_v,imp_a\nPaper Sun,P-1,400,45.6,11.2,37.9,10.56\n")
    other.write_text("maker,model,ac_power_w\nPaper Sun,I-1,5000\n")
    ran = ferrule("sheet", "load", own, other)
    assert ran.status == 2 and "--set technology=Mono-c-Si --set bifacial=no" in ran.err
    assert "needs also mppt_low_v" in ran.err, "both files are told of"


@pytest.mark.parametrize("word", ["plain", "two words", "inputs[1].x=VALUE", 'say "x"', "it's", "a$b `c` !d \\e", "W (W)=x"])
def test_what_is_to_be_pasted_is_one_word_to_a_shell(word):
    from cli.quoting import quoted

    assert shlex.split(quoted(word)) == [word]
    assert quoted(word)[0] != "'" or set('"$`\\!') & set(word), "one kind of quotes where it can be"
