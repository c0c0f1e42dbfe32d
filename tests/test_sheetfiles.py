"""Datasheet files: nothing is lost on the way out and back, and every fault is told in one helpful line."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest
import sheet_strategies as some
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.errors import CatalogError
from catalog.inputs_text import format_inputs, parse_inputs
from catalog.records import Inputs, Inverter, Module, Origin, Source
from catalog.sheetfiles import read_sheets, write_sheets

MODULES = """\
maker,model,technology,bifacial,pmax_w,voc_v,isc_a,vmp_v,imp_a,noct_c
Paper Sun,P-400,Mono-c-Si,no,400,45.6,11.2,37.9,10.56,44
Paper Sun,P-405,Mono-c-Si,no,405,45.8,11.25,38.1,10.63,
"""
INVERTERS = """\
maker,model,ac_power_w,mppt_low_v,mppt_high_v,max_dc_voltage_v,inputs
Paper Grid,G-10,10000,180,850,1000,"2 trackers: 2 strings, 26 A, Isc 32 A"
"""
TOML = """\
source = "Paper Grid datasheet"
source_revision = "2031-04"

[[inverter]]
maker = "Paper Grid"
model = "G-10"
ac_power_w = 10_000
mppt_low_v = 180
mppt_high_v = 850
assumed = ["mppt_low_v"]
sources = { mppt_high_v = { name = "Manual", revision = "7" } }
  [[inverter.inputs]]
  trackers = 2
  max_current_a = 26
  [[inverter.inputs]]
  trackers = 1
  strings_per_tracker = 1
