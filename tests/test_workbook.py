"""The workbook, read back with openpyxl and by LibreOffice."""

from __future__ import annotations

import csv
import shutil
import subprocess
from dataclasses import replace
from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook
from report_cases import (
    DUO,
    HOSTILE,
    HOSTILE_MAKER,
    HOSTILE_MODEL,
    MODULE,
    NARROW,
    NO_YEAR,
    SITE_YEAR,
    TABLED,
    listing,
    pair,
)

from catalog.errors import CatalogError
from cli import fit_files, workbook
from cli.cautions import CAUTIONS
from matcher.fit import Fit


def written(fit: Fit, folder: Path, *, with_checks: bool = True, why: bool = False) -> Workbook:
    path = folder / "result.xlsx"
    fit_files.write(
        fit, str(path), SITE_YEAR if fit.year is not None else NO_YEAR, with_checks=with_checks, why=why
    )
    return load_workbook(path)


def rows(book: Workbook, sheet: str, header: int = 1) -> list[dict[str, object]]:
    lines = list(book[sheet].iter_rows(min_row=header, values_only=True))
    return [dict(zip(lines[0], line, strict=True)) for line in lines[1:]]


def test_options_are_those_of_the_result_with_real_numbers(tmp_path: Path) -> None:
    fit = listing()
    found = rows(written(fit, tmp_path), "Options")
    options = list(fit.options())
    assert len(found) == len(options) == 3
    for row, o in zip(found, options, strict=True):
        assert (row["rank"], row["verdict"], row["modules"]) == (o.rank, str(o.verdict), o.modules)
        assert row["arrangement"] == o.label
        assert row["DC/AC ratio"] == pytest.approx(o.dc_ac_ratio)
        assert row["clipping loss [%]"] == pytest.approx(o.clipping_loss_pct)
        assert row["yearly energy [kWh]"] == pytest.approx(o.yearly_kwh)
        assert row["holds up to [degC]"] == pytest.approx(o.hottest_c)
        assert row["inverter maker"] == fit.inverters[o.inverter].maker


def test_unknown_numbers_are_blank(tmp_path: Path) -> None:
    for row in rows(written(listing(year=False), tmp_path), "Options"):
        assert row["clipping loss [%]"] is None and row["yearly energy [kWh]"] is None


def test_a_climate_window_that_waits_for_a_value_is_blank(tmp_path: Path) -> None:
    # 14 in series reach 596 V in the cold: above the window's top, and no maximum DC voltage is on record.
    fit = pair(replace(TABLED, mppt_high_v=450.0), strings=((14, 1),), ratio=(0.7, 1.5))
    (row,) = rows(written(fit, tmp_path), "Options")
    assert row["holds down to [degC]"] is None
    assert "inverter: maximum DC input voltage of at least" in str(row["to confirm"])
    (row,) = rows(written(listing(inverters=(DUO,)), tmp_path), "Options")
    assert row["holds down to [degC]"] == "no limit"


def test_every_table_has_a_frozen_header_and_filters(tmp_path: Path) -> None:
    book = written(listing(), tmp_path)
    assert book.sheetnames == ["Options", "To confirm", "Checks", "Assumptions"]
    for name in book.sheetnames[:3]:
        sheet = book[name]
        assert sheet.freeze_panes == "B2"
        assert sheet.auto_filter.ref == f"A1:{sheet.dimensions.split(':')[1]}"


def test_verdicts_are_words_with_a_shade_of_their_own(tmp_path: Path) -> None:
    sheet = written(listing(), tmp_path)["Options"]
    shades = {cell.value: cell.fill.start_color.rgb for cell in sheet["B"][1:]}
    assert set(shades) == {"fits", "to-confirm"}
    assert len(set(shades.values())) == 2


def test_text_that_begins_like_a_formula_is_text(tmp_path: Path) -> None:
    models = ("=1+1", "+1", "-1", "@SUM(A1)", "=cmd|' /C calc'!A0", "https://example.invalid/")
    inverters = tuple(replace(TABLED, id=k, model=model) for k, model in enumerate(models))
    book = written(listing(inverters=(HOSTILE, *inverters)), tmp_path)
    assert {r["inverter model"] for r in rows(book, "Options")} == {HOSTILE_MODEL, *models}
    assert HOSTILE_MAKER in {r["inverter maker"] for r in rows(book, "Options")}
    formulas = [
        (sheet.title, c.column_letter)
        for sheet in book
        for line in sheet
        for c in line
        if c.data_type == "f" or c.hyperlink
    ]
    assert set(formulas) == {("To confirm", "I")}


def test_what_to_confirm_is_named_with_a_cell_to_fill_in(tmp_path: Path) -> None:
    fit = listing(inverters=(TABLED,))
    (option,) = fit.options()
    found = rows(written(fit, tmp_path), "To confirm")
    assert len(found) == len(option.confirm) > 0
    for row, c in zip(found, option.confirm, strict=True):
        assert c.at_least is not None
        assert c.at_least <= row["at least"] < c.at_least + 0.1
        assert (row["maker"], row["model"], row["unit"]) == (TABLED.maker, TABLED.model, c.unit)
        assert row["datasheet says"] is None


