"""The twelve checks of one option, and the verdict they add up to.

Each check says what it measured, the limit, the margin and the clause or practice behind it. A limit that no
source states makes a safety check *to confirm*, and names the value that would settle it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum

from catalog.records import Inverter, Module, Site
from matcher.limits import TOLERANCE, voltage_cap
from matcher.rules import RuleSet


class Verdict(StrEnum):
    """Outcome of a check or an option. ``note`` is a note whose condition is not met; it stops nothing."""

    FITS = "fits"
    TO_CONFIRM = "to-confirm"
    DOES_NOT_FIT = "does-not-fit"
    NOTE = "note"


def face_mark(face: int) -> str:
    """Letter of a face, with a blank before it; nothing for 0."""
    return f" {chr(ord('A') + face - 1)}" if face else ""


@dataclass(frozen=True, slots=True)
class Tracker:
    """What one tracker carries: its group of inputs (index), strings, modules in series, and which way they face.

    ``face`` numbers the different faces of the request from 1; 0 where all strings face the same way.
    """

    inputs: int
    strings: int
    in_series: int
    face: int = 0

    @property
    def label(self) -> str:
        """Like ``2x11``: 2 strings of 11 modules; ``2x11 A`` where they are those that face the first way."""
        return f"{self.strings}x{self.in_series}{face_mark(self.face)}"


@dataclass(frozen=True, slots=True)
class Confirm:
    """A value that would settle a check: at least this much (at most, where ``at_most`` is given instead)."""

    record: str
    field: str
    at_least: float | None
    unit: str
    inputs: int | None = None


@dataclass(frozen=True, slots=True)
class Check:
    """One check of one option. ``margin_pct`` is the distance to the limit in percent of the limit."""

    check: str
    safety: bool
    stop: bool
    verdict: Verdict
    value: float | None
    limit: float | None
    unit: str
    margin_pct: float | None
    rule: str
    confirm: Confirm | None = None
    remark: str | None = None


@dataclass(frozen=True, slots=True)
class ModulePoints:
    """Design values of one module: temperatures [degC], voltages [V], currents [A], power [W]."""

    cell_cold_c: float
    cell_hot_c: float
    voc_cold_v: float
    voc_hot_v: float | None
    vmp_hot_v: float
    vmp_25_v: float
    vmp_cold_v: float
    isc_design_a: float
    imp_a: float
    pmax_w: float


@dataclass(frozen=True, slots=True)
class Pair:
    """Everything the checks need to know besides the arrangement."""

    module: Module
    points: ModulePoints
    inverter: Inverter
    site: Site
    rules: RuleSet
    combiner: bool = False


SAFETY = frozenset({"max-dc-voltage", "system-voltage", "voltage-cap", "short-circuit"})
NOTES = frozenset({"cold-tracking", "input-current", "string-fuse", "tracker-power"})


def _holds_max(value: float, limit: float) -> bool:
    return value <= limit * (1.0 + TOLERANCE)


def _holds_min(value: float, limit: float) -> bool:
    return value >= limit * (1.0 - TOLERANCE)


def _check(
    pair: Pair,
    name: str,
    value: float | None,
    limit: float | None,
    unit: str,
    verdict: Verdict,
    *,
    minimum: bool = False,
    rule: str | None = None,
    confirm: Confirm | None = None,
    remark: str | None = None,
) -> Check:
    margin = None
    if value is not None and limit:
        margin = (value - limit if minimum else limit - value) / limit * 100.0
    if verdict is Verdict.DOES_NOT_FIT and name in NOTES:
        verdict = Verdict.NOTE
    return Check(
        name, name in SAFETY, name not in NOTES, verdict, value, limit, unit, margin,
        rule or pair.rules.clause(name), confirm, remark,
    )  # fmt: skip


def _maximum(pair: Pair, name: str, value: float, limit: float, unit: str, **more: object) -> Check:
    verdict = Verdict.FITS if _holds_max(value, limit) else Verdict.DOES_NOT_FIT
    return _check(pair, name, value, limit, unit, verdict, **more)  # type: ignore[arg-type]


def _minimum(pair: Pair, name: str, value: float, limit: float, unit: str) -> Check:
    verdict = Verdict.FITS if _holds_min(value, limit) else Verdict.DOES_NOT_FIT
    return _check(pair, name, value, limit, unit, verdict, minimum=True)


def _max_dc_voltage(pair: Pair, longest: int) -> Check:
    value = longest * pair.points.voc_cold_v
    stated = pair.inverter.max_dc_voltage_v
    if stated is not None:
        return _maximum(pair, "max-dc-voltage", value, stated, "V")
    if _holds_max(value, pair.inverter.mppt_high_v):
        rule = f"{pair.rules.clause('max-dc-voltage')}; not stated, at least the top of the MPPT window"
        return _maximum(pair, "max-dc-voltage", value, pair.inverter.mppt_high_v, "V", rule=rule)
    confirm = Confirm("inverter", "max_dc_voltage_v", value, "V")
    return _check(pair, "max-dc-voltage", value, None, "V", Verdict.TO_CONFIRM, confirm=confirm)


def _system_voltage(pair: Pair, longest: int) -> Check:
    value = longest * pair.points.voc_cold_v
    if pair.module.max_system_voltage_v is None:
        confirm = Confirm("module", "max_system_voltage_v", value, "V")
        return _check(pair, "system-voltage", value, None, "V", Verdict.TO_CONFIRM, confirm=confirm)
    return _maximum(pair, "system-voltage", value, pair.module.max_system_voltage_v, "V")


def _start(pair: Pair, shortest: int) -> Check | None:
    limit = pair.inverter.start_voltage_v
    if limit is None:
        return None
    if pair.points.voc_hot_v is not None:
        return _minimum(pair, "start", shortest * pair.points.voc_hot_v, limit, "V")
    # Without a coefficient Voc in the heat is only known to be above Vmp in the heat.
    value = shortest * pair.points.vmp_hot_v
    if _holds_min(value, limit):
        return _minimum(pair, "start", value, limit, "V")
    confirm = Confirm("module", "voc_coef_pct", None, "%/K")
    return _check(pair, "start", None, limit, "V", Verdict.TO_CONFIRM, minimum=True, confirm=confirm)


def _worst(checks: Sequence[Check]) -> Check:
    """The check that decides: failing before unstated before the smallest margin."""
    rank = {Verdict.DOES_NOT_FIT: 0, Verdict.NOTE: 1, Verdict.TO_CONFIRM: 2, Verdict.FITS: 3}
    # Among unstated limits the one with the largest value asks for most.
    return min(
        checks,
        key=lambda c: (rank[c.verdict], c.margin_pct if c.margin_pct is not None else -(c.value or 0.0)),
    )


def _short_circuit(pair: Pair, trackers: Sequence[Tracker]) -> list[Check]:
    """One check per group of inputs whose limit is not stated, else the tightest."""
    found: dict[int, Check] = {}
    stated: list[Check] = []
    for t in trackers:
        limit = pair.inverter.inputs[t.inputs].max_isc_a
        value = t.strings * pair.points.isc_design_a
        if limit is not None:
            stated.append(_maximum(pair, "short-circuit", value, limit, "A"))
            continue
        before = found.get(t.inputs)
        if before is None or (before.value or 0.0) < value:
            confirm = Confirm("inverter", "max_isc_a", value, "A", inputs=t.inputs)
            found[t.inputs] = _check(pair, "short-circuit", value, None, "A", Verdict.TO_CONFIRM, confirm=confirm)
    if stated:
        worst = _worst(stated)
        if not found or worst.verdict is Verdict.DOES_NOT_FIT:
            return [worst, *found.values()]
    return list(found.values())


def _string_inputs(pair: Pair, trackers: Sequence[Tracker]) -> list[Check]:
    """Strings against the inputs of the tightest tracker; waived with a combiner box."""
    if pair.combiner:
        return []
    found = [
        _maximum(pair, "string-inputs", float(t.strings), float(limit), "1")
        for t in trackers
        if (limit := pair.inverter.inputs[t.inputs].strings_per_tracker) is not None
    ]
    return [_worst(found)] if found else []


def _input_current(pair: Pair, trackers: Sequence[Tracker]) -> list[Check]:
    """Note: operating current against the tightest tracker's limit; an unstated one is said."""
    found = []
    for t in trackers:
        limit = pair.inverter.inputs[t.inputs].max_current_a
        value = t.strings * pair.points.imp_a
        if limit is None:
            confirm = Confirm("inverter", "max_current_a", value, "A", inputs=t.inputs)
            found.append(_check(pair, "input-current", value, None, "A", Verdict.TO_CONFIRM, confirm=confirm))
        else:
            held = not _holds_max(value, limit)
            remark = "the tracker limits the current; the loss counts as clipping" if held else None
            found.append(_maximum(pair, "input-current", value, limit, "A", remark=remark))
    return [_worst(found)] if found else []


