"""Datasheets as people and open data write them: headings, units, decimal signs, workbooks, the JSON of a standard."""

from __future__ import annotations

import io
import json
import zipfile
from dataclasses import replace

import openpyxl
import pytest
from catalog_records import INVERTERS, MODULES
from scipy import constants

from catalog.column_map import ColumnMap, proposed
from catalog.errors import CatalogError
from catalog.headings import meaning
from catalog.plain_tables import plain_records
from catalog.records import Inputs, Origin, Source
from catalog.sheet_reading import Reading
from catalog.sheetfiles import read_sheets, write_sheets
from catalog.units import converted, fits, unit_of

HEADING = "Manufacturer,Model,Cell type,Bifacial,Pmax (W),Voc (V),Isc (A),Vmp (V),Imp (A)"
ROW = "Paper Sun,P-400,Mono-c-Si,no,400,45.6,11.2,37.9,10.56"


@pytest.fixture
def read(tmp_path):
    """Read a text, or bytes, as a file of some name."""

    def read_(data, name="sheet.csv", **options):
        path = tmp_path / name
        path.write_bytes(data if isinstance(data, bytes) else data.encode())
        return read_sheets(path, **options)

    return read_


# ---- headings (common practice, no source)


@pytest.mark.parametrize(
    ("heading", "field", "unit"),
    [
        ("Voc (V)", "voc_v", "V"),
        ("Voc, V", "voc_v", "V"),
        ("Voc / V", "voc_v", "V"),
        ("Voc in V", "voc_v", "V"),
        ("VOC", "voc_v", None),
        ("Open circuit voltage", "voc_v", None),
        ("Open-Circuit Voltage (Voc) [V]", "voc_v", "V"),
        ("Leerlaufspannung [V]", "voc_v", "V"),
        ("Pmax [kW]", "pmax_w", "kW"),
        ("Power (Wp)", "pmax_w", "W"),
        ("Short-circuit current Isc (A)", "isc_a", "A"),
        ("Temp. coeff. of Pmax [%/\u00b0C]", "pmax_coef_pct", "%/K"),
        ("Temperature coefficient of Voc (mV/K)", "voc_coef_pct", "mV/K"),
        ("Temperature Coefficient of Isc (\u03b1Isc) [%/K]", "isc_coef_pct", "%/K"),
        ("TK Isc (mA/K)", "isc_coef_pct", "mA/K"),
        ("\u03b2 Voc (V/\u00b0C)", "voc_coef_pct", "V/K"),
        ("Max. system voltage (VDC)", "max_system_voltage_v", "V"),
        ("Maximum Series Fuse Rating (A)", "max_series_fuse_a", "A"),
        ("Length (mm)", "length_m", "mm"),
        ("Dimensions (L x W x H) mm", "dimensions", "mm"),
        ("NOCT (\u00b0C)", "noct_c", "degC"),
        ("Model No.", "model", None),
    ],
)
def test_headings_of_modules_that_are_beyond_doubt(heading, field, unit):
    found = meaning(heading, "module")
    assert (found.field, found.unit, found.sure) == (field, unit, True)


@pytest.mark.parametrize(
    ("heading", "field", "unit"),
    [
        ("Rated AC power (kW)", "ac_power_w", "kW"),
        ("Max. DC voltage", "max_dc_voltage_v", None),
        ("Vdc max (V)", "max_dc_voltage_v", "V"),
        ("MPPT voltage range (V)", "mppt_range", "V"),
        ("Min. MPP voltage [V]", "mppt_low_v", "V"),
        ("Start-up voltage", "start_voltage_v", None),
        ("No. of MPP trackers", "trackers", None),
        ("Strings per MPPT", "strings_per_tracker", None),
        ("Max. input current per MPPT (A)", "max_current_a", "A"),
        ("Max. short-circuit current per MPPT [A]", "max_isc_a", "A"),
        ("European efficiency (%)", "weighted_efficiency_pct", "%"),
        ("Night consumption [mW]", "night_w", "mW"),
    ],
)
def test_headings_of_inverters_that_are_beyond_doubt(heading, field, unit):
    found = meaning(heading, "inverter")
    assert (found.field, found.unit, found.sure) == (field, unit, True)


@pytest.mark.parametrize(
    ("heading", "kind", "field"),
    [
        ("Opn circiut voltage (V)", "module", "voc_v"),  # typing errors
        ("Temp. coeff. Voc", "module", "voc_coef_pct"),  # no unit: %/K or V/K
        ("AC power", "inverter", "ac_power_w"),  # no unit: W or kW
        ("Max input current (A)", "inverter", "max_current_a"),  # of a tracker, or in all
        ("Efficiency (%)", "inverter", "weighted_efficiency_pct"),
    ],
)
def test_headings_that_someone_must_confirm(heading, kind, field):
    found = meaning(heading, kind)
    assert (found.field, found.sure) == (field, False)


