"""The public CEC tables as records, against the CSV files read independently by pandas."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import fields
from math import nan
from pathlib import Path

import numpy as np
import pandas as pd
import pvlib
import pytest

from catalog.cec import cec_kind, read_cec_inverters, read_cec_modules
from catalog.errors import CatalogError
from catalog.records import SANDIA_PARAMETERS, SIX_PARAMETERS, Inverter, Module, Origin

MODULE_FIELDS = {
    "pmax_w": "STC",
    "voc_v": "V_oc_ref",
    "isc_a": "I_sc_ref",
    "vmp_v": "V_mp_ref",
    "imp_a": "I_mp_ref",
    "pmax_coef_pct": "gamma_r",
    "noct_c": "T_NOCT",
    "cells_in_series": "N_s",
    "length_m": "Length",
    "width_m": "Width",
    "technology": "Technology",
    "bifacial": "Bifacial",
} | {name: name for name in SIX_PARAMETERS}

INVERTER_FIELDS = {
    "ac_power_w": "Paco",
    "mppt_low_v": "Mppt_low",
    "mppt_high_v": "Mppt_high",
    "night_w": "Pnt",
    "Pnt": "Pnt",
    "operating_dc_current_a": "Idcmax",
} | {name: name for name in SANDIA_PARAMETERS}


@pytest.fixture(scope="module")
def modules() -> list[Module]:
    return read_cec_modules()


@pytest.fixture(scope="module")
def inverters() -> list[Inverter]:
    return read_cec_inverters()


# --- what the tables hold --------------------------------------------------------------------------------


def test_row_counts(modules, inverters, cec_modules_csv, cec_inverters_csv):
    assert len(modules) == len(cec_modules_csv) == 21_535
    assert len(inverters) == len(cec_inverters_csv) == 3_264


def test_module_names_reassemble(modules, cec_modules_csv):
    assert [m.name for m in modules] == [" ".join(name.split()) for name in cec_modules_csv.Name]
    assert len({m.name for m in modules}) == len(modules)


def test_inverter_names_reassemble(inverters, cec_inverters_csv):
    # "Maker: Model", some with a blank before the colon; two end in marks that a faulty encoding left.
    table = cec_inverters_csv.Name.str.replace(r" ?: ", " ", n=1, regex=True)
    table = table.str.replace(r"\?+$", "", regex=True)
    assert [i.name for i in inverters] == list(table)
    assert len({i.name for i in inverters}) == len(inverters)
    assert all(i.maker == i.maker.strip() and ":" not in i.maker for i in inverters)


@pytest.mark.parametrize("field, column", MODULE_FIELDS.items())
def test_module_values(modules, cec_modules_csv, field, column):
    rows = np.random.default_rng(20190305).choice(len(modules), 400, replace=False)
    read = [getattr(modules[k], field) for k in rows]
    table = cec_modules_csv[column].iloc[rows]
    if field == "technology":
        assert read == list(table)
    else:
        assert [nan if v is None else v for v in read] == pytest.approx(table.to_numpy(), nan_ok=True)


def test_module_coefficients(modules, cec_modules_csv):
    t = cec_modules_csv
    assert [m.voc_coef_pct for m in modules] == pytest.approx((100 * t.beta_oc / t.V_oc_ref).to_numpy())
    assert [m.isc_coef_pct for m in modules] == pytest.approx((100 * t.alpha_sc / t.I_sc_ref).to_numpy())


@pytest.mark.parametrize("field, column", INVERTER_FIELDS.items())
def test_inverter_values(inverters, cec_inverters_csv, field, column):
    assert [getattr(i, field) for i in inverters] == pytest.approx(cec_inverters_csv[column].to_numpy())


def test_six_parameters_give_the_power_of_the_table(modules):
    # CEC model by pvlib (Dobos 2012, doi:10.1115/1.4005759): at STC its maximum power is the table's
    some = [modules[k] for k in np.random.default_rng(12).choice(len(modules), 300, replace=False)]
    p = {name: np.array([getattr(m, name) for m in some]) for name in SIX_PARAMETERS}
    alpha = np.array([m.isc_coef_pct * m.isc_a / 100 for m in some])
    diode = pvlib.pvsystem.calcparams_cec(1000.0, 25.0, alpha, **p)
    best = pvlib.pvsystem.max_power_point(*diode, method="newton")
    assert best["p_mp"] == pytest.approx([m.pmax_w for m in some], rel=0.01)
    assert best["v_mp"] == pytest.approx([m.vmp_v for m in some], rel=0.02)


def test_sandia_parameters_give_the_rated_power(inverters):
    # Sandia model by pvlib (King et al. 2007, SAND2007-5036): at Pdco and Vdco it gives Paco
    p = {name: np.array([getattr(i, name) for i in inverters]) for name in SANDIA_PARAMETERS}
    ac = pvlib.inverter.sandia(p["Vdco"], p["Pdco"], {**p, "Pnt": 0.0})
    assert ac == pytest.approx([i.ac_power_w for i in inverters], rel=1e-6)


def test_blank_is_unknown_and_zero_is_zero(modules, cec_modules_csv):
    assert sum(m.length_m is None for m in modules) == cec_modules_csv.Length.isna().sum() == 1_581
    assert sum(m.isc_coef_pct == 0 for m in modules) == (cec_modules_csv.alpha_sc == 0).sum() == 25


def test_what_the_tables_do_not_state(modules, inverters):
    for name in ("bifaciality", "max_system_voltage_v", "max_series_fuse_a", "vmp_coef_pct"):
        assert {getattr(m, name) for m in modules} == {None}
    for name in ("max_dc_voltage_v", "phases", "start_voltage_v", "max_array_power_w"):
        assert {getattr(i, name) for i in inverters} == {None}
    (group,) = inverters[0].inputs
    assert group.trackers == 1
    assert {getattr(group, f.name) for f in fields(group)} == {1, None}
    assert {i.inputs for i in inverters} == {inverters[0].inputs}
    assert {i.origin("inputs") for i in inverters} == {Origin.ASSUMED}
    assert {i.origin("operating_dc_current_a") for i in inverters} == {Origin.DERIVED}
    assert {i.origin("mppt_high_v") for i in inverters} == {Origin.STATED}


def test_source_names_the_table_and_its_date(modules, inverters):
    assert {str(m.source) for m in modules} == {"CEC module table, 2019-03-05"}
    assert {str(i.source) for i in inverters} == {"CEC inverter table, 2019-03-05"}


# --- facts that decided how the columns are read ---------------------------------------------------------


def test_vdcmax_is_the_top_of_the_window(cec_inverters_csv):
    assert (cec_inverters_csv.Vdcmax == cec_inverters_csv.Mppt_high).all()


def test_idcmax_is_an_operating_point(cec_inverters_csv):
    t = cec_inverters_csv
    assert t.Idcmax.to_numpy() == pytest.approx((t.Pdco / t.Vdco).to_numpy(), rel=1e-5)


def test_223_modules_have_a_negative_isc_coefficient(modules, cec_modules_csv):
    assert sum(m.isc_coef_pct < 0 for m in modules) == (cec_modules_csv.alpha_sc < 0).sum() == 223


def test_voltage_from_the_column_else_from_the_name(inverters, cec_inverters_csv):
    stated = pd.to_numeric(cec_inverters_csv.Vac, errors="coerce").fillna(0)
    assert (stated == 0).sum() == 290
    for inverter, volts in zip(inverters, stated):
        if volts:
            assert (inverter.ac_voltage_v, inverter.origin("ac_voltage_v")) == (volts, Origin.STATED)
    named = {i.model: i.ac_voltage_v for i, volts in zip(inverters, stated) if not volts}
    assert sum(v is not None for v in named.values()) == 19
    assert named["PVI 14TL-208"] == 208 and named["PVI 100-208-PE"] == 208  # 208 V, not 100 V
    assert named["Evershine TL3000-US-240"] == 240
    # 240 W, 240 or 208 V, a DC voltage and a range: the name decides nothing
    dc_in_name = "SC500CP-US 600V (with ABB transformer)"
    for model in ("SMI-240-60", "P250HV-208/240-xxx", dc_in_name, "Conext CL 18000NA"):
        assert named[model] is None
    derived = [i for i in inverters if i.origin("ac_voltage_v") is Origin.DERIVED]
    assert len(derived) == 19


def test_the_suffix_parts_models_that_differ_by_voltage_only(inverters):
    assert len({(i.maker, i.model.partition(" [")[0]) for i in inverters}) < len(inverters)


# --- files that are not as they should be ----------------------------------------------------------------


@pytest.fixture
def module_lines(cec_modules_path) -> list[str]:
    return cec_modules_path.read_text(encoding="utf-8").splitlines()[:13]


@pytest.fixture
def inverter_lines(cec_inverters_path) -> list[str]:
    return cec_inverters_path.read_text(encoding="utf-8").splitlines()[:13]


def saved(folder: Path, lines: list[str], name: str = "table.csv") -> Path:
    path = folder / name
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def with_cell(lines: list[str], row: int, column: str, text: str) -> list[str]:
    """The lines with one cell replaced; ``row`` counts from 1 as a spreadsheet does."""
    cells = lines[row - 1].split(",")
    cells[lines[0].split(",").index(column)] = text
    return [*lines[: row - 1], ",".join(cells), *lines[row:]]


def refusal(path: Path, read=read_cec_modules) -> str:
    with pytest.raises(CatalogError) as caught:
        read(path)
    line = str(caught.value)
    assert "\n" not in line and str(path) in line
    return line


def test_table_from_a_path(tmp_path, module_lines, inverter_lines):
    read = read_cec_modules(saved(tmp_path, module_lines))
    assert len(read) == 10
    assert read == read_cec_modules(saved(tmp_path, [*module_lines, ""]))
    assert len(read_cec_inverters(saved(tmp_path, inverter_lines))) == 10


def test_revision_is_the_date_in_the_file_name_else_the_newest_in_the_table(tmp_path, module_lines):
    dated = saved(tmp_path, module_lines, "cec-modules-2031-7-4.csv")
    assert read_cec_modules(dated)[0].source.revision == "2031-07-04"
    undated = saved(tmp_path, with_cell(module_lines, 6, "Date", "11/9/2030"), "modules.csv")
    assert read_cec_modules(undated)[0].source.revision == "2030-11-09"


def test_maker_column_of_newer_tables(tmp_path, module_lines):
    rows = [module_lines[0].replace("gamma_r", "gamma_pmp") + ",Manufacturer"]
    rows += [line + "," for line in module_lines[1:3]] + [line + ",A10Green" for line in module_lines[3:]]
    read = read_cec_modules(saved(tmp_path, rows))[0]
    assert (read.maker, read.model, read.pmax_coef_pct) == ("A10Green", "Technology A10J-S72-175", -0.5072)


def test_table_without_rows_of_units(tmp_path, module_lines):
    bare = read_cec_modules(saved(tmp_path, [module_lines[0], *module_lines[3:]]))
    assert bare == read_cec_modules(saved(tmp_path, module_lines))


def test_missing_file(tmp_path):
    assert "no such file" in refusal(tmp_path / "absent.csv")
    assert "cannot be read" in refusal(tmp_path)


def test_not_such_a_table(tmp_path, module_lines, inverter_lines):
    assert "row 1" in refusal(saved(tmp_path, inverter_lines))
    assert "row 1" in refusal(saved(tmp_path, module_lines), read_cec_inverters)
    assert "row 1" in refusal(saved(tmp_path, ["a,b", "1,2"]))
    assert "row 1" in refusal(saved(tmp_path, []))
    binary = tmp_path / "book.xlsx"
    binary.write_bytes(b"PK\x03\x04\x14\x00\xff\xfe\x00\x80")
    assert "UTF-8" in refusal(binary)


def test_missing_columns(tmp_path, module_lines):
    lines = [module_lines[0].replace("V_oc_ref", "Voc"), *module_lines[1:]]
    assert "V_oc_ref" in refusal(saved(tmp_path, lines))


def test_no_rows(tmp_path, module_lines):
    assert "no rows" in refusal(saved(tmp_path, module_lines[:3]))


@pytest.mark.parametrize("text", ["abc", "12,5", "inf"])
def test_text_in_a_number_cell(tmp_path, module_lines, text):
    quoted = f'"{text}"' if "," in text else text
    line = refusal(saved(tmp_path, with_cell(module_lines, 7, "V_mp_ref", quoted)))
    assert "row 7" in line and "V_mp_ref" in line and text in line


@pytest.mark.parametrize(
    "column, text", [("N_s", "60.5"), ("Bifacial", "perhaps"), ("STC", ""), ("Technology", "")]
)
def test_cell_that_cannot_be_read(tmp_path, module_lines, column, text):
    line = refusal(saved(tmp_path, with_cell(module_lines, 5, column, text)))
    assert "row 5" in line and f"column {column}" in line


def test_blank_numbers_that_may_be_blank(tmp_path, module_lines, inverter_lines):
    module = read_cec_modules(saved(tmp_path, with_cell(module_lines, 4, "alpha_sc", "")))[0]
    assert module.isc_coef_pct is None and module.voc_coef_pct is not None
    inverter = read_cec_inverters(saved(tmp_path, with_cell(inverter_lines, 4, "Pnt", "NaN")))[0]
    assert inverter.night_w is None and inverter.Pnt is None


def test_voltage_in_brackets_where_the_column_is_blank(tmp_path, inverter_lines):
    inverter = read_cec_inverters(saved(tmp_path, with_cell(inverter_lines, 4, "Vac", "0")))[0]
    assert inverter.ac_voltage_v == 208 and inverter.origin("ac_voltage_v") is Origin.DERIVED


def test_cut_file(tmp_path, module_lines):
    whole = saved(tmp_path, module_lines).read_text(encoding="utf-8")
    cut = tmp_path / "cut.csv"
    cut.write_text(whole[:-90], encoding="utf-8")
    line = refusal(cut)
    assert "row 13" in line and "cut off" in line


def test_row_too_long(tmp_path, module_lines):
    longer = [*module_lines[:5], module_lines[5] + ",more", *module_lines[6:]]
    assert "row 6" in refusal(saved(tmp_path, longer))


def test_names_that_cannot_be_split_or_come_twice(tmp_path, module_lines, inverter_lines):
    assert "row 9, column Name" in refusal(saved(tmp_path, with_cell(module_lines, 9, "Name", "Nomodel")))
    line = refusal(saved(tmp_path, with_cell(inverter_lines, 9, "Name", "No colon 5")), read_cec_inverters)
    assert "row 9, column Name" in line
    line = refusal(saved(tmp_path, [*module_lines, module_lines[4]]))
    assert "row 14, column Name" in line and "row 5" in line


def test_kind_of_table(tmp_path, cec_modules_path, cec_inverters_path):
    assert (cec_kind(cec_modules_path), cec_kind(cec_inverters_path)) == ("module", "inverter")
    assert cec_kind(saved(tmp_path, ["Name,Price"])) is None
    assert cec_kind(tmp_path / "absent.csv") is None


def test_reading_imports_neither_pvlib_nor_pandas():
    code = (
        "import sys; from catalog.cec import read_cec_modules, read_cec_inverters\n"
        "read_cec_inverters(); print({'pvlib', 'pandas', 'numpy'} & set(sys.modules))"
    )
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.strip() == "set()"