def _tracker_power(pair: Pair, trackers: Sequence[Tracker]) -> list[Check]:
    """Note: STC power against the tightest tracker's stated power."""
    found = [
        _maximum(pair, "tracker-power", t.strings * t.in_series * pair.points.pmax_w, limit, "W")
        for t in trackers
        if (limit := pair.inverter.inputs[t.inputs].max_power_w) is not None
    ]
    return [_worst(found)] if found else []


def _string_fuse(pair: Pair, most_strings: int) -> Check:
    fuse = pair.module.max_series_fuse_a
    value = (most_strings - 1) * pair.points.isc_design_a
    if most_strings <= 2:
        return _check(pair, "string-fuse", value, fuse, "A", Verdict.FITS, remark="one or two strings need none")
    if fuse is None:
        confirm = Confirm("module", "max_series_fuse_a", value, "A")
        remark = "with a lower rating string fuses are needed"
        return _check(pair, "string-fuse", value, None, "A", Verdict.TO_CONFIRM, confirm=confirm, remark=remark)
    remark = None
    if not _holds_max(value, fuse):
        low, high = fuse_range(pair.rules, pair.points, fuse)
        remark = f"string fuses of {low:.1f} to {high:.1f} A are needed"
        if low > high:
            remark = f"string fuses of at least {low:.1f} A are needed, and the module allows {fuse:g} A at most"
    return _maximum(pair, "string-fuse", value, fuse, "A", remark=remark)