@pytest.mark.parametrize(
    "heading",
    [
        "Voc at NOCT (V)",
        "Pmax NMOT (W)",
        "Power at NOCT [W]",
        "Pmax (V)",
        "Isc (V)",
        "Power tolerance (W)",
        "Weight (kg)",
        "Warranty (years)",
        "Price",
        "Efficiency (%)",
    ],
)
def test_headings_that_are_no_value_at_stc(heading):
    assert meaning(heading, "module").field is None


# ---- units


@pytest.mark.parametrize(
    ("unit", "wanted", "factor"),
    [("mV", "V", constants.milli), ("kV", "V", constants.kilo), ("mA", "A", constants.milli), ("kW", "W", constants.kilo),
     ("MW", "W", constants.mega), ("mm", "m", constants.milli), ("cm", "m", constants.centi), ("in", "m", constants.inch),
     ("ft", "m", constants.foot)],
)  # fmt: skip
def test_factors_are_those_of_scipy(unit, wanted, factor):
    assert fits(unit, wanted)
    assert converted(17.25, unit, wanted) == pytest.approx(17.25 * factor, rel=1e-12)


@pytest.mark.parametrize(("unit", "name"), [("degF", "Fahrenheit"), ("K", "Kelvin")])
def test_temperatures_are_those_of_scipy(unit, name):
    expected = constants.convert_temperature(318.15, name, "Celsius")
    assert converted(318.15, unit, "degC") == pytest.approx(expected, abs=1e-9)


def test_digits_survive_conversion():
    assert converted(1722.0, "mm", "m") == 1.722
    assert converted(0.33, "kW", "W") == 330.0


@pytest.mark.parametrize(
    ("text", "unit"),
    [("%/\u00b0C", "%/K"), ("% / K", "%/K"), ("mV/\u2103", "mV/K"), ("KW", "kW"), ("mW", "mW"), ("MW", "MW"), ("VDC", "V"),
     ("Wp", "W"), ("STC", None), ("kg", None), ("", None)],
)  # fmt: skip
def test_spellings_of_units(text, unit):
    assert unit_of(text) == unit


@pytest.mark.parametrize(
    ("heading", "cell", "pct"),
    [("TK Voc (mV/K)", "-125", -0.274123), ("TK Voc (V/K)", "-0.125", -0.274123), ("TK Voc (%/K)", "-0.27", -0.27),
     ("TK Voc (1/K)", "-0.0027", -0.27), ("TK Voc (%/K)", "-0.125 V/K", -0.274123), ("Temp. coeff. Voc (%/\u00b0C)", "-0.27", -0.27)],
)  # fmt: skip
def test_temperature_coefficients_in_any_unit(read, heading, cell, pct):
    # -125 mV/K of 45.6 V is -0.125 / 45.6 * 100 % per kelvin.
    assert read(f"{HEADING},{heading}\n{ROW},{cell}\n").modules[0].voc_coef_pct == pytest.approx(
        pct, abs=1e-6
    )


def test_units_stand_in_a_row_of_their_own(read):
    text = "Manufacturer;Model;Cell type;Bifacial;Pmax;Voc;Isc;Vmp;Imp;TK Voc\n;;;;kW;V;A;V;A;mV/K\nPaper Sun;P-400;mono;no;0.4;45.6;11.2;37.9;10.56;-125\n"
    module = read(text).modules[0]
    assert (module.pmax_w, module.voc_coef_pct) == (400.0, -0.274123)


# ---- decimal signs and thousands


@pytest.mark.parametrize(
    ("cell", "value"),
    [
        ("1.500", 1500.0),
        ("1 500", 1500.0),
        ("1\u202f500", 1500.0),
        ("1500", 1500.0),
        ("1'500", 1500.0),
        ("1.500,0", 1500.0),
    ],
)
def test_thousands_where_commas_are_decimal(read, cell, value):
    text = (
        f"{HEADING};Max. system voltage (V)".replace(",", ";")
        + "\n"
        + ROW.replace(",", ";").replace(".", ",")
        + f";{cell}\n"
    )
    assert read(text).modules[0].max_system_voltage_v == value


@pytest.mark.parametrize(("cell", "value"), [("1,500", 1500.0), ("1,500.0", 1500.0)])
def test_thousands_where_points_are_decimal(read, cell, value):
    text = f'{HEADING},Max. system voltage (V)\n{ROW},"{cell}"\n'
    assert read(text).modules[0].max_system_voltage_v == value


