"""Vetted bundles as a file or a document, `ferrule.vet/1`."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import IO, TYPE_CHECKING, Any

from cli.facts import confirm_line
from cli.table_files import Forms, Heading, Sheet, check_entry, confirm_entry, rules_entry, unit_entry
from cli.vet_words import cause, mend_words, place_words, window_cells, window_words
from matcher.vet import NO_VERDICT

if TYPE_CHECKING:
    from cli.vet_lists import Line
    from matcher.rules import RuleSet

VET_SCHEMA = "ferrule.vet/1"

SOUND = (
    "A bundle is unsound only where no arrangement of exactly its modules on exactly its inverters passes the checks;"
    " its DC/AC ratio is remarked on and is no reason."
)


def forms(lines: Sequence[Line], rules: RuleSet, page: Callable[[IO[str]], None], years: Sequence[str]) -> Forms:
    """The bundles in all forms of a file; ``page`` writes them as a page, ``years`` say where their energy is from."""
    return Forms(
        lambda: [
            Sheet("Bundles", _COLUMNS, (_values(line) for line in lines)),
            Sheet("Reasons", _REASONS, (
                [line.row.number, line.row.article, line.verdict, *values] for line in lines for values in _reasons(line)
            )),
        ],
        lambda: [
            *(("Site", line) for line in place_words(lines)),
            *(("Weather", line) for line in years),
            ("Rules", rule_words(rules)),
            ("Sound", SOUND),
        ],
        lambda: document(lines, rules),
        page,
    )  # fmt: skip


def rule_words(rules: RuleSet) -> str:
    """The rule set in a sentence."""
    return f"{rules.name}: the design short-circuit current is {rules.isc_factor:g} times Isc."


def document(lines: Sequence[Line], rules: RuleSet) -> dict[str, Any]:
    """The document; what is not known is null."""
    return {
        "schema": VET_SCHEMA,
        "rules": rules_entry(rules),
        "bundles": [entry(line) for line in lines],
        "totals": {
            "bundles": len(lines),
            **{v: sum(line.verdict == v for line in lines)
               for v in ("fits", "to-confirm", "does-not-fit", "no-verdict")},
        },
    }  # fmt: skip


def entry(line: Line) -> dict[str, Any]:
    """One bundle of the document."""
    row, v = line.row, line.vetted
    found: dict[str, Any] = {
        "row": row.number, "article": row.article or None, "module": row.module, "modules": row.modules,
        "inverter": row.inverter, "units": row.units or "1", "site": None, "verdict": line.verdict,
        "reason": line.reason or None, "listed": {"module": row.module, "inverter": row.inverter},
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
        "units_wired": [unit_entry(u) for u in v.wired],
        "dc_ac_ratio": v.option.dc_ac_ratio if v.option is not None else None,
        "clipping_loss_pct": v.option.clipping_loss_pct if v.option is not None else None,
        "yearly_kwh": v.option.yearly_kwh if v.option is not None else None,
        "checks": [check_entry(c) for c in v.checks],
        "confirm": [confirm_entry(c) for c in (v.option.confirm if v.option is not None else ())],
        "climate": None if v.window is None else {"coldest_c": v.window.coldest_c, "hottest_c": v.window.hottest_c},
        "mends": [{"kind": m.kind, "modules": m.modules, "units": m.units,
                   "inverter": v.inverters[m.inverter].name, "label": m.label, "verdict": m.verdict}
                  for m in v.mends],
        "remarks": list(line.remarks),
    }  # fmt: skip
    return found


_COLUMNS: tuple[Heading, ...] = (
    ("row", 6, 0), ("article", 14, None), ("verdict", 13, None), ("module", 30, None), ("modules", 9, 0),
    ("inverter", 30, None), ("inverters", 9, 0), ("site", 20, None), ("wiring", 22, None), ("DC/AC ratio", 8, 3),
    ("clipping loss [%]", 8, 2), ("yearly energy [kWh]", 10, 0),
    ("coldest [degC]", 9, 1), ("hottest [degC]", 9, 1), ("cause", 22, None), ("smallest change", 40, None),
    ("to confirm", 50, None), ("reason or remark", 60, None), ("module in the list", 30, None),
    ("inverter in the list", 30, None),
)  # fmt: skip


def _values(line: Line) -> list[Any]:
    row, v = line.row, line.vetted
    if v is None:
        return [row.number, row.article, line.verdict, row.module, None, row.inverter, None, row.site,
                *[None] * 9, line.reason, row.module, row.inverter]  # fmt: skip
    o = v.option
    inverter = v.inverter.name
    window = (None, None) if v.verdict == NO_VERDICT else window_cells(v.window)
    return [
        row.number, row.article, line.verdict, v.bundle.module.name, v.bundle.modules, inverter, v.bundle.units,
        v.site.name, o.label if o else None, o.dc_ac_ratio if o else None,
        o.clipping_loss_pct if o else None, o.yearly_kwh if o else None, *window, cause(v.failed) or None,
        mend_words(v.mends[0], v) if v.mends else None, confirm_line(o) if o else None,
        "; ".join([v.reason] * bool(v.reason) + list(line.remarks)) or None, row.module, row.inverter,
    ]  # fmt: skip


_REASONS: tuple[Heading, ...] = (
    ("row", 6, 0), ("article", 14, None), ("verdict", 13, None), ("kind", 12, None), ("what", 24, None),
    ("value", 10, 1), ("limit", 10, 1), ("unit", 6, None), ("margin [%]", 9, 1), ("words", 80, None),
)  # fmt: skip


def _reasons(line: Line) -> list[list[Any]]:
    v = line.vetted
    if v is None:
        return [["reason", "no verdict", None, None, None, None, line.reason]]
    found: list[list[Any]] = []
    if v.reason:
        found.append(["reason", cause(v.failed) or "no verdict", None, None, None, None, v.reason])
    for c in v.checks:
        if c.verdict != "fits" and not (c.verdict == "to-confirm" and not c.stop):
            unit = None if c.unit == "1" else c.unit
            found.append(["check", c.check, c.value, c.limit, unit, c.margin_pct, c.remark or c.rule])
    found += [["remark", "name", None, None, None, None, words] for words in line.read_as]
    found += [["change", m.kind, None, None, None, None, mend_words(m, v)] for m in v.mends]
    if (v.window is not None or v.failed) and not (v.failed and v.window is not None and v.window.by_hours):
        found.append(["climate", "window", None, None, None, None, window_words(v.window)])
    return found