def fuse_range(rules: RuleSet, points: ModulePoints, max_series_fuse_a: float) -> tuple[float, float]:
    """Lowest and highest rating of a string fuse [A] under a rule set and the module's own maximum."""
    isc = points.isc_design_a / rules.isc_factor
    high = max_series_fuse_a if rules.fuse_high is None else min(rules.fuse_high * isc, max_series_fuse_a)
    return rules.fuse_low * isc, high


def check_option(pair: Pair, trackers: Sequence[Tracker]) -> list[Check]:
    """All checks that apply to an arrangement; with several trackers each names the tightest of them."""
    longest = max(t.in_series for t in trackers)
    shortest = min(t.in_series for t in trackers)
    points, inverter = pair.points, pair.inverter
    checks: list[Check | None] = [_max_dc_voltage(pair, longest), _system_voltage(pair, longest)]
    cap = voltage_cap(pair.site, pair.rules)
    if cap == cap:  # not NaN
        checks.append(_maximum(pair, "voltage-cap", longest * points.voc_cold_v, cap, "V"))
    checks.append(_minimum(pair, "mppt-low", shortest * points.vmp_hot_v, inverter.mppt_low_v, "V"))
    checks.append(_maximum(pair, "mppt-high", longest * points.vmp_25_v, inverter.mppt_high_v, "V"))
    checks.append(_start(pair, shortest))
    checks += _short_circuit(pair, trackers)
    checks += _string_inputs(pair, trackers)
    modules = sum(t.strings * t.in_series for t in trackers)
    if inverter.max_array_power_w is not None:
        checks.append(_maximum(pair, "array-power", modules * points.pmax_w, inverter.max_array_power_w, "W"))
    checks.append(_maximum(pair, "cold-tracking", longest * points.vmp_cold_v, inverter.mppt_high_v, "V"))
    checks += _input_current(pair, trackers)
    checks += _tracker_power(pair, trackers)
    checks.append(_string_fuse(pair, max(t.strings for t in trackers)))
    return [c for c in checks if c is not None]


def worst_of_each(checks: Sequence[Check]) -> list[Check]:
    """The deciding one of each check (and of each group of inputs to confirm), in the order of the checks."""
    found: dict[tuple[str, int | None], list[Check]] = {}
    for c in checks:
        group = c.confirm.inputs if c.confirm is not None else None
        found.setdefault((c.check, group), []).append(c)
    return [_worst(some) for some in found.values()]


def verdict(checks: Sequence[Check]) -> Verdict:
    """`does-not-fit` if a stop check fails; else `to-confirm` if one is to be confirmed; else `fits`."""
    stops = {c.verdict for c in checks if c.stop}
    for outcome in (Verdict.DOES_NOT_FIT, Verdict.TO_CONFIRM):
        if outcome in stops:
            return outcome
    return Verdict.FITS


def to_confirm(checks: Sequence[Check]) -> list[Confirm]:
    """Values that would settle the option, in the order of the checks."""
    return [c.confirm for c in checks if c.stop and c.confirm is not None]