INVERTER = (
    "Manufacturer;Model;Rated AC power (W);Min. MPP voltage;Max. MPP voltage\nPaper Grid;G-10;{};180;850\n"
)


def test_a_number_that_may_be_two_is_refused_where_nothing_tells(read):
    with pytest.raises(CatalogError, match="'10,500' may be 10.5 or 10500"):
        read(INVERTER.format("10,500"))


def test_only_one_reading_is_possible(read):
    assert read(INVERTER.format("1,500")).inverters[0].ac_power_w == 1500.0


# ---- tables of others


def test_titles_remarks_ranges_sizes_and_inputs(read):
    text = (
        "Inverters of the season\n\n"
        "Manufacturer;Model;Rated AC power (kW);Max. DC voltage (V);MPPT voltage range (V);No. of MPP trackers;"
        "Strings per MPPT;Max. input current per MPPT (A);Max. short-circuit current per MPPT (A);Phases;Colour\n"
        "Paper Grid;G-10;10;1000;180 - 850;2;2/1;26/13;32/16;three-phase;grey\n"
        "* subject to change\n"
    )
    sheet = read(text)
    (inverter,) = sheet.inverters
    assert (inverter.ac_power_w, inverter.mppt_low_v, inverter.mppt_high_v, inverter.phases) == (
        10000.0,
        180.0,
        850.0,
        3,
    )
    assert inverter.inputs == (
        Inputs(trackers=1, strings_per_tracker=2, max_current_a=26.0, max_isc_a=32.0),
        Inputs(trackers=1, strings_per_tracker=1, max_current_a=13.0, max_isc_a=16.0),
    )
    assert any("'Colour'" in note for note in sheet.notes)
    assert any("remark" in note for note in sheet.notes)


def test_a_rating_of_trackers_without_their_number_is_asked_for(read):
    text = "Manufacturer;Model;Rated AC power (kW);MPPT voltage range (V);Max. input current per MPPT (A)\nPaper Grid;G-10;10;180-850;26\n"
    with pytest.raises(CatalogError, match="not how many trackers"):
        read(text)


def test_doubtful_columns_are_refused_or_settled(read):
    text = f"{HEADING},Tempco Voc\n{ROW},-0.27\n"
    with pytest.raises(CatalogError, match="not sure what these columns are: Tempco Voc: voc_coef_pct"):
        read(text)
    assert read(text, settle=ColumnMap.confirmed).modules[0].voc_coef_pct == -0.27
    assert read(
        text, settle=lambda m: m.with_fields({"tempco voc": "voc_coef_pct in V/K"}).confirmed()
    ).modules[0].voc_coef_pct == pytest.approx(-0.592105)
    assert read(text, settle=lambda m: m.with_fields({"Tempco Voc": ""})).modules[0].voc_coef_pct is None


def test_two_columns_for_one_field_are_refused(read):
    with pytest.raises(CatalogError, match="both mean voc_v"):
        read(f"{HEADING},Open circuit voltage (V)\n{ROW},45.6\n")


def test_a_map_is_kept_and_understood_again():
    found = proposed(HEADING.split(","))
    assert ColumnMap.from_bytes(found.to_bytes()) == found
    assert ColumnMap.from_bytes(b"{}") is None
    assert ColumnMap.from_bytes(found.to_bytes().replace(b"voc_v", b"voc_x")) is None


def test_values_for_all_rows_are_entered(read):
    text = f"{HEADING}\n{ROW}\n".replace(",Bifacial", "").replace(",no,", ",")
    with pytest.raises(CatalogError, match="--set bifacial=no"):
        read(text)
    module = read(text, given={"bifacial": "no", "voc_v": "1"}).modules[0]
    assert (module.bifacial, module.origin("bifacial"), module.voc_v) == (False, Origin.ENTERED, 45.6)
    with pytest.raises(CatalogError, match="--set bifacal: there is no such field; did you mean bifacial"):
        read(text, given={"bifacal": "no"})


def test_plain_tables_are_the_same_read_either_way(tmp_path):
    """The fast reading of plain files against the careful one."""
    from catalog import sheets_csv
    from catalog.sheet_entries import records_of
    from catalog.sheet_tables import entries_of

    path = tmp_path / "mixed.csv"
    write_sheets(path, MODULES, INVERTERS)
    fast, careful = Reading(path), Reading(path)
    (table,) = sheets_csv.read_tables(path.read_text(), fast)
    records, places = plain_records(table, fast)
    entries = entries_of(table, careful)
    assert records == records_of(entries, careful)
    assert places == [entry.where for entry in entries]


