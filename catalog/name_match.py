"""One record against one supplier's text: where its model stands there, and what of the text stays unexplained."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

from catalog import namekeys, tradewords
from catalog.supplier_text import AC_VOLTS, SupplierText, Word, mask

_VOLTS = re.compile(r"\s*[\[(]\s*(\d{3})\s*v(?:ac)?\s*[\])]\s*$")

_SAID = frozenset({"in stock", "ex works", "ex stock", "ab lager", "ab werk", "ac inverter", "dc disconnect", "a grade"})
_VOLT_UNITS = ("v", "vac", "volt", "volts")


class Shape:
    """The name of a record, taken apart for comparison.

    The core of a model is what must stand in a text that means it: all of the model but the AC voltage
    in brackets at its end, and the words without digits at its beginning (product lines, and
    what a table counts to the model though it belongs to the maker).
    """

    def __init__(self, maker: str, model: str) -> None:
        volts = _VOLTS.search(model)
        self.volts = volts.group(1) if volts else None
        self.maker_words = [namekeys.folded(w) for w in re.findall(r"[^\W_]+", maker)]
        self.verbatim, lines = core_of(model[: volts.start()] if volts else model, self.maker_words)
        self.line_words = [namekeys.folded(w) for w in lines]
        self.plain = namekeys.compact(self.verbatim)
        self.core = namekeys.folded(self.plain)

    @cached_property
    def chunks(self) -> list[str]:
        """Pieces of the core between separators, decimal numbers whole, longest first."""
        pieces = re.findall(r"[^\W_]+(?:(?<=\d)\.(?=\d)[^\W_]+)*", self.verbatim)
        return sorted((p.replace(".", "") for p in pieces), key=len, reverse=True)

    @cached_property
    def numbers(self) -> list[str]:
        """Numbers in the core, decimal points kept."""
        return re.findall(r"\d+(?:\.\d+)?", self.verbatim)


def core_of(model: str, maker_words: Sequence[str] = ()) -> tuple[str, list[str]]:
    """Split a squeezed model into its core and the words without digits before it."""
    lines: list[str] = []
    rest = model
    while True:
        first = re.match(r"[^\w]*([^\W\d_]+)(?:[^\w]*\s[^\w]*)(?=.*\d)", rest)
        if not first or (len(first.group(1)) < 4 and namekeys.folded(first.group(1)) not in maker_words):
            return rest, lines
        lines.append(first.group(1))
        rest = rest[first.end() :]


@dataclass(frozen=True, slots=True)
class Match:
    """A record whose core stands in the text.

    ``told`` marks the places of the text that speak for the record; ``doubts`` are the pieces that neither the
    record nor the trade explains and that may tell another type; ``strangers`` other unexplained words;
    ``volts`` the AC voltage.
    """

    row: int
    shape: Shape
    core: int
    told: int
    volts: int
    in_order: bool
    exact: bool  # the core stands there letter by letter, nothing mended
    verbatim: bool  # with its separators, too
    maker: int  # 2 named, 1 abbreviated, 0 not there
    line: bool  # no word before the core is missing
    doubts: tuple[str, ...]
    strangers: tuple[str, ...]


def place(shape: Shape, text: SupplierText) -> list[tuple[int, int]] | None:
    """Places of the core's chunks in the text, in any order; ``None`` unless all are there."""
    taken = 0
    spans = []
    for chunk in shape.chunks:
        span = _find(chunk, text, taken)
        if span is None:
            return None
        spans.append(span)
        taken |= mask(*span)
    return sorted(spans)


def placed_share(shape: Shape, text: SupplierText) -> float:
    """Share of the core's characters that stand in the text, chunk by chunk; wrong digits weigh twice."""
    taken = 0
    told = total = 0.0
    for chunk in shape.chunks:
        weight = len(chunk) * (2.0 if any(c.isdigit() for c in chunk) else 1.0)
        total += weight
        span = _find(chunk, text, taken)
        if span is not None:
            told += weight
            taken |= mask(*span)
        elif namekeys.folded(chunk) in text.joined:
            told += 0.8 * weight
        else:
            runs = [r for r in namekeys.runs(chunk) if len(r) > 1 and r in text.joined_raw]
            told += 0.6 * weight * sum(map(len, runs)) / len(chunk)
    return told / total if total else 0.0


def _find(chunk: str, text: SupplierText, taken: int) -> tuple[int, int] | None:
    """First free place of a chunk: between ends of words, else where letters and digits meet.

    In chunks of one or two characters nothing is mended: a quantity of 8 is no "B".
    """
    loose = None
    wanted, there = (chunk, text.joined_raw) if len(chunk) < 3 else (namekeys.folded(chunk), text.joined)
    at = there.find(wanted)
    while at >= 0:
        end = at + len(wanted)
        if not taken & mask(at, end):
            begins, closes = at in text.starts, end in text.ends
            if begins and closes:
                return at, end
            if len(wanted) > 1 and (begins or at in text.seams) and (closes or end in text.seams):
                loose = loose or (at, end)
        at = there.find(wanted, at + 1)
    return loose


