"""Plausibility of a record's values: what is impossible is refused, what is odd is kept and flagged.

The possible range of a single value stands with the field (`catalog.records`); how values go together
stands in `catalog.plausible_modules` and `catalog.plausible_inverters`, one rule each. Rules work on columns,
so that a whole table is checked in a fraction of a second; one record is a table of one row.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from catalog import plausible_inverters, plausible_modules
from catalog.plausible_columns import Columns, Record, Severity
from catalog.records import FieldSpec, Inputs, Inverter, Module, specs


@dataclass(frozen=True, slots=True)
class Finding:
    """A value, or a set of values, that cannot be or is unusual.

    ``message`` names the values and a likely mend.
    """

    field: str
    severity: Severity
    message: str


def findings(record: Record) -> list[Finding]:
    """What is impossible or odd about one record, the impossible first.

    Parameters
    ----------
    record : Module or Inverter

    Returns
    -------
    list of Finding
        Empty if nothing catches the eye.
    """
    return findings_of([record]).get(0, [])


def findings_of(records: Sequence[Record]) -> dict[int, list[Finding]]:
    """What is impossible or odd about many records.

    Parameters
    ----------
    records : sequence of Module and Inverter
        In any mixture.

    Returns
    -------
    dict
        Findings, the impossible first, by position in ``records``; positions without any are left out.
    """
    found: dict[int, list[Finding]] = {}
    for type_ in (Module, Inverter):
        rows = [i for i, r in enumerate(records) if isinstance(r, type_)]
        if rows:
            for k, finding in _check([records[i] for i in rows], type_):
                found.setdefault(rows[k], []).append(finding)
    for some in found.values():
        some.sort(key=lambda f: f.severity != "impossible")
    return dict(sorted(found.items()))


def _check(records: Sequence[Record], type_: type) -> list[tuple[int, Finding]]:
    """Row and finding, for records of one type."""
    import numpy as np

    rules = plausible_modules.RULES if type_ is Module else plausible_inverters.RULES
    columns = Columns(records)
    found = []
    for spec in specs(type_).values():
        if spec.type is str:
            found += [(k, _blank(spec)) for k, r in enumerate(records) if not getattr(r, spec.name).strip()]
        else:
            found += _out_of_range(columns, spec)
    if type_ is Inverter:
        found += _of_inputs(records)
    with np.errstate(all="ignore"):
        for rule in rules:
            for k in np.flatnonzero(rule.broken(columns)).tolist():
                found.append((k, Finding(rule.field, rule.severity, rule.message(records[k]))))
    return found


def _blank(spec: FieldSpec) -> Finding:
    return Finding(spec.name, "impossible", f"{spec.name} is blank: enter the {spec.meaning}")


def _out_of_range(columns: Columns, spec: FieldSpec) -> list[tuple[int, Finding]]:
    """Findings on the values of one field by themselves; such values are then left out of the column."""
    import numpy as np

    column = getattr(columns, spec.name)
    broken = np.isinf(column)
    if spec.low is not None:
        broken |= column < spec.low
    if spec.high is not None:
        broken |= column > spec.high
    missing = [getattr(r, spec.name) is None for r in columns.records] if np.isnan(column).any() else None
    if missing is not None:
        broken |= np.isnan(column) & ~(np.array(missing) & (not spec.required))
    column[broken] = np.nan
    rows = np.flatnonzero(broken).tolist()
    return [(k, _range_finding(spec, getattr(columns.records[k], spec.name))) for k in rows]


def _range_finding(spec: FieldSpec, value: float | None, field: str | None = None) -> Finding:
    """Finding for a value outside the possible range, with what it most likely is."""
    name = field or spec.name
    if value is None:
        return Finding(name, "impossible", f"{spec.name} is missing: every record needs it ({spec.meaning})")
    unit = "" if spec.unit in ("", "1") else f" {spec.unit}"
    if value != value or abs(value) == float("inf"):
        return Finding(
            name, "impossible", f"{spec.name} is {value}, which is no number: enter one or leave it blank"
        )
    limits = f"below {spec.low or 0:g}{unit}"
    if spec.low is None or value > spec.low:
        limits = f"above {spec.high:g}{unit}"
    return Finding(
        name, "impossible", f"{spec.name} {value:g}{unit} cannot be {limits}{_likely(spec, value)}"
    )


def _likely(spec: FieldSpec, value: float) -> str:
    """What a value outside its range most likely is, as the end of a sentence."""
    if value == 0 and not spec.required:
        return ": leave it blank where it is not known"
    if spec.unit == "%/K":
        if value > 0 and spec.high == 0:
            return ": it falls with temperature, so it carries a minus sign"
        return ": it is in percent of the STC value per kelvin, not in mV, V or A per kelvin"
    if spec.unit == "%" and 0 < value <= 1:
        return ": it is in percent, not a fraction"
    if spec.name == "bifaciality" and value > 2:
        return ": it is a fraction, not percent"
    if spec.unit == "W" and spec.low is not None and 0 < value < spec.low:
        return ": it is in W, not kW"
    if spec.unit == "m" and spec.high is not None and value >= 10 * spec.high:
        return ": it is in m, not mm"
    return ""


def _of_inputs(records: Sequence[Inverter]) -> list[tuple[int, Finding]]:
    """Findings on groups of inputs; types share few different ones, so each is looked at once."""
    seen: dict[tuple[Inputs, ...], list[Finding]] = {}
    found = []
    for k, record in enumerate(records):
        groups = tuple(record.inputs)
        if groups not in seen:
            seen[groups] = list(_group_findings(groups))
        found += [(k, finding) for finding in seen[groups]]
    return found


def _group_findings(groups: tuple[Inputs, ...]) -> list[Finding]:
    if not groups:
        return [Finding("inputs", "impossible", "inputs is empty: an inverter has at least one tracker")]
    found = []
    for group in groups:
        for name, spec in specs(Inputs).items():
            value = getattr(group, name)
            if value is None and not spec.required:
                continue
            inside = value is not None and (spec.low or 0) <= value <= (spec.high or float("inf"))
            if not inside:
                found.append(_range_finding(spec, value, "inputs"))
    return found + [Finding("inputs", "odd", message) for message in plausible_inverters.odd_inputs(groups)]


def by_severity(found: Mapping[int, list[Finding]], severity: Severity) -> list[tuple[int, Finding]]:
    """Position and finding of one severity, out of what `findings_of` returns."""
    return [(k, f) for k, some in found.items() for f in some if f.severity == severity]