# ---- workbooks


def workbook(rows, **cells) -> bytes:
    book = openpyxl.Workbook()
    for row in rows:
        book.active.append(row)
    memory = io.BytesIO()
    book.save(memory)
    return memory.getvalue()


def test_a_workbook_of_others(read):
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.append(["Season 2031"])
    sheet.append(
        [
            "Manufacturer",
            "Model",
            "Cell type",
            "Bifacial",
            "Pmax (W)",
            "Voc (V)",
            "Isc (A)",
            "Vmp (V)",
            "Imp (A)",
            "Bifaciality",
        ]
    )
    sheet.append(["Paper Sun", 400, "Mono-c-Si", True, 400, 45.6, 11.2, 37.9, 10.56, 0.7])
    sheet["J3"].number_format = "0 %"
    book.create_sheet("remarks").append(["nothing of use"])
    memory = io.BytesIO()
    book.save(memory)
    found = read(memory.getvalue(), "a.xlsx")
    (module,) = found.modules
    assert (module.model, module.bifacial, module.pmax_w, module.bifaciality) == ("400", True, 400.0, 0.7)
    assert any("'remarks'" in note for note in found.notes)


def tampered(data: bytes, **parts: bytes) -> bytes:
    memory = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(memory, "w", zipfile.ZIP_DEFLATED) as new:
        for name in old.namelist():
            new.writestr(name, old.read(name))
        for name, content in parts.items():
            new.writestr(name.replace("__", "/").replace("_xml", ".xml"), content)
    return memory.getvalue()


SOUND = workbook([HEADING.split(","), ROW.split(",")])


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (tampered(SOUND, xl__media__blank=b"\0" * 2**25), "unpacks to"),
        (tampered(SOUND, **{"xl__externalLinks__externalLink1_xml": b"<a/>"}), "links to other files"),
        (
            tampered(SOUND, **{"xl__bomb_xml": b'<!DOCTYPE a [<!ENTITY b "bb">]><a>&b;</a>'}),
            "definitions that no workbook needs",
        ),
        (SOUND[: len(SOUND) // 2], "is no workbook"),
        (b"PK\x03\x04 not really", "is no workbook"),
        (workbook([["a"] * 600, ["b"] * 600]), "columns; part it"),
        (workbook([]), "has no worksheet with anything in it"),
    ],
)
def test_hostile_workbooks_are_refused(read, data, says):
    with pytest.raises(CatalogError, match=says):
        read(data, "a.xlsx")


def test_a_row_far_down_is_refused_quickly(read):
    """A sheet may place a row at a number that no sheet has."""
    with zipfile.ZipFile(io.BytesIO(SOUND)) as archive:
        sheet = archive.read("xl/worksheets/sheet1.xml").replace(b'<row r="2"', b'<row r="999999999999"')
    with pytest.raises(CatalogError, match="part it|no workbook"):
        read(tampered(SOUND, **{"xl__worksheets__sheet1_xml": sheet}), "a.xlsx")


FORMULAS = ("=1+1", "+cmd", "-2", "@SUM(A1)", "'quoted", "'=1", "x;=1+1", 'a,"=2"')


@pytest.mark.parametrize("ending", ["csv", "xlsx", "toml", "json"])
def test_texts_that_look_like_formulas_are_harmless_and_come_back(tmp_path, ending):
    modules = [
        replace(MODULES[0], maker="Alderfell", model=text, source=Source(text, text)) for text in FORMULAS
    ]
    path = tmp_path / f"a.{ending}"
    write_sheets(path, modules, [])
    assert read_sheets(path).modules == modules
    if ending == "xlsx":
        cells = [cell for row in openpyxl.load_workbook(path).active.iter_rows() for cell in row]
        assert not [cell for cell in cells if cell.data_type == "f"]
    if ending == "csv":
        for line in path.read_text().splitlines()[1:]:
            assert ",=" not in line and ",+" not in line and ",@" not in line


# ---- the JSON of Orange Button (SunSpec Alliance, OpenAPI 1.1.7): shapes as its objects give them


def ob(value, unit=None):
    return {"Value": value} if unit is None else {"Value": value, "Unit": unit}