def match(row: int, shape: Shape, spans: Sequence[tuple[int, int]], text: SupplierText) -> Match:
    """Weigh a record whose core stands at the spans."""
    core = 0
    for span in spans:
        core |= mask(*span)
    in_order = len(spans) == 1
    raw = "".join(text.joined_raw[a:b] for a, b in spans)
    exact = raw == shape.plain.replace("+", "") and (in_order or len(raw) == len(shape.plain))
    verbatim = in_order and shape.verbatim.strip() in text.squeezed
    volts = _volts(shape, text, core)
    told = core | volts
    left = _left_over(text, told)
    _, left, marks = _named(left, shape.line_words, text)
    told |= marks
    maker_level, left, marks = _named(left, shape.maker_words, text)
    told |= marks
    line = all(w in shape.maker_words or _is_there(w, text) for w in shape.line_words)
    doubts, strangers = _unexplained(left, core, shape, text)
    return Match(
        row, shape, core, told, volts, in_order, exact, verbatim, maker_level, line, tuple(doubts), tuple(strangers)
    )


@dataclass(frozen=True, slots=True)
class _Piece:
    """A word, or what is left of it, that the core does not explain."""

    raw: str
    folded: str
    start: int
    end: int
    word: Word


def _left_over(text: SupplierText, told: int) -> list[_Piece]:
    pieces = []
    for w in text.words:
        start = w.start
        for i in range(w.start, w.end + 1):
            if i == w.end or told >> i & 1:
                if i > start:
                    pieces.append(_Piece(text.joined_raw[start:i], text.joined[start:i], start, i, w))
                start = i + 1
    return pieces


def _volts(shape: Shape, text: SupplierText, core: int) -> int:
    """Marks the record's AC voltage where the text names it outside the core."""
    if shape.volts is None:
        return 0
    for n, w in enumerate(text.words):
        if w.folded[:3] != shape.volts or core & mask(w.start, w.end):
            continue
        following = text.words[n + 1] if n + 1 < len(text.words) else None
        if w.raw[3:] in _VOLT_UNITS:
            return mask(w.start, w.end)
        if not w.raw[3:] and following is not None and following.raw in _VOLT_UNITS:
            return mask(w.start, following.end)
        if not w.raw[3:] and not text.ac_volts and not (following and tradewords.is_in(following.raw, tradewords.UNITS)):
            return mask(w.start, w.end)
    return 0


def _named(left: list[_Piece], words: list[str], text: SupplierText) -> tuple[int, list[_Piece], int]:
    """Level (2 named, 1 abbreviated, 0 absent), the pieces that stay unexplained, and marks of telling words."""
    if not words:
        return 0, left, 0
    level, marks = 0, 0
    rest: list[_Piece] = []
    runs = {"".join(words[a:b]) for a in range(len(words)) for b in range(a + 1, len(words) + 1)}
    n = 0
    while n < len(left):
        for count in (4, 3, 2):  # words that the text splits or joins
            group = left[n : n + count]
            joined = "".join(p.folded for p in group)
            if len(group) == count and len(joined) > 3 and joined in runs:
                break
        else:
            count = 1
            group = left[n : n + 1]
            joined = group[0].folded
        how, common = (2, False) if joined in runs else _likeness(group[0].raw, joined, words)
        if joined not in runs and not _may_be_short(group[0], how, text):
            how = 0
        common = common or all(p.folded in tradewords.COMMON for p in group)
        if not how:
            rest.extend(group)
        elif not all(p.folded in tradewords.HOLLOW for p in group):
            level = level if common else max(level, how)
            if how == 2:
                for p in group:
                    marks |= mask(p.start, p.end)
        n += count
    return level, rest, marks


def _likeness(raw: str, piece: str, words: list[str]) -> tuple[int, bool]:
    """How a piece stands for one of the words, and whether only for one that many makers share.

    2: cut short, or with a slip; 1: cut very short, as initials, or thinned out; 0: not at all.
    """
    if any(c.isdigit() for c in raw) and len(raw) < 5:
        return 0, False
    telling = [w for w in words if w not in tradewords.COMMON]
    for some, common in ((telling, False), (words, True)):
        if len(piece) >= 4 and any(w.startswith(piece) for w in some):
            return 2, common
        if len(piece) >= 5 and any(abs(len(w) - len(piece)) <= 2 and _slips(piece, w) for w in some):
            return 2, common
        if len(piece) >= 2 and any(w.startswith(piece) for w in some):
            return 1, common
    initials = "".join(w[0] for w in words)
    if len(piece) >= 2 and (initials.startswith(piece) or "".join(w[0] for w in telling).startswith(piece)):
        return 1, False
    if len(piece) >= 3 and any(w[0] == piece[0] and _thinned(piece, w) for w in (*telling, "".join(words))):
        return 1, False
    return 0, False


