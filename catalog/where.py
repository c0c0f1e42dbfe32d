"""Conditions on the values of records, as people type them: ``ac_power_w >= 5 kW and phases == 1``.

A condition is read by a parser of its own, never evaluated as code, and becomes a condition of SQL whose values are
parameters. A value that is not known meets no comparison; ``unknown`` asks for it: ``max_dc_voltage_v == unknown``.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any, NamedTuple

from catalog.errors import CatalogError
from catalog.near import nearest
from catalog.records import FieldSpec, Inputs, Inverter, Module, specs
from catalog.units import converted, fits, relative, unit_of

KINDS: dict[str, type] = {"module": Module, "inverter": Inverter}
EXAMPLE = "ac_power_w >= 5000 and phases == 1"

#: Trackers of all groups of inputs together.
_TRACKERS = FieldSpec("trackers", int, "", "trackers in all", True)
_TRACKERS_SQL = (
    '(SELECT SUM(i."trackers") FROM inputs i WHERE i."record_id" = r."id" AND i."revision" = v."revision")'
)

#: What each group of inputs has; whether it is known can be asked for. ``inputs`` are the trackers as a whole.
_OF_GROUPS = ("inputs", *(name for name in specs(Inputs) if name != "trackers"))
_ASSUMED_SQL = """(v."origins" LIKE '%"inputs":"assumed"%')"""
_BLANK_SQL = (
    '(EXISTS (SELECT 1 FROM inputs i WHERE i."record_id" = r."id" AND i."revision" = v."revision"'
    ' AND i."{name}" IS NULL))'
)

#: Fields that are named where someone asks for none that there is.
_OFTEN = ("maker", "model", "technology", "pmax_w", "voc_v", "isc_a", "ac_power_w", "max_dc_voltage_v", "phases", "trackers")

_COMPARISONS = {
    "==": "=",
    "=": "=",
    "!=": "<>",
    "<>": "<>",
    "<": "<",
    "<=": "<=",
    ">": ">",
    ">=": ">=",
    "~": "~",
}
_TURNED = {"=": "=", "<>": "<>", "<": ">", "<=": ">=", ">": "<", ">=": "<="}
_TOKEN = re.compile(
    r"""\s*(?:(?P<number>[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)(?:\s*(?P<unit>%/\S+|%|[A-Za-z\u00b0]+(?:/[A-Za-z\u00b0]+)?))?
    |(?P<text>"[^"]*"|'[^']*')
    |(?P<mark>==|!=|<>|<=|>=|=|<|>|~|\(|\))
    |(?P<word>[A-Za-z_]\w*))""",
    re.VERBOSE,
)
_WORDS = frozenset({"and", "or", "not"})
_FLAGS = {"yes": True, "true": True, "no": False, "false": False}
_MOST_TOKENS = 200
_DEEPEST = 30


class Token(NamedTuple):
    """A part of a condition: its sort, its text or value, where it begins, and the unit of a number."""

    sort: str
    value: Any
    at: int
    unit: str = ""


@dataclass(frozen=True, slots=True)
class Condition:
    """A condition as SQL on ``r`` (record) and ``v`` (its revision that counts), with its parameters."""

    sql: str
    params: dict[str, Any] = field(default_factory=dict)


def condition(text: str, kind: str) -> Condition:
    """The condition that a text means for a kind of record.

    Parameters
    ----------
    text : str
        Comparisons (``==`` ``!=`` ``<`` ``<=`` ``>`` ``>=``, and ``~`` for "holds the text") of fields with numbers,
        texts, yes, no or unknown, joined by ``and``, ``or``, ``not`` and brackets. A number may carry a unit.
    kind : {"module", "inverter"}

    Raises
    ------
    CatalogError
        Showing where the text is not understood.
    """
    return _Parser(text, kind).whole()


def kinds_of(text: str, kinds: Sequence[str]) -> tuple[str, ...]:
    """Of some kinds, those that have all fields of a condition.

    Raises
    ------
    CatalogError
        Where there is none; fields with near names are told.
    """
    used = [
        t.value
        for t in _tokens(text)
        if t.sort == "word" and t.value.casefold() not in (*_WORDS, *_FLAGS, "unknown")
    ]
    names = {kind: {*_known(kind), *(_OF_GROUPS if kind == "inverter" else ())} for kind in kinds}
    left = tuple(kind for kind in kinds if all(name in names[kind] for name in used))
    if left:
        return left
    everything = dict.fromkeys(name for kind in kinds for name in (*_known(kind), *sorted(names[kind])))
    for name in used:
        if name not in everything:
            _unknown_field(name, list(everything))
    raise CatalogError(f"--where: no kind of record has all of {', '.join(dict.fromkeys(used))}")


def _known(kind: str) -> dict[str, FieldSpec]:
    return {**specs(KINDS[kind]), **({"trackers": _TRACKERS} if kind == "inverter" else {})}


def _unknown_field(name: str, known: list[str]) -> None:
    hint = nearest(name, known)
    if not hint.startswith("; near"):
        some = [n for n in _OFTEN if n in known]
        hint = f"; there is {', '.join(some)} and what else 'ferrule sheet show' lists"
    raise CatalogError(f"--where: there is no field {name!r}{hint} (texts stand in quotes)")


def _tokens(text: str) -> list[Token]:
    found = []
    at = 0
    while text[at:].strip():
        match = _TOKEN.match(text, at)
        if not match:
            raise CatalogError(
                f'--where: {text[at:].strip()[:20]!r} is not understood; write it like "{EXAMPLE}"'
            )
        sort = match.lastgroup or ""
        if sort == "unit" or match["number"]:
            unit, end = match["unit"] or "", match.end()
            if unit and unit_of(unit) is None:
                # The next word, not a unit.
                unit, end = "", match.start("unit")
            found.append(Token("number", float(match["number"]), match.start("number"), unit))
            at = end
            continue
        found.append(Token(sort, match[sort], match.start(sort)))
        at = match.end()
        if len(found) > _MOST_TOKENS:
            raise CatalogError(f"--where: more than {_MOST_TOKENS} words and signs; ask in parts")
    return found


class _Parser:
    """Recursive descent over the tokens of one condition."""

    def __init__(self, text: str, kind: str) -> None:
        self._text = text
        self._known = _known(kind)
        self._grouped = kind == "inverter"
        self._tokens = _tokens(text)
        self._next = 0
        self._depth = 0
        self._params: dict[str, Any] = {}

    def whole(self) -> Condition:
        if not self._tokens:
            raise CatalogError(f'--where: the condition is empty; write it like "{EXAMPLE}"')
        sql = self._any()
        if self._peek():
            self._fault("'and' or 'or' is wanted", self._peek())
        return Condition(sql, self._params)

    def _any(self) -> str:
        parts = [self._all()]
        while self._word("or"):
            parts.append(self._all())
        return parts[0] if len(parts) == 1 else f"({' OR '.join(parts)})"

    def _all(self) -> str:
        parts = [self._one()]
        while self._word("and"):
            parts.append(self._one())
        return parts[0] if len(parts) == 1 else f"({' AND '.join(parts)})"

    def _one(self) -> str:
        self._depth += 1
        if self._depth > _DEEPEST:
            raise CatalogError("--where: too many brackets within brackets")
        try:
            if self._word("not"):
                return f"(NOT {self._one()})"
            token = self._peek()
            if token and token.value == "(":
                self._next += 1
                inner = self._any()
                closing = self._peek()
                if not closing or closing.value != ")":
                    self._fault("a closing bracket is wanted", closing)
                self._next += 1
                return inner
            return self._comparison()
        finally:
            self._depth -= 1

    def _comparison(self) -> str:
        left = self._operand()
        parts = []
        while (token := self._peek()) and token.sort == "mark" and token.value in _COMPARISONS:
            self._next += 1
            right = self._operand()
            parts.append(self._compared(left, _COMPARISONS[token.value], right, token))
            left = right
        if not parts:
            spec = self._known.get(left.value) if left.sort == "word" else None
            if spec is not None and spec.type is bool:
                return self._column(left)
            self._fault("a comparison is wanted, like >= 5000", self._peek() or left)
        return parts[0] if len(parts) == 1 else f"({' AND '.join(parts)})"

    def _operand(self) -> Token:
        token = self._peek()
        if (
            token is None
            or token.sort == "mark"
            or (token.sort == "word" and token.value.casefold() in _WORDS)
        ):
            self._fault("a field or a value is wanted", token)
        self._next += 1
        return token

    def _compared(self, left: Token, sign: str, right: Token, at: Token) -> str:
        for one, other in ((left, right), (right, left)):
            if self._grouped and one.sort == "word" and one.value in _OF_GROUPS:
                return self._of_groups(one, sign, other)
        if self._is_field(left) and self._is_field(right):
            one, other = self._known[left.value], self._known[right.value]
            if (one.type is str) != (other.type is str) or bool in (one.type, other.type) or sign == "~":
                self._fault("these two cannot be compared", at)
            return f"({self._column(left)} {sign} {self._column(right)})"
        if self._is_field(right) and not self._is_field(left):
            if sign not in _TURNED:
                self._fault("the field stands ahead of ~", at)
            left, sign, right = right, _TURNED[sign], left
        if not self._is_field(left):
            self._fault("one side is a field", left)
        return self._with_value(self._known[left.value], self._column(left), sign, right)

    def _of_groups(self, name: Token, sign: str, value: Token) -> str:
        """Whether something is known of the trackers."""
        asked = value.sort == "word" and value.value.casefold() == "unknown"
        if not asked or sign not in ("=", "<>"):
            self._fault(
                f"{name.value} may differ from tracker to tracker: ask for == unknown or != unknown, or for the"
                " number of trackers",
                value,
            )
        sql = _ASSUMED_SQL if name.value == "inputs" else _BLANK_SQL.format(name=name.value)
        return sql if sign == "=" else f"(NOT {sql})"

    def _with_value(self, spec: FieldSpec, column: str, sign: str, value: Token) -> str:
        word = value.value.casefold() if value.sort == "word" else ""
        if word == "unknown":
            if sign not in ("=", "<>"):
                self._fault("unknown goes with == or !=", value)
            return f"({column} IS {'NOT ' if sign == '<>' else ''}NULL)"
        if spec.type is bool:
            if word not in _FLAGS or sign not in ("=", "<>"):
                self._fault(f"{spec.name} is yes or no", value)
            return column if _FLAGS[word] == (sign == "=") else f"(NOT {column})"
        if spec.type is str:
            if value.sort != "text" or sign not in ("=", "<>", "~"):
                self._fault(f"{spec.name} is a text: compare it by ==, != or ~ with one in quotes", value)
            return self._with_text(column, sign, value.value[1:-1])
        if value.sort != "number" or sign == "~":
            self._fault(
                f"{spec.name} is a number{f' in {spec.unit}' if spec.unit not in ('', '1') else ''}", value
            )
        return f"({column} {sign} {self._param(self._number(value, spec))})"

    def _with_text(self, column: str, sign: str, text: str) -> str:
        """Case does not matter; other letters than a to z must be typed in theirs."""
        if sign == "~":
            guarded = re.sub(r"([\\%_])", r"\\\1", text.lower())
            return f"(LOWER({column}) LIKE {self._param(f'%{guarded}%')} ESCAPE '\\')"
        same = f"(LOWER({column}) = {self._param(text.lower())} OR {column} = {self._param(text)})"
        return same if sign == "=" else f"(NOT {same})"

    def _number(self, token: Token, spec: FieldSpec) -> float:
        if not token.unit:
            return token.value
        unit = unit_of(token.unit)
        if unit is None or not fits(unit, spec.unit) or relative(unit):
            self._fault(
                f"{token.unit!r} is no unit of {spec.name}"
                + (f", which is in {spec.unit}" if spec.unit else ""),
                token,
            )
        return converted(token.value, unit, spec.unit)

    def _is_field(self, token: Token) -> bool:
        if token.sort != "word" or token.value.casefold() in (*_FLAGS, "unknown"):
            return False
        if token.value not in self._known:
            _unknown_field(token.value, list(self._known))
        return True

    def _column(self, token: Token) -> str:
        if token.value == "trackers":
            return _TRACKERS_SQL
        return f'{"r" if token.value in ("maker", "model") else "v"}."{token.value}"'

    def _param(self, value: Any) -> str:
        name = f"w{len(self._params)}"
        self._params[name] = value
        return f":{name}"

    def _peek(self) -> Token | None:
        return self._tokens[self._next] if self._next < len(self._tokens) else None

    def _word(self, word: str) -> bool:
        token = self._peek()
        if token and token.sort == "word" and token.value.casefold() == word:
            self._next += 1
            return True
        return False

    def _fault(self, what: str, token: Token | None) -> None:
        place = f"at {self._text[token.at :][:20]!r}" if token else "at its end"
        raise CatalogError(f"--where {self._text!r}: {what} {place}")
