"""What the heading of a column means: the field, the unit, and how sure that is.

The words that people use stand in ``headings.toml``. A heading is *sure* if its words, apart from units, idle words
and short forms, are known ones of one field; it is *likely* if they are words that mostly mean the field, or are near
to known ones. A heading that names other conditions than STC is never taken for a value at STC.
"""

from __future__ import annotations

import re
import tomllib
import unicodedata
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from importlib import resources

from catalog.records import FieldSpec, Inputs, Inverter, Module, specs
from catalog.units import BASES, fits, relative, unit_of

#: Columns that are no field by themselves: an MPPT window in one cell, length x width x depth in one cell.
COMPOSED = ("mppt_range", "dimensions")
#: Columns about the trackers, which make up ``inputs``.
OF_INPUTS = tuple(specs(Inputs))

_NEAR = 86.0
_ENOUGH_LETTERS = 4


@dataclass(frozen=True, slots=True)
class Meaning:
    """What a heading means: a field, or ``None``; the unit it names; whether that is beyond doubt; a remark."""

    field: str | None
    unit: str | None = None
    sure: bool = False
    remark: str = ""


@dataclass(frozen=True, slots=True)
class _Words:
    short: Mapping[str, str]
    idle: frozenset[str]
    other: frozenset[str]
    known: Mapping[str, Mapping[frozenset[str], str]]
    likely: Mapping[str, Mapping[frozenset[str], str]]


def meaning(heading: str, kind: str) -> Meaning:
    """What a heading of a table of modules or inverters means.

    Parameters
    ----------
    heading : str
        As it stands in the table, such as "Temp. coeff. of Pmax [%/\u00b0C]".
    kind : {"module", "inverter"}
        What the rows of the table are.
    """
    words = _words()
    text, unit = parted(heading)
    tokens = _tokens(text, words)
    if not tokens:
        return Meaning(None, unit)
    found = words.known[kind].get(tokens)
    if found is None and not unit:
        # "Voc V": a unit that only a blank parts from the name.
        *head, last = text.split()
        if head and unit_of(last) and (shorter := words.known[kind].get(_tokens(" ".join(head), words))):
            found, unit = shorter, unit_of(last)
    if found is None:
        found = _twice(tokens, words.known[kind])
    if found:
        return _judged(found, unit, True, "")
    found = words.likely[kind].get(tokens)
    if found:
        # Only a module's power at STC is in watts peak.
        peak = found == "pmax_w" and re.search(r"\bk?wp\b", heading.casefold()) is not None
        return _judged(found, unit, peak, "" if peak else "may mean something else")
    if tokens & words.other:
        return Meaning(None, unit, False, "names other conditions")
    return _near(tokens, unit, kind, words)


def parted(heading: str) -> tuple[str, str | None]:
    """Heading without its unit, and the unit: in brackets, or behind a comma, a slash or "in"."""
    text = " ".join(heading.replace("\u2103", "\u00b0C").split())
    for bracketed in re.finditer(r"[\[(\u3010]([^\[\]()]*)[\])\u3011]", text):
        unit = unit_of(bracketed[1])
        if unit:
            return f"{text[: bracketed.start()]} {text[bracketed.end() :]}".strip(), unit
    match = re.fullmatch(r"(.*\S)\s+(%\s*/\s*\S+|m?[VAW]\s*/\s*\S+|%)", text)
    if match and unit_of(match[2]):
        return match[1], unit_of(match[2])
    # A unit may hold the mark itself (%/K), so the longest tail that is a unit counts.
    for mark in re.finditer(r"\s*(?:,|/|_|\s-\s|\sin\s)\s*", text):
        unit = unit_of(text[mark.end() :])
        if unit and mark.start():
            return text[: mark.start()], unit
    return text, None


