"""Vetted bundles as a file or a document, `ferrule.vet/1`."""

from __future__ import annotations

import csv
import json
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any

from catalog.errors import CatalogError
from cli.cautions import CAUTIONS
from cli.facts import confirm_line
from cli.fit_files import replacing, safe
from cli.vet_words import cause, mend_words, window_words

if TYPE_CHECKING:
    from cli.vet_lists import Line
    from matcher.checks import Check
    from matcher.options import Unit
    from matcher.rules import RuleSet

VET_SCHEMA = "ferrule.vet/1"

FORMS = (".csv", ".xlsx", ".json")


def write(lines: Sequence[Line], out: str, rules: RuleSet) -> None:
    """Write all bundles to a file.

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
            _write_workbook(lines, stream, rules)
        elif form == ".json":
            json.dump(document(lines, rules), stream, allow_nan=False, indent=1)
        else:
            writer = csv.writer(stream)
            writer.writerow([name for name, _, _ in _COLUMNS])
            for line in lines:
                writer.writerow([_cell(v) for v in _values(line)])


def print_document(lines: Sequence[Line], rules: RuleSet) -> None:
    """Print the document on stdout."""
    json.dump(document(lines, rules), sys.stdout, allow_nan=False, indent=1)
    print()


def document(lines: Sequence[Line], rules: RuleSet) -> dict[str, Any]:
    """The document; what is not known is null."""
    return {
        "schema": VET_SCHEMA,
        "rules": {"name": rules.name, "isc_factor": rules.isc_factor, "voltage_cap_v": rules.voltage_cap_v},
        "bundles": [entry(line) for line in lines],
        "totals": {
            "bundles": len(lines),
            **{v: sum(line.verdict == v for line in lines)
               for v in ("fits", "to-confirm", "does-not-fit", "no-verdict", "not-judged")},
        },
    }  # fmt: skip


def entry(line: Line) -> dict[str, Any]:
    """One bundle of the document."""
    row, v = line.row, line.vetted
    found: dict[str, Any] = {
        "row": row.number, "article": row.article or None, "module": row.module, "modules": row.modules,
        "inverter": row.inverter, "units": row.units or "1", "site": None, "verdict": line.verdict,
        "reason": line.reason or None,
    }  # fmt: skip
    if v is None:
        return found
    found |= {
        "module": v.bundle.module.name, "modules": v.bundle.modules, "units": v.bundle.units,
        "inverter": v.inverter.name,
        "site": {"name": v.site.name, "design_low_c": v.site.design_low_c, "design_high_c": v.site.design_high_c,
                 "mounting": v.site.mounting, "solved": v.solved},
        "reason": v.reason or None, "failed": list(v.failed), "cause": cause(v.failed) or None,
        "label": v.option.label if v.option is not None else None,
        "units_wired": [_unit(u) for u in v.wired],
        "dc_ac_ratio": v.option.dc_ac_ratio if v.option is not None else None,
        "clipping_loss_pct": v.option.clipping_loss_pct if v.option is not None else None,
        "yearly_kwh": v.option.yearly_kwh if v.option is not None else None,
        "checks": [_check(c) for c in v.checks],
        "confirm": [{"record": c.record, "field": c.field, "at_least": c.at_least}
                    | ({} if c.inputs is None else {"inputs": c.inputs})
                    for c in (v.option.confirm if v.option is not None else ())],
        "climate": None if v.window is None else {"coldest_c": v.window.coldest_c, "hottest_c": v.window.hottest_c},
        "mends": [{"kind": m.kind, "modules": m.modules, "units": m.units,
                   "inverter": v.inverters[m.inverter].name, "label": m.label, "verdict": m.verdict}
                  for m in v.mends],
        "remarks": list(v.remarks),
    }  # fmt: skip
    return found


def _unit(unit: Unit) -> dict[str, Any]:
    arrangement = [{"inputs": t.inputs, "strings": t.strings, "in_series": t.in_series} for t in unit.trackers]
    return {"units": unit.copies, "modules": unit.modules, "arrangement": arrangement}


def _check(c: Check) -> dict[str, Any]:
    found = {"check": c.check, "verdict": str(c.verdict), "value": c.value, "limit": c.limit, "unit": c.unit,
             "margin_pct": c.margin_pct, "rule": c.rule}  # fmt: skip
    return found | ({"remark": c.remark} if c.remark else {})


#: Columns of a list: header with unit, width in a workbook, digits after the point (None: text).
_COLUMNS: tuple[tuple[str, int, int | None], ...] = (
    ("row", 6, 0), ("article", 14, None), ("verdict", 13, None), ("module", 30, None), ("modules", 9, 0),
    ("inverter", 30, None), ("inverters", 9, 0), ("site", 20, None), ("wiring", 22, None), ("DC/AC ratio", 8, 3),
    ("clipping loss [%]", 8, 2), ("yearly energy [kWh]", 10, 0),
    ("coldest [degC]", 9, 1), ("hottest [degC]", 9, 1), ("cause", 22, None), ("smallest change", 40, None),
    ("to confirm", 50, None), ("reason or remark", 60, None),
)  # fmt: skip


def _values(line: Line) -> list[Any]:
    row, v = line.row, line.vetted
    if v is None:
        return [row.number, row.article, line.verdict, row.module, None, row.inverter, None, row.site,
                *[None] * 9, line.reason]  # fmt: skip
    o = v.option
    inverter = v.inverter.name
    window = (None, None) if v.window is None else (v.window.coldest_c, v.window.hottest_c)
    return [
        row.number, row.article, line.verdict, v.bundle.module.name, v.bundle.modules, inverter, v.bundle.units,
        v.site.name, o.label if o else None, o.dc_ac_ratio if o else None,
        o.clipping_loss_pct if o else None, o.yearly_kwh if o else None, *window, cause(v.failed) or None,
        mend_words(v.mends[0], v) if v.mends else None, confirm_line(o) if o else None,
        v.reason or "; ".join(v.remarks) or None,
    ]  # fmt: skip


def _cell(value: Any) -> Any:
    if value is None:
        return ""
    if isinstance(value, float):
        return f"{value:.6g}"
    return safe(value) if isinstance(value, str) else value


def _write_workbook(lines: Sequence[Line], stream: IO[bytes], rules: RuleSet) -> None:
    """Three sheets: the bundles, the reasons of those that are not simply sound, and what it rests on."""
    import xlsxwriter

    from cli.worksheets import Column, Formats, Table

    book = xlsxwriter.Workbook(stream, {"strings_to_formulas": False, "strings_to_urls": False})
    formats = Formats(book)
    for word in ("no-verdict", "not-judged"):
        formats.verdicts[word] = formats.verdicts["note"]
    bundles = Table(book, "Bundles", [Column(*c) for c in _COLUMNS], formats)
    for line in lines:
        bundles.row([v if v != "" else None for v in _values(line)])
    bundles.close()
    reasons = Table(book, "Reasons", [Column(*c) for c in _REASONS], formats)
    for line in lines:
        for values in _reasons(line):
            reasons.row([line.row.number, line.row.article or None, line.verdict, *values])
    reasons.close()
    basis = Table(book, "Rests on", [Column("what", 14), Column("words", 110)], formats)
    basis.row(["Rules", f"{rules.name}: the design short-circuit current is {rules.isc_factor:g} times Isc."])
    basis.row(["Sound", "A bundle is unsound only where no arrangement of exactly its modules on exactly its inverters"
               " passes the checks; its DC/AC ratio is remarked on and is no reason."])  # fmt: skip
    for line in CAUTIONS:
        basis.row(["Caution", line])
    basis.close()
    book.close()


_REASONS = (
    ("row", 6, 0), ("article", 14, None), ("verdict", 13, None), ("kind", 12, None), ("what", 24, None),
    ("value", 10, 1), ("limit", 10, 1), ("unit", 6, None), ("margin [%]", 9, 1), ("words", 80, None),
)  # fmt: skip


def _reasons(line: Line) -> list[list[Any]]:
    v = line.vetted
    if v is None:
        return [["reason", "not judged", None, None, None, None, line.reason]]
    found: list[list[Any]] = []
    if v.reason:
        found.append(["reason", cause(v.failed) or "no verdict", None, None, None, None, v.reason])
    for c in v.checks:
        if c.verdict != "fits" and not (c.verdict == "to-confirm" and not c.stop):
            unit = None if c.unit == "1" else c.unit
            found.append(["check", c.check, c.value, c.limit, unit, c.margin_pct, c.remark or c.rule])
    found += [["change", m.kind, None, None, None, None, mend_words(m, v)] for m in v.mends]
    if v.window is not None or v.failed:
        found.append(["climate", "window", None, None, None, None, window_words(v.window)])
    return found