"""


@pytest.fixture
def read(tmp_path):
    """Read a text as a file of the given name."""

    def read_(text: str | bytes, name: str = "sheet.csv"):
        path = tmp_path / name
        path.write_bytes(text.encode() if isinstance(text, str) else text)
        return read_sheets(path)

    return read_


@pytest.fixture
def refused(read):
    """The one line with which a text is refused."""

    def refused_(text: str | bytes, name: str = "sheet.csv") -> str:
        with pytest.raises(CatalogError) as caught:
            read(text, name)
        line = str(caught.value)
        assert "\n" not in line and name in line
        return line

    return refused_


def changed(text: str, old: str, new: str) -> str:
    assert old in text
    return text.replace(old, new)


# ---- round trips


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    st.lists(some.modules().filter(some.possible), max_size=3, unique_by=lambda r: r.name),
    st.lists(some.inverters().filter(some.possible), max_size=3, unique_by=lambda r: r.name),
    st.sampled_from(("sheet.csv", "sheet.toml", "sheet.xlsx", "sheet.json")),
)
def test_round_trip_loses_nothing(tmp_path, modules, inverters, name):
    if modules or inverters:
        write_sheets(tmp_path / name, modules, inverters)
        back = read_sheets(tmp_path / name)
        assert back.modules == modules
        assert back.inverters == inverters


@pytest.mark.parametrize("ending", ["csv", "toml", "xlsx", "json"])
def test_round_trip_of_the_public_tables(tmp_path, ending):
    modules, inverters = read_cec_modules()[::150], read_cec_inverters()[::25]
    write_sheets(tmp_path / f"table.{ending}", modules, inverters)
    back = read_sheets(tmp_path / f"table.{ending}")
    assert (back.modules, back.inverters) == (modules, inverters)


def test_id_and_revision_stay_in_the_catalog(tmp_path, read):
    module = read(MODULES).modules[0]
    write_sheets(tmp_path / "a.csv", [replace(module, id=7, revision=3)], [])
    assert read_sheets(tmp_path / "a.csv").modules == [module]


@given(st.lists(some.inputs(), min_size=1))
def test_inputs_as_text_and_back(groups):
    assert parse_inputs(format_inputs(groups)) == tuple(groups)


# ---- what is read


def test_csv_of_modules(read):
    sheet = read(MODULES)
    assert [m.model for m in sheet.modules] == ["P-400", "P-405"]
    assert sheet.modules[0].noct_c == 44.0 and sheet.modules[1].noct_c is None
    assert sheet.modules[0].source == Source("sheet.csv")
    assert sheet.modules[0].origins == {}
    assert len(sheet.notes) == 1 and "no source is named for 2 records" in sheet.notes[0]


def test_csv_of_inverters(read):
    (inverter,) = read(INVERTERS).inverters
    assert inverter.inputs == (Inputs(trackers=2, strings_per_tracker=2, max_current_a=26.0, max_isc_a=32.0),)
    assert inverter.origins == {}


def test_both_kinds_in_one_table(read):
    text = "kind,maker,model,technology,bifacial,pmax_w,voc_v,isc_a,vmp_v,imp_a,"
    text += "ac_power_w,mppt_low_v,mppt_high_v,source,assumed\n"
    text += "module,Paper Sun,P-400,Mono-c-Si,no,400,45.6,11.2,37.9,10.56,,,,List,\n"
    text += ",Paper Grid,G-10,,,,,,,,10000,180,850,List,mppt_low_v\n"
    sheet = read(text)
    assert (len(sheet.modules), len(sheet.inverters)) == (1, 1)
    # Nothing is said of trackers, so one is assumed, and shown as assumed.
    assert sheet.inverters[0].origins == {"mppt_low_v": Origin.ASSUMED, "inputs": Origin.ASSUMED}
    assert "one tracker is assumed" in " ".join(sheet.notes)


def test_toml(read):
    (inverter,) = read(TOML, "sheet.toml").inverters
    assert inverter.inputs == (
        Inputs(trackers=2, max_current_a=26.0),
        Inputs(trackers=1, strings_per_tracker=1),
    )
    assert inverter.source == Source("Paper Grid datasheet", "2031-04")
    assert inverter.source_of("mppt_high_v") == Source("Manual", "7")
    assert inverter.origin("mppt_low_v") is Origin.ASSUMED
    assert isinstance(inverter.ac_power_w, float)


@pytest.mark.parametrize("mark", [";", "\t"])
def test_other_separators(read, mark):
    assert read(MODULES.replace(",", mark)).modules == read(MODULES).modules


def test_byte_order_mark_and_line_ends_of_spreadsheets(read):
    assert read(b"\xef\xbb\xbf" + MODULES.replace("\n", "\r\n").encode()).modules == read(MODULES).modules


def test_headings_with_units_in_brackets(read):
    text = changed(MODULES, "pmax_w,voc_v,isc_a", "Pmax [W],Voc (V),ISC_A")
    assert read(text).modules == read(MODULES).modules


def test_decimal_commas(read):
    text = re.sub(r"(?<=\d)\.(?=\d)", "#", MODULES).replace(",", ";").replace("#", ",")
    sheet = read(text)
    assert sheet.modules == read(MODULES).modules
    assert any("decimal commas" in note for note in sheet.notes)


@pytest.mark.parametrize("cell", ["44 degC", "44 \u00b0C", "44.0", "4.4e1", " 44 ", "+44"])
def test_ways_to_write_a_number(read, cell):
    assert read(changed(MODULES, "10.56,44", f"10.56,{cell}")).modules[0].noct_c == 44.0


@pytest.mark.parametrize("cell", ["", "-", "n/a", "?", "not stated"])
def test_ways_to_write_nothing(read, cell):
    assert read(changed(MODULES, "10.56,44", f"10.56,{cell}")).modules[0].noct_c is None


def test_typographic_minus(read):
    text = changed(MODULES, "noct_c", "voc_coef_pct").replace("10.56,44", "10.56,\u22120.27 %/\u00b0C")
    assert read(text).modules[0].voc_coef_pct == -0.27


def test_unknown_column_is_noted_with_what_it_may_mean(read):
    notes = read(changed(MODULES, "noct_c", "nocct_c")).notes
    assert any("'nocct_c' is not known and was left out; did you mean noct_c?" in note for note in notes)


def test_unknown_key_of_toml_is_noted(read):
    notes = read(changed(TOML, "max_current_a", "max_curent_a"), "a.toml").notes
    assert any(
        "'max_curent_a' is not known and was left out; did you mean max_current_a?" in n for n in notes
    )


def test_same_row_twice_is_taken_once(read):
    sheet = read(MODULES + MODULES.splitlines()[1] + "\n")
    assert len(sheet.modules) == 2
    assert any("row 4 (Paper Sun P-400): is in row 2" in note for note in sheet.notes)


def test_odd_values_are_kept_and_noted(read):
    sheet = read(changed(MODULES, "10.56,44", "10.56,60"))
    assert sheet.modules[0].noct_c == 60.0
    assert any("row 2 (Paper Sun P-400), noct_c: noct_c 60 degC is unusual" in note for note in sheet.notes)


def test_rows_are_numbered_as_a_spreadsheet_shows_them(refused):
    text = changed(MODULES, "Paper Sun,P-405,Mono-c-Si", '\nPaper Sun,P-405,"Mono-\nc-Si"')
    assert "row 4 (Paper Sun P-405), technology: 'Mono-\\nc-Si' holds a line break" in refused(text)


# ---- what is refused


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.data())
def test_damaged_files_are_read_or_refused_in_a_line_per_fault(tmp_path, data):
    text, name = data.draw(st.sampled_from(((MODULES, "a.csv"), (INVERTERS, "a.csv"), (TOML, "a.toml"))))
    letters = list(text)
    for _ in range(data.draw(st.integers(1, 4))):
        k = data.draw(st.integers(0, len(letters) - 1))
        letters[k : k + data.draw(st.integers(0, 2))] = data.draw(st.text(max_size=2))
    (tmp_path / name).write_bytes("".join(letters).encode("utf-8", "surrogatepass"))
    try:
        read_sheets(tmp_path / name)
    except CatalogError as problem:
        assert all(line.startswith(str(tmp_path / name)) for line in str(problem).split("\n"))


def test_every_record_that_cannot_be_taken_is_told_like_faults_once(read):
    head, row = MODULES.splitlines()[:2]
    unlike = [row.replace(",400,", f",{k} kA,").replace("P-400", f"P-{k}") for k in range(11)]
    like = [row.replace(",no,", ",perhaps,").replace("P-400", f"Q-{k}") for k in range(3)]
    with pytest.raises(CatalogError) as caught:
        read("\n".join([head, *like, *unlike]))
    lines = str(caught.value).split("\n")
    assert "row 2 (Paper Sun Q-0), bifacial" in lines[0] and lines[0].endswith("(2 more records like it)")
    assert "row 5 (Paper Sun P-0), pmax_w" in lines[1]
    assert len(lines) == 11 and lines[-1] == "  ... and 2 more records that cannot be taken"


@pytest.mark.parametrize(
    ("old", "new", "place", "says"),
    [
        ("45.6", "45.6 or 46", "row 2 (Paper Sun P-400), voc_v", "write the number alone"),
        ("45.6", "ca. 45", "voc_v", "is no number in V"),
        ("45.6", "45.6 A", "voc_v", "is in A, which is no V"),
        ("45.6", '"45,6,1"', "voc_v", "is no number in V"),
        ("no,400", "no,nan", "pmax_w", "is no number"),
        ("no,400", "no,1e999", "pmax_w", "is no number"),
        ("no,400", "no,", "pmax_w", "is blank, a module needs it"),
        ("no,400", "perhaps,400", "bifacial", "write yes or no"),
        ("45.6,11.2,37.9", "37.9,11.2,45.6", "row 2 (Paper Sun P-400), vmp_v", "swapped"),
        ("45.6", "0", "voc_v", "cannot be below"),
        (
            "Paper Sun,P-405",
            "Paper Sun,P-400",
            "row 3 (Paper Sun P-400), model",
            "is in row 2 (Paper Sun P-400) already, with another pmax_w",
        ),
        ("10.63,", "10.63,44,7", "row 3", "has 11 cells, the heading has 10"),
        ("P-405", '"P-405', "row 3", "quotes do not match"),
        ("voc_v", "vocc_vt", "voc_v", "is 'vocc_vt' meant? then rename it to voc_v"),
        ("voc_v", "pmax_w", "row 1, pmax_w", "two columns"),
        ("noct_c", "assumed", "assumed", "'44' is no value of this kind"),
        ("Paper Sun,P-405", ",P-405", "row 3 (P-405), maker", "is blank"),
    ],
)
def test_bad_csv(refused, old, new, place, says):
    line = refused(changed(MODULES, old, new))
    assert place in line and says in line


@pytest.mark.parametrize(
    ("old", "new", "place", "says"),
    [
        (
            "2 trackers: 2 strings, 26 A",
            "2: 26 A",
            "row 2 (Paper Grid G-10), inputs",
            "does not begin with a number of trackers",
        ),
        ("26 A", "12,5 A", "inputs", "'12' is not understood"),
        ("26 A", "26 mA", "inputs", "'26 mA' is not understood"),
        ("26 A", "26 A, 13 A", "inputs", "two values for max_current_a"),
        ("2 trackers", "0 trackers", "inputs", "trackers 0"),
        ("850,1000", "1000,850", "mppt_high_v", "above max_dc_voltage_v 850 V"),
        ("max_dc_voltage_v", "vmp_v", "vmp_v", "is a field of a module"),
    ],
)
def test_bad_inverters(refused, old, new, place, says):
    line = refused(changed(INVERTERS, old, new))
    assert place in line and says in line


@pytest.mark.parametrize(
    ("old", "new", "place", "says"),
    [
        ("10_000", "10,000", "a.toml", "no valid TOML"),
        ("10_000", '"ten"', "inverter 1 (Paper Grid G-10), ac_power_w", "is no number in W"),
        ("10_000", "1" + "0" * 400, "ac_power_w", "is no number"),
        ("10_000", "true", "ac_power_w", "is no number in W"),
        ("trackers = 1", "trackers = 1.5", "inputs", "trackers: 1.5 is no whole number"),
        ("  trackers = 1\n", "", "inputs", "a group has no trackers"),
        ('["mppt_low_v"]', '["mppt_lo_v"]', "assumed", "did you mean mppt_low_v?"),
        ('["mppt_low_v"]', '"mppt_low_v"', "assumed", "no list of fields"),
        ('["mppt_low_v"]', '["night_w"]', "night_w", "is marked assumed and has no value"),
        ('["mppt_low_v"]', '["mppt_low_v"]\nderived = ["mppt_low_v"]', "assumed", "keep one mark"),
        ('{ name = "Manual", revision = "7" }', '"Manual"', "sources", "no source with a name"),
        ("mppt_high_v = 850", "mppt_hihg_v = 850", "mppt_high_v", "is 'mppt_hihg_v' meant?"),
        ("[[inverter]]", "[inverter]", "inverter", "[[inverter]]"),
        ("[[inverter]]", "[[invertor]]", "a.toml", "neither a [[module]] nor"),
    ],
)
def test_bad_toml(refused, old, new, place, says):
    text = changed(TOML, old, new)
    if new in ("[inverter]", "[[invertor]]"):
        text = text.partition("  [[inverter.inputs]]")[0]
    line = refused(text, "a.toml")
    assert place in line and says in line


def test_number_that_may_be_thousands_among_decimal_commas(refused):
    text = changed(MODULES, "45.6", '"45,6"').replace("no,400", "no,1.400")
    assert "'1.400' may be 1.4 or 1400" in refused(text)


def test_several_impossible_rows_are_counted(refused):
    text = changed(MODULES, "45.6", "4.6").replace("45.8", "4.5")
    assert "(1 more record of the file cannot be either)" in refused(text)


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (b"", "is empty"),
        (b" \n\n", "is empty"),
        (MODULES.splitlines()[0].encode(), "no rows"),
        (MODULES.encode("utf-16"), "save the file in UTF-8"),
        (
            changed(MODULES, "Paper Sun,P-405", "Papier Sonne \u00dc,P-405").encode("latin-1"),
            "line 3: has a character that is not UTF-8",
        ),
        (b"to whom it may concern\n", "no known column name"),
        (b"maker,model\nPaper Sun,P-400\n", "neither a module (pmax_w) nor an inverter (ac_power_w)"),
        (b"kind,maker,model\nbattery,Paper Sun,P-400\n", "neither module nor inverter"),
    ],
)
def test_files_that_are_no_datasheets(refused, data, says):
    assert says in refused(data)


def test_files_that_cannot_be_read_or_written(tmp_path):
    for path in (tmp_path / "none.csv", tmp_path / "sheet.pdf"):
        with pytest.raises(CatalogError):
            read_sheets(path)
    with pytest.raises(CatalogError, match="cannot be written"):
        write_sheets(tmp_path / "none" / "a.csv", [], [])
    with pytest.raises(CatalogError, match="end in .csv, .xlsx, .toml or .json"):
        write_sheets(tmp_path / "a.pdf", [], [])


def test_written_csv_reads_well(tmp_path):
    module = Module(
        maker="Paper Sun",
        model="P-400",
        technology="Mono-c-Si",
        bifacial=False,
        pmax_w=400.0,
        voc_v=45.6,
        isc_a=11.2,
        vmp_v=37.9,
        imp_a=10.56,
    )
    inverter = Inverter(
        maker="Paper Grid",
        model="G-10",
        ac_power_w=1e4,
        mppt_low_v=180.0,
        mppt_high_v=850.0,
        sources={"mppt_low_v": Source("Manual", "7")},
    )
    write_sheets(tmp_path / "a.csv", [module], [inverter])
    first, second, third = (tmp_path / "a.csv").read_text(encoding="utf-8").splitlines()
    assert first.startswith("kind,maker,model,technology,bifacial,pmax_w") and first.endswith(
        "source,sources"
    )
    assert second.startswith("module,Paper Sun,P-400,Mono-c-Si,no,400,45.6")
    assert "mppt_low_v = Manual [7]" in third
