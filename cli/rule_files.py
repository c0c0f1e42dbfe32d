"""A user's own rule set in a small TOML file, checked when it is read.

    name = "harbour-authority"
    based_on = "iec-62548"          # what the file does not say is as in this one
    isc_factor = 1.35
    voltage_cap_v = 1000
    cold_voltage = "coefficient"    # or table, or hourly with a cold_margin_pct
    [clauses]
    short-circuit = "Harbour rules 4.2"
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

from catalog.errors import CatalogError
from matcher.rules import COLD_METHODS, PRACTICE, RULE_SETS, RuleSet

#: Numbers of a rule set and what is possible for each.
_NUMBERS = {
    "isc_factor": (1.0, 2.5),
    "fuse_low": (1.0, 5.0),
    "fuse_high": (1.0, 10.0),
    "voltage_cap_v": (10.0, 3000.0),
    "cold_margin_pct": (0.0, 50.0),
}


def read_rule_set(path: str) -> RuleSet:
    """The rule set of a file.

    Raises
    ------
    CatalogError
        One line that names the file, every entry that is wrong, and what would be possible.
    """
    try:
        entries = tomllib.loads(Path(path).read_text(encoding="utf-8-sig"))
    except FileNotFoundError:
        raise CatalogError(
            f"rule set {path}: there is no such file; name one that is there, or {' or '.join(RULE_SETS)}"
            f" ('ferrule rules {next(iter(RULE_SETS))}' prints one to start from)"
        ) from None
    except OSError as error:
        raise CatalogError(f"rule set {path}: {error.strerror}") from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise CatalogError(f"rule set {path} is no TOML file: {error}") from None
    faults = list(_faults(entries))
    if faults:
        raise CatalogError(f"rule set {path}: {'; '.join(faults)}")
    base = RULE_SETS[entries["based_on"]]
    changes: dict[str, Any] = {"name": entries["name"].strip()}
    changes |= {field: float(entries[field]) for field in _NUMBERS if field in entries}
    if "cold_voltage" in entries:
        changes["cold_voltage"] = entries["cold_voltage"]
    clauses = {**base.clauses, **_own_clauses(changes), **entries.get("clauses", {})}
    return replace(base, **changes, clauses=clauses)


def as_toml(rules: RuleSet) -> str:
    """A rule set as a file to start from: what it holds stands behind ``#``, to be uncommented and changed."""
    lines = [
        f"# What stays behind # is as in {rules.name}.",
        'name = "my-rules"',
        f'based_on = "{rules.name}"',
        f"# isc_factor = {rules.isc_factor:g}",
        f"# fuse_low = {rules.fuse_low:g}",
        *([] if rules.fuse_high is None else [f"# fuse_high = {rules.fuse_high:g}"]),
        "# voltage_cap_v = 1000  # none here"
        if rules.voltage_cap_v is None
        else f"# voltage_cap_v = {rules.voltage_cap_v:g}",
        f'# cold_voltage = "{rules.cold_voltage}"  # {", ".join(COLD_METHODS)} (with a cold_margin_pct)',
        "[clauses]",
        *(f'# {check} = "{rules.clause(check)}"' for check in PRACTICE),
    ]
    return "\n".join(lines) + "\n"


def _faults(entries: dict[str, Any]) -> Iterator[str]:
    """Everything that is wrong with the entries of a file."""
    unknown = sorted(set(entries) - {"name", "based_on", "cold_voltage", "clauses", *_NUMBERS})
    if unknown:
        known = ", ".join(["name", "based_on", *_NUMBERS, "cold_voltage", "clauses"])
        yield f"{_quoted(unknown)} not known; a rule set has {known}"
    name = entries.get("name")
    if not isinstance(name, str) or not name.strip() or name.strip() in RULE_SETS:
        yield 'give it a name of its own, such as name = "harbour-authority"'
    if entries.get("based_on") not in list(RULE_SETS):
        yield f"based_on must name {' or '.join(RULE_SETS)}"
    numbers = {}
    for field, (low, high) in _NUMBERS.items():
        value = entries.get(field)
        if value is None:
            continue
        if isinstance(value, bool) or not isinstance(value, (int, float)) or not low <= value <= high:
            yield f"{field} must be a number from {low:g} to {high:g}, not {value!r}"
        else:
            numbers[field] = float(value)
    cold = entries.get("cold_voltage", "coefficient")
    if cold not in list(COLD_METHODS):
        yield f"cold_voltage must be one of {', '.join(COLD_METHODS)}"
    elif cold == "hourly" and "cold_margin_pct" not in entries:
        yield 'cold_voltage = "hourly" needs the margin you choose, cold_margin_pct'
    elif cold != "hourly" and "cold_margin_pct" in entries:
        yield 'cold_margin_pct goes with cold_voltage = "hourly" only; leave it away'
    yield from _fuse_faults(entries, numbers)
    yield from _clause_faults(entries.get("clauses", {}))


def _fuse_faults(entries: dict[str, Any], numbers: dict[str, float]) -> Iterator[str]:
    """The range of fuses upside down, be one end of it that of the rule set that the file is based on."""
    based_on = entries.get("based_on")
    base = RULE_SETS.get(based_on) if isinstance(based_on, str) else None
    low = numbers.get("fuse_low", base.fuse_low if base else None)
    high = numbers.get("fuse_high", base.fuse_high if base else None)
    if low is not None and high is not None and low > high:
        yield f"fuse_low {low:g} is above fuse_high {high:g}"


def _clause_faults(clauses: object) -> Iterator[str]:
    if not isinstance(clauses, dict) or not all(isinstance(text, str) for text in clauses.values()):
        yield "[clauses] holds one text per check"
        return
    unknown = sorted(set(clauses) - set(PRACTICE))
    if unknown:
        yield f"there is no check {', '.join(map(repr, unknown))}; the checks are {', '.join(PRACTICE)}"


def _quoted(words: Sequence[str]) -> str:
    return f"{', '.join(map(repr, words))} {'is' if len(words) == 1 else 'are'}"


#: Checks whose clause no longer stands behind them where an entry is changed.
_BEHIND = {
    "isc_factor": ("short-circuit", "string-fuse"),
    "fuse_low": ("string-fuse",),
    "fuse_high": ("string-fuse",),
    "voltage_cap_v": ("voltage-cap",),
    "cold_voltage": ("max-dc-voltage", "system-voltage", "voltage-cap"),
}


def _own_clauses(changes: dict[str, Any]) -> dict[str, str]:
    """What stands behind the checks that the file changes: the file, not the code that it is based on."""
    found: dict[str, str] = {}
    for field, checks in _BEHIND.items():
        if field in changes:
            value = changes[field] if isinstance(changes[field], str) else f"{changes[field]:g}"
            for check in checks:
                before = f"{found[check]}, " if check in found else f"rule set {changes['name']}: "
                found[check] = f"{before}{field} {value}"
    return found
