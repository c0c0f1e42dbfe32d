"""One cell to one value: numbers as people and spreadsheets write them, with units; yes and no; phases.

A number that can be read in two ways is refused and not guessed, unless the rest of its file shows which sign
is the decimal one, or only one reading is possible for the field at all.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import date
from typing import Any

from catalog.errors import CatalogError
from catalog.records import FieldSpec
from catalog.units import BASES, coefficient_pct, converted, fits, relative, unit_of

#: What people write where a datasheet gives no value.
BLANKS = frozenset(
    {"", "-", "--", "\u2013", "\u2014", "?", "n/a", "na", "n.a.", "#n/a", "not stated", "unknown", "tbd"}
)

_YES, _NO = (
    frozenset({"yes", "y", "true", "1", "bifacial"}),
    frozenset({"no", "n", "false", "0", "monofacial"}),
)
_PHASES = {
    1: frozenset(
        {"single", "single phase", "1 phase", "one phase", "1~", "1 ph", "1ph", "1p", "split", "split phase"}
    ),
    2: frozenset({"two", "two phase", "2 phase", "2ph"}),
    3: frozenset({"three", "three phase", "3 phase", "3~", "3 ph", "3ph", "3p"}),
}
_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?", re.IGNORECASE)
_COMMA_NUMBER = re.compile(r"[+-]?(\d+,\d*|,\d+)(e[+-]?\d+)?", re.IGNORECASE)
# Three digits after the sign: it may part thousands as well. "0,125" and "0.125" cannot.
_MAYBE_THOUSANDS = re.compile(r"[+-]?[1-9]\d{0,2}[.,]\d{3}")
_GROUPED = re.compile(r"[+-]?[1-9]\d{0,2}(?:([ '\u2019.,])\d{3})(?:\1\d{3})*(?:([.,])\d+)?")
_PARTS = re.compile(r"([+-]?[\d.,](?:[\d.,]|[ '\u2019](?=\d))*(?:e[+-]?\d+)?)\s*(.*)", re.IGNORECASE)
# What a datasheet writes behind a value for its tolerance: "45 \u00b1 2", "45 (+/-2)".
_TOLERANCE = re.compile(
    r"\(?\s*(?:\u00b1|\+/-|\+-)\s*\d+(?:[.,]\d+)?\s*(?:\u00b0\s*C|K|%)?\s*\)?", re.IGNORECASE
)
_BLANK_SIGNS = str.maketrans({"\u2212": "-", "\u00a0": " ", "\u202f": " ", "\u2009": " "})


@dataclass(slots=True)
class DecimalSigns:
    """Which decimal signs the cells of one file have shown so far, and where.

    ``comma`` and ``point`` are the places of the first number that shows the sign beyond doubt; ``unclear`` that
    of a number such as 1.500 that was read as 1.5; ``thousands`` that of one with marks between thousands.
    """

    comma: str | None = None
    point: str | None = None
    unclear: str | None = None
    thousands: str | None = None

    def look(self, cells: Iterable[tuple[str, str]]) -> None:
        """Look over cells (text and place) before any of them is read."""
        for text, place in cells:
            if "," in text or "." in text:
                parts = _PARTS.match(text.translate(_BLANK_SIGNS).strip())
                if parts:
                    self._see(parts[1], f"{place}: {text!r}")
            if self.comma and self.point:
                break

    def check(self) -> None:
        """Refuse a file in which a number can be read in two ways.

        Raises
        ------
        CatalogError
        """
        if self.comma and self.unclear:
            raise CatalogError(
                f"{self.unclear} may be thousands, as there are decimal commas ({self.comma}); use decimal"
                " points throughout"
            )

    def _see(self, text: str, what: str) -> None:
        """Take note of the decimal sign of a number, where it is beyond doubt."""
        if _MAYBE_THOUSANDS.fullmatch(text):
            return
        grouped = _GROUPED.fullmatch(text)
        if grouped and (grouped[1] in ".," or grouped[2]):
            if grouped[1] == grouped[2]:
                return
            decimal = grouped[2] or {".": ",", ",": "."}[grouped[1]]
        elif "," in text and "." in text:
            return
        else:
            decimal = "," if "," in text else "." if "." in text else ""
        if decimal == ",":
            self.comma = self.comma or what
        elif decimal == ".":
            self.point = self.point or what


def value_of(
    cell: Any, spec: FieldSpec, signs: DecimalSigns, place: str = "", unit: str | None = None
) -> Any:
    """Value of one cell for a field; ``None`` where the cell is blank.

    Parameters
    ----------
    cell : str, int, float or bool
        As the file gives it.
    spec : FieldSpec
        The field; a number may carry its unit.
    signs : DecimalSigns
        Of the file; updated.
    place : str
        Where the cell stands, for later messages of ``signs``.
    unit : str, optional
        Unit of a number that carries none, as `catalog.units.unit_of` spells it; else it is that of the field.

    Returns
    -------
    str, int, float, bool, Coefficient or None
        A `Coefficient` where one is given per kelvin of its value, such as mV/K.

    Raises
    ------
    CatalogError
        Saying what is wrong with the cell and how to mend it.
    """
    if isinstance(cell, str):
        cell = " ".join(cell.split()) if spec.type is not str else cell.strip()
        if cell == "" or (spec.type is not str and cell.casefold() in BLANKS):
            return None
    if spec.type is bool:
        return _flag(cell)
    if spec.type is str:
        return _words(cell)
    if spec.name == "phases" and isinstance(cell, str):
        cell = _phases(cell)
    number = _number(cell, spec, signs, place, unit)
    if spec.type is int:
        if number != int(number):
            raise CatalogError(f"{cell!r} is no whole number")
        return int(number)
    return number


@dataclass(frozen=True, slots=True)
class Coefficient:
    """A temperature coefficient in the unit of its value, such as -120 mV/K."""

    value: float
    unit: str

    def percent(self, base: float) -> float:
        """In percent of the value at STC per kelvin."""
        return coefficient_pct(self.value, self.unit, base)


def _words(cell: Any) -> str:
    if isinstance(cell, str):
        if not cell.isprintable():
            raise CatalogError(
                f"{cell!r} holds a line break or another character that cannot be printed; take it out"
            )
        return cell
    if isinstance(cell, float) and cell.is_integer() and abs(cell) < 1e15:
        return str(int(cell))
    if isinstance(cell, (int, date)) and not isinstance(cell, bool):
        return str(cell)
    raise CatalogError(f"{cell!r} is no text; put it in quotes")


def _flag(cell: Any) -> bool:
    word = str(cell).casefold()
    if word in _YES:
        return True
    if word in _NO:
        return False
    raise CatalogError(f"{cell!r} is neither yes nor no; write yes or no")


def _phases(cell: str) -> Any:
    words = " ".join(cell.casefold().replace("-", " ").split()).removesuffix("s")
    return next((number for number, some in _PHASES.items() if words in some), cell)


def _number(
    cell: Any, spec: FieldSpec, signs: DecimalSigns, place: str, unit: str | None
) -> float | Coefficient:
    if isinstance(cell, (int, float)) and not isinstance(cell, bool):
        return _in_unit(_finite(float(cell) if abs(cell) < 1e300 else math.inf, cell), spec, unit)
    if not isinstance(cell, str):
        raise CatalogError(f"{cell!r} is no number{_in(spec)}; write one or leave it out")
    text = cell.translate(_BLANK_SIGNS)
    if not _NUMBER.fullmatch(text):
        parts = _PARTS.fullmatch(_TOLERANCE.sub("", text).strip())
        if not parts:
            raise CatalogError(_no_number(cell, spec))
        text = parts[1]
        if parts[2]:
            unit = unit_of(parts[2])
            if unit is None or not usable(unit, spec):
                raise CatalogError(_no_number(cell, spec, unit))
    readings = _readings(text)
    if not readings:
        raise CatalogError(_no_number(cell, spec))
    what = f"{place}: {cell!r}"
    if len(readings) == 1:
        signs._see(text, what)
        if _GROUPED.fullmatch(text):
            signs.thousands = signs.thousands or what
        ((value,),) = (readings.values(),)
        return _in_unit(_finite(value, cell), spec, unit)
    return _one_of(readings, cell, what, spec, signs, unit)


def _readings(text: str) -> dict[str, float]:
    """What a number may be, by the decimal sign that it then has."""
    if _MAYBE_THOUSANDS.fullmatch(text):
        plain = float(re.sub("[.,]", "", text))
        decimal = float(text.replace(",", "."))
        return {".": decimal, ",": plain} if "." in text else {",": decimal, ".": plain}
    if _NUMBER.fullmatch(text):
        return {".": float(text)}
    grouped = _GROUPED.fullmatch(text)
    if grouped and grouped[1] != grouped[2]:
        plain = text.replace(grouped[1], "")
        return {grouped[2] or "": float(plain.replace(",", "."))}
    if _COMMA_NUMBER.fullmatch(text):
        return {",": float(text.replace(",", "."))}
    return {}


def _one_of(
    readings: dict[str, float], cell: str, what: str, spec: FieldSpec, signs: DecimalSigns, unit: str | None
) -> float | Coefficient:
    """The reading that the file's decimal sign, or the field's possible range, leaves of two."""
    values = {sign: _in_unit(value, spec, unit) for sign, value in readings.items()}
    possible = [sign for sign, value in values.items() if _possible(value, spec)] or list(values)
    shown = [sign for sign, seen in ((",", signs.comma), (".", signs.point)) if seen]
    own = "." if "." in cell else ","
    if not shown and own == "." and own in possible:
        # Nothing speaks for thousands so far: a point is a decimal point, unless commas turn up later.
        signs.unclear = signs.unclear or what
        return values[own]
    left = [sign for sign in possible if sign in shown] if len(shown) == 1 else possible
    if len(left) != 1:
        small, large = sorted(readings.values(), key=abs)
        raise CatalogError(
            f"{cell!r} may be {small:g} or {large:.10g}; write one of them, without marks between thousands"
        )
    (sign,) = left
    if sign == own:
        signs._see(f"0{sign}5", what)
    else:
        signs.thousands = signs.thousands or what
    return values[sign]


def _possible(value: float | Coefficient, spec: FieldSpec) -> bool:
    if isinstance(value, Coefficient):
        return True
    return (spec.low is None or value >= spec.low) and (spec.high is None or value <= spec.high)


def usable(unit: str, spec: FieldSpec) -> bool:
    """Whether a number for a field may come in a unit, also a coefficient in the unit of its value."""
    if relative(unit):
        return spec.name in BASES and fits(unit, spec.unit)
    return fits(unit, spec.unit)


def _in_unit(value: float, spec: FieldSpec, unit: str | None) -> float | Coefficient:
    if unit is None or unit == spec.unit:
        return value
    if relative(unit):
        return Coefficient(value, unit)
    return _finite(converted(value, unit, spec.unit), value)


def _finite(value: float, cell: Any) -> float:
    if value != value or abs(value) == float("inf"):
        raise CatalogError(f"{cell!r} is no number; write one or leave it blank")
    return value


def _no_number(cell: str, spec: FieldSpec, unit: str | None = None) -> str:
    """What is wrong with a cell that is no number, and how to mend it."""
    if unit is not None:
        return f"{cell!r} is in {unit}, which is no {spec.unit or 'unit of it'}; write the number{_in(spec)}"
    return (
        f"{cell!r} is no number{_in(spec)}; write the number alone, or leave it blank where it is not known"
    )


def _in(spec: FieldSpec) -> str:
    return f" in {spec.unit}" if spec.unit not in ("", "1") else ""
