"""Rule sets as data: the factors, caps and methods that codes prescribe, each with its clause.

Where a clause leaves a choice, the stricter one is the default. A rule set changes nothing but numbers
and methods; the checks themselves are in `matcher.checks`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field


#: How the highest Voc is found. ``coefficient``: the datasheet's coefficient at the design low, the table only
#: where there is none. ``table``: NEC Table 690.7(A) for every crystalline module. ``hourly``: the highest
#: modelled Voc over the sunlit hours of the site's weather file, an engineer's own choice (NEC 690.7(A)(3);
#: Karin and Jain 2020, doi:10.1109/JPHOTOV.2020.2969788, both from memory).
COLD_METHODS = ("coefficient", "table", "hourly")


@dataclass(frozen=True, slots=True)
class RuleSet:
    """What one code prescribes.

    ``fuse_low`` and ``fuse_high`` bound the rating of a string fuse as a multiple of Isc at STC
    (``fuse_high`` may be ``None``). ``cold_voltage`` is one of `COLD_METHODS`; ``cold_margin_pct`` is added
    to the Voc of the method ``hourly``. ``clauses`` names the clause behind each check.
    """

    name: str
    isc_factor: float
    fuse_low: float
    fuse_high: float | None
    voltage_cap_v: float | None = None
    cold_voltage: str = "coefficient"
    cold_margin_pct: float = 0.0
    clauses: Mapping[str, str] = field(default_factory=dict)

    def clause(self, check: str) -> str:
        """Clause or practice behind a check."""
        return self.clauses.get(check, PRACTICE[check])


#: Checks that rest on the makers' ratings or on practice, whatever the code.
PRACTICE: Mapping[str, str] = {
    "max-dc-voltage": "inverter rating",
    "system-voltage": "module rating (IEC 61730)",
    "voltage-cap": "cap set for the site",
    "mppt-low": "inverter rating; common practice",
    "mppt-high": "inverter rating; common practice",
    "start": "inverter rating",
    "short-circuit": "inverter rating",
    "string-inputs": "inverter rating",
    "array-power": "inverter rating",
    "cold-tracking": "common practice",
    "input-current": "inverter rating; common practice",
    "string-fuse": "module rating",
    "tracker-power": "inverter rating; common practice",
}

IEC_62548 = RuleSet(
    name="iec-62548",
    isc_factor=1.25,
    fuse_low=1.5,
    fuse_high=2.4,
    clauses={
        "max-dc-voltage": "IEC 62548, PV array maximum voltage",
        "system-voltage": "IEC 62548, PV array maximum voltage; IEC 61730",
        "voltage-cap": "IEC 62548, PV array maximum voltage; cap set for the site",
        "short-circuit": "IEC 62548, K_I = 1.25",
        "string-fuse": "IEC 62548, string overcurrent protection; HD 60364-7-712",
    },
)

NEC_690 = RuleSet(
    name="nec-690",
    isc_factor=1.25,
    fuse_low=1.25 * 1.25,
    fuse_high=None,
    clauses={
        "max-dc-voltage": "NEC 690.7(A)",
        "system-voltage": "NEC 690.7(A); listing of the module",
        "voltage-cap": "NEC 690.7",
        "short-circuit": "NEC 690.8(A)(1)",
        "string-fuse": "NEC 690.9; 690.8(B)",
    },
)

RULE_SETS: Mapping[str, RuleSet] = {r.name: r for r in (IEC_62548, NEC_690)}
DEFAULT_RULES = IEC_62548

#: NFPA 70 (NEC) Table 690.7(A): lowest temperature of each band [degC] and the factor on Voc of
#: crystalline silicon. A temperature between two bands takes the factor of the colder one.
COLD_FACTORS: tuple[tuple[float, float], ...] = (
    (25, 1.00), (20, 1.02), (15, 1.04), (10, 1.06), (5, 1.08), (0, 1.10), (-5, 1.12), (-10, 1.14),
    (-15, 1.16), (-20, 1.18), (-25, 1.20), (-30, 1.21), (-35, 1.23), (-40, 1.25),
)  # fmt: skip


def cold_factor(lowest_c: float) -> float | None:
    """Factor on Voc at the lowest ambient temperature [degC]; ``None`` below the table.

    References
    ----------
    NFPA 70 (NEC), Table 690.7(A), voltage correction factors for crystalline silicon modules.
    """
    for edge, factor in COLD_FACTORS:
        if lowest_c >= edge:
            return factor
    return None


def coldest_for_factor(limit: float) -> float | None:
    """Coldest ambient temperature [degC] whose factor does not exceed ``limit``; ``None`` if none does."""
    allowed = [edge for edge, factor in COLD_FACTORS if factor <= limit]
    return min(allowed, default=None)