@cache
def _words() -> _Words:
    data = tomllib.loads(resources.files("catalog").joinpath("headings.toml").read_text(encoding="utf-8"))
    short = {_plain(s): word for word, some in data["words"].items() for s in some}
    idle, other = frozenset(data["idle"]["words"]), frozenset(data["other"]["words"])
    words = _Words(short, idle, other, {}, {})
    known, likely = {}, {}
    for kind, type_ in (("module", Module), ("inverter", Inverter)):
        tables = {**data["both"]}
        for name, some in data[kind].items():
            tables[name] = [*tables.get(name, ()), *some]
        own = {name: [name] for name in specs(type_)}
        known[kind] = _keys(tables, words) | _keys(own, words)
        fields = {*specs(type_), *COMPOSED, *(OF_INPUTS if kind == "inverter" else ())}
        likely[kind] = _keys({n: s for n, s in data["likely"].items() if n in fields}, words)
    return _Words(short, idle, other, known, likely)


def _keys(table: Mapping[str, Sequence[str]], words: _Words) -> dict[frozenset[str], str]:
    return {_tokens(text, words): name for name, some in table.items() for text in some}


def _plain(text: str) -> str:
    text = text.replace("\u03b1", " alpha ").replace("\u03b2", " beta ").replace("\u03b3", " gamma ")
    folded = unicodedata.normalize("NFKD", text.casefold())
    return "".join(c for c in folded if not unicodedata.combining(c))


def _tokens(text: str, words: _Words) -> frozenset[str]:
    """The words of a heading without short forms, idle words and order."""
    found = []
    for word in re.findall(r"[a-z]+(?:-[a-z]+)*|\d+|#|~", _plain(text)):
        parts = [word] if word in words.short else word.split("-")
        found += [words.short.get(part, part) for part in parts]
    kept = frozenset(found) - words.idle
    return kept or frozenset(found)


def _twice(tokens: frozenset[str], known: Mapping[frozenset[str], str]) -> str | None:
    """A field that is named twice over ("Open circuit voltage Voc"), and nothing else."""
    inside = [(key, name) for key, name in known.items() if key < tokens]
    for key, name in inside:
        if any(other == name and key | rest == tokens for rest, other in inside):
            return name
    return None


def _near(tokens: frozenset[str], unit: str | None, kind: str, words: _Words) -> Meaning:
    """A heading with typing errors, or with words beside those that are known."""
    from rapidfuzz import fuzz, process

    text = " ".join(sorted(tokens))
    by_text = {" ".join(sorted(key)): name for key, name in words.known[kind].items()}
    if len(text) >= _ENOUGH_LETTERS:
        near = process.extractOne(text, list(by_text), scorer=fuzz.ratio, score_cutoff=_NEAR)
        if near:
            return _judged(by_text[near[0]], unit, False, "is near to known words")
    inside = [
        (len(key), name) for key, name in words.known[kind].items() if key < tokens and len("".join(key)) > 2
    ]
    if inside:
        most = max(inside)[0]
        names = {name for size, name in inside if size == most}
        if len(names) == 1:
            return _judged(names.pop(), unit, False, "has words that are not known")
    return Meaning(None, unit)


def _judged(name: str, unit: str | None, sure: bool, remark: str) -> Meaning:
    """A meaning whose unit goes with the field; without a unit where one is needed, it is not sure."""
    spec = spec_of(name)
    if unit is not None and spec is not None and not _goes(unit, spec):
        return Meaning(None, unit, False, f"would be {name}, but is in {unit}")
    if unit is None and name in BASES:
        return Meaning(name, None, False, "names no unit: taken as %/K")
    if unit is None and name in ("ac_power_w", "max_array_power_w", "max_power_w"):
        return Meaning(name, None, False, "names no unit: taken as W")
    return Meaning(name, unit, sure, remark)


def _goes(unit: str, spec: FieldSpec) -> bool:
    if spec.type is not float or (relative(unit) and spec.name not in BASES):
        return unit == "1" or spec.type is int
    return fits(unit, spec.unit)


@cache
def spec_of(name: str) -> FieldSpec | None:
    """Specification of the field that a column gives; of a composed column, that of its parts."""
    name = {"mppt_range": "mppt_low_v", "dimensions": "length_m"}.get(name, name)
    for type_ in (Module, Inverter, Inputs):
        if name in specs(type_):
            return specs(type_)[name]
    return None
