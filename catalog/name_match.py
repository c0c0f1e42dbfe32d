"""One record against one text: where its model stands there, and what of the text stays unexplained."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from catalog import namekeys, tradewords
from catalog.maker_words import Piece, is_there, left_over, named
from catalog.name_shape import Shape
from catalog.supplier_text import AC_VOLTS, SupplierText, mask

_SAID = frozenset(
    {"in stock", "ex works", "ex stock", "ab lager", "ab werk", "ac inverter", "dc disconnect", "a grade"}
)
_VOLT_UNITS = ("v", "vac", "volt", "volts")


@dataclass(frozen=True, slots=True)
class Match:
    """A record whose core stands in the text.

    ``told`` marks the places of the text that speak for the record; ``doubts`` are the pieces that neither
    the record nor the trade explains and that may tell another type; ``strangers`` other unexplained words;
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
    left = left_over(text, told)
    _, left, marks = named(left, shape.line_words, text)
    told |= marks
    maker_level, left, marks = named(left, shape.maker_words, text)
    told |= marks
    line = all(w in shape.maker_words or is_there(w, text) for w in shape.line_words)
    doubts, strangers = _unexplained(left, core, shape, text)
    return Match(
        row,
        shape,
        core,
        told,
        volts,
        in_order,
        exact,
        verbatim,
        maker_level,
        line,
        tuple(doubts),
        tuple(strangers),
    )


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
        if (
            not w.raw[3:]
            and not text.ac_volts
            and not (following and tradewords.is_in(following.raw, tradewords.UNITS))
        ):
            return mask(w.start, w.end)
    return 0


def _unexplained(
    left: list[Piece], core: int, shape: Shape, text: SupplierText
) -> tuple[list[str], list[str]]:
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
            lone = scattered and len(p.raw) == 1
            if (
                inside
                or between
                or ((beside or lone) and not p.word.remark and not _is_remark(p, after, shape, text))
            ):
                doubts.append(p.raw)
        elif any(c.isdigit() for c in p.raw) or joined or (beside and len(p.raw) <= 3) or len(p.raw) == 1:
            doubts.append(p.raw)
        else:
            strangers.append(p.raw)
    return doubts, strangers


def _apart(p: Piece, core: int, text: SupplierText) -> bool:
    """Whether white space stands between a piece and the core beside it."""
    if core >> p.end & 1:
        following = next((w for w in text.words if w.start == p.end), None)
        if following is None or not following.apart:
            return False
    if p.start and core >> (p.start - 1) & 1:
        return p.word.apart
    return True


def _is_number_remark(p: Piece, joined: bool, after: bool, shape: Shape) -> bool:
    """Whether a bare number is a quantity, a measure or the power once more, and no part of a type."""
    if p.word.remark or (p.raw in AC_VOLTS and not joined):
        return True
    if len(p.raw) >= 3 and any(p.raw in n for n in shape.numbers):
        return True
    return not joined and not after and (p.word.apart or p.word.gap in (".", ","))


def _is_unit_of_core(p: Piece, shape: Shape, text: SupplierText) -> bool:
    """Whether a piece is the unit of a number that the core ends with ("270" in "270wp")."""
    return (
        tradewords.is_in(p.raw, tradewords.UNITS)
        and p.word.apart
        and p.word.remark
        and shape.core[-1:].isdigit()
    )


def _is_remark(p: Piece, after: bool, shape: Shape, text: SupplierText) -> bool:
    """Whether a short word beside the core belongs to the next number or trade word ("24 x", "A-grade")."""
    previous, following = text.previous(p.word), text.following(p.word)
    if (
        following is not None
        and not following.apart
        and len(following.raw) > 3
        and tradewords.is_trade(following.raw)
    ):
        return p.word.apart
    if f"{p.raw} {following.raw if following else ''}" in _SAID:
        return True
    if p.raw == "x" and following is not None and following.raw.isdigit():
        return True
    if after:  # the unit of a number that the core ends with
        return p.raw == "w" and shape.core[-1:].isdigit()
    return tradewords.is_in(p.raw, tradewords.UNITS) and previous is not None and previous.raw.isdigit()