def _may_be_short(p: _Piece, how: int, text: SupplierText) -> bool:
    """Whether a piece can be a maker's name cut short: a whole word, and if very short then one that stands alone.

    What the core leaves of a word is no abbreviation ("Lumo" of "Lumos ST215" read as "SST215"), and "HSE-" before a
    number is rather a part of a model than initials.
    """
    if p.start > p.word.start or p.end < p.word.end:
        return False
    following = text.following(p.word)
    alone = p.word.apart and (following is None or following.apart)
    return how == 2 or (alone and not tradewords.is_in(p.raw, tradewords.CODES))


def _is_there(word: str, text: SupplierText) -> bool:
    return word in text.joined or any(_likeness(w.raw, w.folded, [word])[0] == 2 for w in text.words)


def _slips(piece: str, word: str) -> bool:
    from rapidfuzz.distance import OSA

    allowed = 2 if len(word) >= 9 else 1
    return OSA.distance(piece, word, score_cutoff=allowed) <= allowed


def _thinned(piece: str, word: str) -> bool:
    """Whether the piece is the word with letters left out."""
    letters = iter(word)
    return all(c in letters for c in piece)


def _unexplained(left: list[_Piece], core: int, shape: Shape, text: SupplierText) -> tuple[list[str], list[str]]:
    """Pieces that may tell another type, and other words that nothing explains."""
    doubts: list[str] = []
    strangers: list[str] = []
    last = core.bit_length()
    first = (core & -core).bit_length() - 1
    scattered = core != mask(first, last)
    for p in left:
        inside = p.start > p.word.start or p.end < p.word.end  # the core takes a part of the same word
        after = bool(p.start and core >> (p.start - 1) & 1)
        beside = after or bool(core >> p.end & 1)
        joined = inside or (beside and not _apart(p, core, text))
        between = scattered and first < p.start < last
        if p.raw.isdigit():
            if not _is_number_remark(p, joined or between, after, shape) or (scattered and not p.word.remark):
                doubts.append(p.raw)
        elif (tradewords.is_measure(p.raw) and not between) or (inside and _is_unit_of_core(p, shape, text)):
            continue
        elif tradewords.is_trade(p.raw):
            if joined or between:
                doubts.append(p.raw)
        elif tradewords.is_in(p.raw, tradewords.CODES):
            if inside or between or (beside and not _is_remark(p, after, shape, text)):
                doubts.append(p.raw)
        elif any(c.isdigit() for c in p.raw) or joined or (beside and len(p.raw) <= 3) or len(p.raw) == 1:
            doubts.append(p.raw)
        else:
            strangers.append(p.raw)
    return doubts, strangers


def _apart(p: _Piece, core: int, text: SupplierText) -> bool:
    """Whether white space stands between a piece and the core beside it."""
    if core >> p.end & 1:
        following = next((w for w in text.words if w.start == p.end), None)
        if following is None or not following.apart:
            return False
    if p.start and core >> (p.start - 1) & 1:
        return p.word.apart
    return True


def _is_number_remark(p: _Piece, joined: bool, after: bool, shape: Shape) -> bool:
    """Whether a bare number is a quantity, a measure or the power once more, and no part of a type."""
    if p.word.remark or (p.raw in AC_VOLTS and not joined):
        return True
    if len(p.raw) >= 3 and any(p.raw in n for n in shape.numbers):
        return True
    return not joined and not after and (p.word.apart or p.word.gap in (".", ","))


def _is_unit_of_core(p: _Piece, shape: Shape, text: SupplierText) -> bool:
    """Whether a piece is the unit of a number that the core ends with ("270" in "270wp")."""
    return tradewords.is_in(p.raw, tradewords.UNITS) and p.word.apart and p.word.remark and shape.core[-1:].isdigit()


def _is_remark(p: _Piece, after: bool, shape: Shape, text: SupplierText) -> bool:
    """Whether a short word beside the core belongs to a number or a trade word next to it ("24 x", "A-grade")."""
    previous, following = text.previous(p.word), text.following(p.word)
    if following is not None and not following.apart and len(following.raw) > 3 and tradewords.is_trade(following.raw):
        return p.word.apart
    if f"{p.raw} {following.raw if following else ''}" in _SAID:
        return True
    if p.raw == "x" and following is not None and following.raw.isdigit():
        return True
    if after:  # the unit of a number that the core ends with
        return p.raw == "w" and shape.core[-1:].isdigit()
    return tradewords.is_in(p.raw, tradewords.UNITS) and previous is not None and previous.raw.isdigit()