PRODUCT = {
    "ProdType": ob("ProdModule"),
    "ProdMfr": ob("Paper Sun"),
    "ProdName": ob("P-400"),
    "PowerSTC": ob(0.4, "kW"),
    "IsBifacial": ob(False),
    "ProdCell": {"CellTechnologyType": ob("MonoSi"), "CellColor": ob("Blue")},
    "ModuleElectRatings": [
        {"ModuleRatingCondition": ob("NOCT"), "VoltageOpenCircuit": ob(42.0, "V")},
        {"ModuleRatingCondition": ob("STC"), "VoltageOpenCircuit": ob(45.6, "V"), "CurrentShortCircuit": ob(11.2, "A"),
         "VoltageAtMaximumPower": ob(37.9, "V"), "CurrentAtMaximumPower": ob(10.56, "A")},
    ],
    "TemperatureCoefficientOpenCircuitVoltage": ob(-0.125, "V_per_Cel"),
    "TemperatureCoefficientMaximumPower": ob(-0.0035, "pu_per_Cel"),
    "TemperatureNOCT": ob(113, "F"),
    "VoltageMaximumSystem": ob(1.5, "kV"),
    "Dimension": {"Length": ob(1722, "mm"), "Width": ob(1134, "mm")},
}  # fmt: skip
TRACKER = {"VoltageMPPTMin": ob(180, "V"), "VoltageMPPTMax": ob(850, "V"), "CurrentDCMax": ob(26, "A"),
           "CurrentShortCircuitMax": ob(32, "A"), "MPPTInputStrings": ob(2)}  # fmt: skip
MACHINE = {
    "ProdType": ob("ProdInverter"), "ProdMfr": ob("Paper Grid"), "ProdName": ob("G-10"),
    "ACOutputs": [{"PowerACNom": ob(10, "kW"), "VoltageACNom": ob(400, "V"), "PowerPhaseType": ob("Three")}],
    "DCInput": {"VoltageDCMax": ob(1000, "V"), "MPPTNumber": ob(2), "MPPTs": [TRACKER, TRACKER]},
    "VoltageDCInverterStart": ob(200, "V"),
    "InverterEfficiency": {"InverterEfficiencyCEC": ob(0.975, "decimal_percent"), "InverterEfficiencyMax": ob(0.98, "decimal_percent")},
}  # fmt: skip


@pytest.mark.parametrize(
    "shape",
    [lambda p: p, lambda p: [p], lambda p: {"ProdModules": [p]}, lambda p: {"Catalog": {"items": [p]}}],
)
def test_open_data_of_a_module(read, shape):
    found = read(json.dumps(shape(PRODUCT)), "a.json")
    (m,) = found.modules
    assert (m.maker, m.model, m.technology, m.bifacial) == ("Paper Sun", "P-400", "Mono-c-Si", False)
    assert (m.pmax_w, m.voc_v, m.isc_a, m.vmp_v, m.imp_a) == (400.0, 45.6, 11.2, 37.9, 10.56)
    assert (m.voc_coef_pct, m.pmax_coef_pct, m.noct_c) == pytest.approx((-0.274123, -0.35, 45.0))
    assert (m.max_system_voltage_v, m.length_m, m.width_m) == (1500.0, 1.722, 1.134)
    assert any(
        "kept aside" in n and "ProdCell.CellColor" in n and "VoltageOpenCircuit (another)" in n
        for n in found.notes
    )


def test_open_data_of_an_inverter(read):
    (i,) = read(json.dumps([MACHINE]), "a.json").inverters
    assert (i.ac_power_w, i.ac_voltage_v, i.phases, i.max_dc_voltage_v, i.start_voltage_v) == (
        10000.0,
        400.0,
        3,
        1000.0,
        200.0,
    )
    assert (i.mppt_low_v, i.mppt_high_v, i.weighted_efficiency_pct) == (180.0, 850.0, 97.5)
    assert i.inputs == (Inputs(trackers=2, strings_per_tracker=2, max_current_a=26.0, max_isc_a=32.0),)


@pytest.mark.parametrize(
    ("product", "says"),
    [
        ([], "no object ProdModule"),
        ([{"ProdType": ob("ProdBattery")}], "no object ProdModule"),
        ([PRODUCT | {"PowerSTC": ob(400, "VA")}], "pmax_w: is in 'VA'"),
        ([PRODUCT | {"PowerSTC": ob(True)}], "pmax_w: True is no number"),
        ([PRODUCT | {"ProdMfr": ob(None)}], "maker: is missing"),
        ([MACHINE | {"DCInput": MACHINE["DCInput"] | {"MPPTNumber": ob(3)}}], "2 trackers are listed"),
    ],
)
def test_open_data_that_cannot_be(read, product, says):
    with pytest.raises(CatalogError, match=says):
        read(json.dumps(product), "a.json")


@pytest.mark.parametrize("text", ["{", "[NaN]", "[" * 100_000, "1" * 10_000, "null", '{"a": 1e999}'])
def test_texts_that_are_no_open_data(read, text):
    with pytest.raises(CatalogError):
        read(text, "a.json")
