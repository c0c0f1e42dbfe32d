"""One cell to one value: numbers as people and spreadsheets write them, yes and no, lists of field names.

A number that can be read in two ways is refused and not guessed.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from datetime import date
from typing import Any

from catalog.errors import CatalogError
from catalog.records import FieldSpec

#: What people write where a datasheet gives no value.
BLANKS = frozenset({"", "-", "--", "\u2013", "\u2014", "?", "n/a", "na", "n.a.", "not stated", "unknown"})

_YES, _NO = frozenset({"yes", "y", "true", "1"}), frozenset({"no", "n", "false", "0"})
_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?", re.IGNORECASE)
_BEGINS_WITH_NUMBER = re.compile(r"([+-]?\d+(?:[.,]\d+)?)\s*(\D.*)")
_DECIMAL_COMMA = re.compile(r"[+-]?\d+,\d+")
# Three digits after the sign: it may part thousands as well. "0,125" and "0.125" cannot.
_MAYBE_THOUSANDS = re.compile(r"[+-]?[1-9]\d{0,2}[.,]\d{3}")
_UNITS = {
    "%/k": {"%/k", "%/\u00b0c", "%/degc", "%/c"},
    "degc": {"degc", "\u00b0c", "c"},
    "ohm": {"ohm", "\u03a9"},
}


@dataclass(slots=True)
class DecimalSigns:
    """Which decimal signs the cells of one file have shown so far.

    ``comma`` is the place of a decimal comma; ``point`` that of a number such as 1.500, which in a file with
    decimal commas may be 1500 as well.
    """

    comma: str | None = None
    point: str | None = None

    def check(self) -> None:
        """Refuse a file in which a number can be read in two ways.

        Raises
        ------
        CatalogError
        """
        if self.comma and self.point:
            raise CatalogError(
                f"{self.point} may be thousands, as there are decimal commas ({self.comma}); use decimal"
                " points throughout"
            )


def value_of(cell: Any, spec: FieldSpec, signs: DecimalSigns, place: str = "") -> Any:
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
        if isinstance(cell, str):
            if not cell.isprintable():
                raise CatalogError(
                    f"{cell!r} holds a line break or another character that cannot be printed; take it out"
                )
            return cell
        if isinstance(cell, (int, date)) and not isinstance(cell, bool):
            return str(cell)
        raise CatalogError(f"{cell!r} is no text; put it in quotes")
    number = _number(cell, spec, signs, place)
    if spec.type is int:
        if number != int(number):
            raise CatalogError(f"{cell!r} is no whole number")
        return int(number)
    return number


def _flag(cell: Any) -> bool:
    word = str(cell).casefold()
    if word in _YES:
        return True
    if word in _NO:
        return False
    raise CatalogError(f"{cell!r} is neither yes nor no; write yes or no")


def _number(cell: Any, spec: FieldSpec, signs: DecimalSigns, place: str) -> float:
    if isinstance(cell, (int, float)) and not isinstance(cell, bool):
        return _finite(float(cell) if abs(cell) < 1e300 else math.inf, cell)
    if not isinstance(cell, str):
        raise CatalogError(f"{cell!r} is no number{_in(spec)}; write one or leave it out")
    text = cell.replace("\u2212", "-")
    if not _NUMBER.fullmatch(text):
        text = _without_unit(text, spec)
    if _NUMBER.fullmatch(text):
        if _MAYBE_THOUSANDS.fullmatch(text):
            signs.point = signs.point or f"{place}: {cell!r}"
        return _finite(float(text), cell)
    if _DECIMAL_COMMA.fullmatch(text):
        if _MAYBE_THOUSANDS.fullmatch(text):
            plain, decimal = text.replace(",", ""), f"{float(text.replace(',', '.')):g}"
            raise CatalogError(f"{cell!r} may be {decimal} or {plain}; write one of them, without a comma")
        signs.comma = signs.comma or f"{place}: {cell!r}"
        return float(text.replace(",", "."))
    raise CatalogError(_no_number(cell, text, spec))


def _finite(value: float, cell: Any) -> float:
    if value != value or abs(value) == float("inf"):
        raise CatalogError(f"{cell!r} is no number; write one or leave it blank")
    return value


def _without_unit(text: str, spec: FieldSpec) -> str:
    unit = spec.unit.casefold()
    for own in _UNITS.get(unit, {unit}) - {"", "1"}:
        if text.casefold().endswith(own):
            rest = text[: len(text) - len(own)].rstrip()
            if rest[-1:].isdigit() or rest[-1:] == ".":
                return rest
    return text


def _no_number(cell: str, text: str, spec: FieldSpec) -> str:
    """What is wrong with a cell that is no number, and how to mend it."""
    apart = text.replace(" ", "").replace("'", "").replace(",", "")
    if _NUMBER.fullmatch(apart):
        return f"{cell!r} has marks between its digits; write {apart}"
    other = _BEGINS_WITH_NUMBER.fullmatch(text)
    if other and spec.unit and other[2].strip() in (f"k{spec.unit}", f"m{spec.unit}", f"M{spec.unit}"):
        factor = {"k": 1e3, "m": 1e-3, "M": 1e6}[other[2].strip()[0]]
        amount = float(other[1].replace(",", ".")) * factor
        return f"{cell!r} is in {other[2].strip()}; write it in {spec.unit} ({amount:.10g})"
    return (
        f"{cell!r} is no number{_in(spec)}; write the number alone, or leave it blank where it is not known"
    )


def _in(spec: FieldSpec) -> str:
    return f" in {spec.unit}" if spec.unit not in ("", "1") else ""
