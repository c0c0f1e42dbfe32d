"""Units as datasheets, spreadsheets and open data write them, and what one is in the unit of a field.

Factors are powers of ten or exact by definition (inch 0.0254 m, foot 0.3048 m: the international yard and
pound agreement of 1959), and are applied to the digits as they are written: 1722 mm is 1.722 m to the last bit.
"""

from __future__ import annotations

import re
from decimal import Decimal

#: Per unit of a field: other units of the same quantity, and what one of them is in it.
_FACTORS: dict[str, dict[str, str]] = {
    "V": {"V": "1", "mV": "1e-3", "kV": "1e3"},
    "A": {"A": "1", "mA": "1e-3", "kA": "1e3"},
    "W": {"W": "1", "mW": "1e-3", "kW": "1e3", "MW": "1e6"},
    "m": {"m": "1", "mm": "1e-3", "cm": "1e-2", "dm": "1e-1", "in": "0.0254", "ft": "0.3048"},
    "ohm": {"ohm": "1", "mohm": "1e-3", "kohm": "1e3"},
    "%": {"%": "1", "fraction": "1e2"},
    "1": {"1": "1", "fraction": "1", "%": "1e-2"},
    "%/K": {"%/K": "1", "1/K": "1e2", "ppm/K": "1e-4", "%": "1"},
    "1/W": {"1/W": "1", "1/kW": "1e-3"},
    "1/V": {"1/V": "1"},
    "degC": {"degC": "1"},
}

#: Coefficients per kelvin in the unit of the value itself, with the unit of that value.
_ABSOLUTE = {
    "V/K": ("V", "1"), "mV/K": ("V", "1e-3"),
    "A/K": ("A", "1"), "mA/K": ("A", "1e-3"),
    "W/K": ("W", "1"), "mW/K": ("W", "1e-3"),
}  # fmt: skip

#: The value at STC that a temperature coefficient belongs to.
BASES = {"voc_coef_pct": "voc_v", "isc_coef_pct": "isc_a", "pmax_coef_pct": "pmax_w", "vmp_coef_pct": "vmp_v"}

_KNOWN = frozenset(
    {name for table in _FACTORS.values() for name in table}
    | set(_ABSOLUTE)
    | {"K", "degF", "VA", "kVA", "MVA"}
)
_SPELLINGS = {
    "volt": "V", "volts": "V", "vdc": "V", "vac": "V", "v dc": "V", "v ac": "V", "kvdc": "kV",
    "ampere": "A", "amperes": "A", "amp": "A", "amps": "A", "adc": "A", "a dc": "A", "aac": "A",
    "watt": "W", "watts": "W", "wp": "W", "wac": "W", "wdc": "W", "kwp": "kW", "kwac": "kW", "kwdc": "kW",
    "metre": "m", "meter": "m", "metres": "m", "meters": "m", "inch": "in", "inches": "in", "feet": "ft", "foot": "ft",
    "millimetre": "mm", "millimeter": "mm", "millimetres": "mm", "millimeters": "mm",
    "percent": "%", "pct": "%", "\u03c9": "ohm", "\u2126": "ohm", "ohms": "ohm", "m\u03c9": "mohm",
    "c": "degC", "\u00b0c": "degC", "degc": "degC", "deg c": "degC", "celsius": "degC", "cel": "degC",
    "\u00b0f": "degF", "degf": "degF", "f": "degF",
}  # fmt: skip
_KELVIN = re.compile(r"(?:\u00b0\s*|deg\.?\s*|\u00ba\s*)?(?:c|k|cel|celsius|kelvin)", re.IGNORECASE)


def unit_of(text: str) -> str | None:
    """The unit that a text means, in one spelling; ``None`` if it is none.

    >>> unit_of("%/\u00b0C"), unit_of("mV / K"), unit_of("kWp"), unit_of("Vdc"), unit_of("STC")
    ('%/K', 'mV/K', 'kW', 'V', None)
    """
    text = " ".join(text.replace("\u2103", "\u00b0C").replace("\u00ba", "\u00b0").split()).strip(". ")
    if text in _KNOWN and text not in ("K", "1"):
        return text
    upper, mark, lower = text.partition("/")
    if mark:
        over = unit_of(upper) or {"1": "1", "ppm": "ppm", "pu": "1"}.get(upper.strip())
        under = "K" if _KELVIN.fullmatch(lower.strip()) else unit_of(lower)
        found = f"{over}/{under}" if over and under else None
        return found if found in _KNOWN else None
    return _SPELLINGS.get(text.casefold()) or _by_case(text)


def _by_case(text: str) -> str | None:
    """A unit in another case, where that names one unit only: KW is kW, but MW and mW are two."""
    alike = [name for name in _KNOWN if name.casefold() == text.casefold() and len(name) > 1]
    return alike[0] if len(alike) == 1 else None


def fits(unit: str, wanted: str) -> bool:
    """Whether a value in a unit can be had in the wanted one."""
    return (
        unit in _FACTORS.get(wanted, ())
        or (wanted == "%/K" and unit in _ABSOLUTE)
        or (wanted == "degC" and unit in ("K", "degF"))
    )


def relative(unit: str) -> str | None:
    """For a coefficient such as mV/K: the unit of the value it belongs to, here V; ``None`` for any other unit."""
    return _ABSOLUTE[unit][0] if unit in _ABSOLUTE else None


def converted(value: float, unit: str, wanted: str) -> float:
    """A value in the wanted unit.

    Parameters
    ----------
    value : float
        In ``unit``.
    unit, wanted : str
        As `unit_of` spells them; `fits` tells whether they go together, and ``unit`` is none per kelvin of a value.
    """
    if wanted == "degC" and unit != "degC":
        number = Decimal(repr(value))
        kelvin = number if unit == "K" else (number + Decimal("459.67")) / Decimal("1.8")
        return float(kelvin - Decimal("273.15"))
    return _times(value, _FACTORS[wanted][unit])


def coefficient_pct(value: float, unit: str, base: float) -> float:
    """A coefficient such as mV/K in percent of the value at STC per kelvin [%/K]; ``base`` is that value."""
    return round(_times(value, _ABSOLUTE[unit][1]) / base * 100.0, 6)


def _times(value: float, factor: str) -> float:
    return value if factor == "1" else float(Decimal(repr(value)) * Decimal(factor))
