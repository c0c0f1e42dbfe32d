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
        One line that names the file, the entry, and what would be possible.
    """
    try:
        entries = tomllib.loads(Path(path).read_text(encoding="utf-8-sig"))
    except OSError as error:
        raise CatalogError(f"rule set {path}: {error.strerror}") from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise CatalogError(f"rule set {path} is no TOML file: {error}") from None
    unknown = sorted(set(entries) - {"name", "based_on", "cold_voltage", "clauses", *_NUMBERS})
    if unknown:
        known = ", ".join(["name", "based_on", *_NUMBERS, "cold_voltage", "clauses"])
        raise CatalogError(f"rule set {path}: {unknown[0]!r} is not known; a rule set has {known}")
    name, based_on = entries.get("name"), entries.get("based_on")
    if not isinstance(name, str) or not name.strip() or name.strip() in RULE_SETS:
        raise CatalogError(f"rule set {path}: give it a name of its own, such as name = \"harbour-authority\"")
    if not isinstance(based_on, str) or based_on not in RULE_SETS:
        raise CatalogError(f"rule set {path}: based_on must name {' or '.join(RULE_SETS)}")
    changes: dict[str, Any] = {"name": name.strip()}
    for field, (low, high) in _NUMBERS.items():
        if field in entries:
            changes[field] = _number(path, field, entries[field], low, high)
    if "cold_voltage" in entries:
        if entries["cold_voltage"] not in COLD_METHODS:
            raise CatalogError(f"rule set {path}: cold_voltage must be one of {', '.join(COLD_METHODS)}")
        changes["cold_voltage"] = entries["cold_voltage"]
    base = RULE_SETS[based_on]
    own = _own_clauses(changes)
    changes["clauses"] = {**base.clauses, **own, **_clauses(path, entries.get("clauses", {}))}
    rules = replace(base, **changes)
    if rules.cold_voltage == "hourly" and "cold_margin_pct" not in entries:
        raise CatalogError(f"rule set {path}: cold_voltage = \"hourly\" needs the margin you choose, cold_margin_pct")
    if rules.cold_voltage != "hourly" and "cold_margin_pct" in entries:
        raise CatalogError(f"rule set {path}: cold_margin_pct goes with cold_voltage = \"hourly\" only; leave it away")
    if rules.fuse_high is not None and rules.fuse_low > rules.fuse_high:
        raise CatalogError(f"rule set {path}: fuse_low {rules.fuse_low:g} is above fuse_high {rules.fuse_high:g}")
    return rules


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


def _number(path: str, field: str, value: object, low: float, high: float) -> float:
    if isinstance(value, bool) or not isinstance(value, (int, float)) or not low <= value <= high:
        raise CatalogError(f"rule set {path}: {field} must be a number from {low:g} to {high:g}, not {value!r}")
    return float(value)


def _clauses(path: str, clauses: object) -> dict[str, str]:
    if not isinstance(clauses, dict) or not all(isinstance(text, str) for text in clauses.values()):
        raise CatalogError(f"rule set {path}: [clauses] holds one text per check")
    unknown = sorted(set(clauses) - set(PRACTICE))
    if unknown:
        raise CatalogError(f"rule set {path}: there is no check {unknown[0]!r}; the checks are {', '.join(PRACTICE)}")
    return clauses
