"""A result of rows as a file: .csv, .xlsx, .json or .html, whichever its ending says; and parts of its document."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any

from catalog.errors import CatalogError
from cli.cautions import CAUTIONS
from cli.fit_files import replacing, safe

if TYPE_CHECKING:
    from matcher.checks import Check, Confirm
    from matcher.options import Unit
    from matcher.rules import RuleSet

FORMS = (".csv", ".xlsx", ".json", ".html")

#: A column: header with unit, width in a workbook, digits after the point (None: text).
Heading = tuple[str, int, int | None]


@dataclass(frozen=True, slots=True)
class Sheet:
    """One sheet of a workbook."""

    title: str
    headings: Sequence[Heading]
    rows: Iterable[Sequence[Any]]


@dataclass(frozen=True, slots=True)
class Forms:
    """A result in all forms, each made only if it is asked for.

    ``sheets`` are those of a workbook, the first of which is the table of the CSV file too; ``basis`` are lines
    that say what it rests on, each with its kind.
    """

    sheets: Callable[[], list[Sheet]]
    basis: Callable[[], list[tuple[str, str]]]
    document: Callable[[], dict[str, Any]]
    page: Callable[[IO[str]], None]


def write(forms: Forms, out: str) -> None:
    """Write a result to a file.

    Raises
    ------
    CatalogError
        Where the ending names no form, or the file cannot be written.
    """
    path = Path(out)
    form = path.suffix.lower()
    if form not in FORMS:
        raise CatalogError(f"--out {out}: the ending decides the form, {', '.join(FORMS[:-1])} or {FORMS[-1]}")
    with replacing(path, binary=form == ".xlsx") as stream:
        if form == ".xlsx":
            _write_workbook(forms, stream)
        elif form == ".json":
            json.dump(forms.document(), stream, allow_nan=False, indent=1)
        elif form == ".html":
            forms.page(stream)
        else:
            first = forms.sheets()[0]
            writer = csv.writer(stream)
            writer.writerow([name for name, _, _ in first.headings])
            writer.writerows([_cell(v) for v in row] for row in first.rows)


def _cell(value: Any) -> Any:
    if value is None:
        return ""
    if isinstance(value, float):
        return f"{value:.6g}"
    return safe(value) if isinstance(value, str) else value


def _write_workbook(forms: Forms, stream: IO[bytes]) -> None:
    import xlsxwriter

    from cli.worksheets import Column, Formats, Table

    book = xlsxwriter.Workbook(stream, {"strings_to_formulas": False, "strings_to_urls": False})
    formats = Formats(book)
    formats.verdicts["no-verdict"] = formats.verdicts["note"]
    basis = Sheet("Rests on", (("what", 14, None), ("words", 110, None)),
                  [*forms.basis(), *(("Caution", line) for line in CAUTIONS)])  # fmt: skip
    for sheet in (*forms.sheets(), basis):
        table = Table(book, sheet.title, [Column(*h) for h in sheet.headings], formats)
        for row in sheet.rows:
            table.row([None if v == "" else v for v in row])
        table.close()
    book.close()


def check_entry(c: Check) -> dict[str, Any]:
    """One check in a document."""
    found = {"check": c.check, "verdict": str(c.verdict), "value": c.value, "limit": c.limit, "unit": c.unit,
             "margin_pct": c.margin_pct, "rule": c.rule}  # fmt: skip
    return found | ({"remark": c.remark} if c.remark else {})


def confirm_entry(c: Confirm) -> dict[str, Any]:
    """One value to confirm in a document."""
    found = {"record": c.record, "field": c.field, "at_least": c.at_least}
    return found | ({} if c.inputs is None else {"inputs": c.inputs})


def unit_entry(unit: Unit) -> dict[str, Any]:
    """Units that are wired alike in a document."""
    arrangement = [{"inputs": t.inputs, "strings": t.strings, "in_series": t.in_series} for t in unit.trackers]
    return {"units": unit.copies, "modules": unit.modules, "arrangement": arrangement}


def rules_entry(rules: RuleSet) -> dict[str, Any]:
    """The rule set in a document."""
    found = {"name": rules.name, "isc_factor": rules.isc_factor, "voltage_cap_v": rules.voltage_cap_v,
             "cold_voltage": rules.cold_voltage}  # fmt: skip
    return found | ({"cold_margin_pct": rules.cold_margin_pct} if rules.cold_voltage == "hourly" else {})