def test_checks_carry_value_limit_margin_and_rule(tmp_path: Path) -> None:
    fit = listing(inverters=(DUO,))
    (option,) = fit.options()
    found = {str(r["check"]): r for r in rows(written(fit, tmp_path), "Checks")}
    assert set(found) == {c.check for c in option.checks}
    cold = found["max-dc-voltage"]
    assert cold["limit"] == DUO.max_dc_voltage_v and cold["unit"] == "V" and cold["kind"] == "safety"
    # One string's cold Voc by the datasheet's coefficient, from the ratings alone.
    voc = MODULE.voc_v * (1 + MODULE.voc_coef_pct / 100 * (-12 - 25))
    length = max(t.in_series for t in option.arrangement)
    assert cold["value"] == pytest.approx(length * voc)
    assert cold["margin [%]"] == pytest.approx((850 - length * voc) / 850 * 100)


def test_assumptions_and_cautions_stand_in_the_workbook(tmp_path: Path) -> None:
    text = [
        str(c)
        for line in written(listing(), tmp_path)["Assumptions"].iter_rows(values_only=True)
        for c in line
    ]
    assert all(line in text for line in CAUTIONS)
    assert any("one tracker, for 2 of 4 inverters" in line for line in text)
    assert any("1.25 times Isc" in line for line in text)


def test_only_the_first_options_are_explained_where_there_are_many(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(workbook, "EXPLAINED", 5)
    fit = pair()
    book = written(fit, tmp_path, with_checks=False)
    assert len(rows(book, "Options")) == fit.totals.arrangements > 5
    assert "holds up to [degC]" not in rows(book, "Options")[0]
    assert (
        book["Checks"]["A1"].value
        == f"Of {fit.totals.arrangements} options, the checks of the first 5 are listed."
    )
    assert {r["rank"] for r in rows(book, "Checks", header=2)} == {1, 2, 3, 4, 5}
    assert book["Checks"].freeze_panes == "B3"
    book = written(pair(), tmp_path, with_checks=True)
    assert [r["holds up to [degC]"] for r in rows(book, "Options")] == [
        pytest.approx(o.hottest_c) if o.hottest_c is not None else "no limit" for o in pair().options()
    ]


def test_more_options_than_a_sheet_has_rows_is_one_line(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(workbook, "ROWS_OF_A_SHEET", 4)
    (tmp_path / "result.xlsx").write_text("as before")
    with pytest.raises(CatalogError, match=r"^\d+ options are more than a sheet .* \(3\): .*\.csv.*--ratio"):
        written(pair(), tmp_path)
    assert [p.name for p in tmp_path.iterdir()] == ["result.xlsx"]
    assert (tmp_path / "result.xlsx").read_text() == "as before"


def test_records_without_option_have_a_sheet_where_asked_for(tmp_path: Path) -> None:
    (row,) = rows(written(listing(), tmp_path, why=True), "Without option")
    assert (row["maker"], row["model"]) == (NARROW.maker, NARROW.model)
    assert "mppt-low" in str(row["stopped by"])


def test_nothing_fits_is_a_workbook_too(tmp_path: Path) -> None:
    book = written(pair(ratio=(0.01, 0.02)), tmp_path)
    assert rows(book, "Options") == []
    assert "Nothing fits." in [c.value for c in book["Assumptions"]["B"]]


def converted(path: Path, form: str) -> str:
    soffice = shutil.which("soffice")
    if soffice is None:
        pytest.skip("LibreOffice (Debian package libreoffice-calc) is not installed")
    home = path.parent / "office"
    done = subprocess.run(
        [
            soffice,
            f"-env:UserInstallation={home.as_uri()}",
            "--headless",
            "--convert-to",
            form,
            "--outdir",
            str(path.parent),
            str(path),
        ],
        capture_output=True,
        text=True,
        timeout=180,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_libreoffice_recalculates_what_was_filled_in(tmp_path: Path) -> None:
    fit = listing(inverters=(TABLED, HOSTILE))
    book = written(fit, tmp_path)
    sheet = book["To confirm"]
    sheet["H2"], sheet["H3"] = sheet["F2"].value, sheet["F3"].value - 0.1
    book.save(tmp_path / "filled.xlsx")
    # Filter options: comma, double quote, UTF-8, from row 1, ... , all sheets (-1).
    converted(
        tmp_path / "filled.xlsx",
        "csv:Text - txt - csv (StarCalc):44,34,76,1,,0,false,true,false,false,false,-1",
    )
    with (tmp_path / "filled-To confirm.csv").open(newline="", encoding="utf-8") as file:
        answers = [row["settled?"] for row in csv.DictReader(file)]
    assert answers[:2] == ["settled", "too low: does not fit"]
    assert set(answers[2:]) <= {""}
    texts = "".join(p.read_text(encoding="utf-8") for p in tmp_path.glob("filled-*.csv"))
    assert "#NAME?" not in texts and "#VALUE!" not in texts and "Err:" not in texts
    assert "=HYPERLINK(" in texts
