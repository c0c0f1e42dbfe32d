"""What the core of a model leaves of a text, held against the words of a maker's name.

Suppliers write makers in full, cut short ("Alderf."), as initials, thinned out ("Aldrfll"), joined, split,
with typing errors, or not at all.
"""

from __future__ import annotations

from dataclasses import dataclass

from catalog import tradewords
from catalog.supplier_text import SupplierText, Word, mask


@dataclass(frozen=True, slots=True)
class Piece:
    """A word, or what is left of it, that the core does not explain."""

    raw: str
    folded: str
    start: int
    end: int
    word: Word


def left_over(text: SupplierText, told: int) -> list[Piece]:
    pieces = []
    for w in text.words:
        start = w.start
        for i in range(w.start, w.end + 1):
            if i == w.end or told >> i & 1:
                if i > start:
                    pieces.append(Piece(text.joined_raw[start:i], text.joined[start:i], start, i, w))
                start = i + 1
    return pieces


def named(left: list[Piece], words: list[str], text: SupplierText) -> tuple[int, list[Piece], int]:
    """Level (2 named, 1 cut short, 0 absent), the pieces not explained by it, and marks of telling words."""
    if not words:
        return 0, left, 0
    level, marks = 0, 0
    rest: list[Piece] = []
    runs = {"".join(words[a:b]) for a in range(len(words)) for b in range(a + 1, len(words) + 1)}
    n = 0
    while n < len(left):
        for count in (4, 3, 2):  # words that the text splits or joins
            group = left[n : n + count]
            joined = "".join(p.folded for p in group)
            whole = not any("." in p.word.gap for p in group[1:])  # "Heli. Ene." is no "Heliene"
            whole = whole and all(a.end == b.start for a, b in zip(group, group[1:], strict=False))
            if whole and len(group) == count and len(joined) > 3 and joined in runs:
                break
        else:
            count = 1
            group = left[n : n + 1]
            joined = group[0].folded
        how, common = (2, False) if joined in runs else _likeness(group[0].raw, joined, words)
        if joined not in runs and not _may_be_short(group[0], how, text):
            how = 0
        if len(joined) < 3 and not _stands_alone(group[0], text):
            how = 0  # the "Q" of "-320Q" is not the one of a maker "Q Cells"
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


def _may_be_short(p: Piece, how: int, text: SupplierText) -> bool:
    """Whether a piece can be a maker's name cut short: a whole word, and a very short one stands alone.

    What the core leaves of a word is no abbreviation ("Lumo" of "Lumos ST215" read as "SST215"), and "HSE-"
    before a number is rather a part of a model than initials.
    """
    if p.start > p.word.start or p.end < p.word.end:
        return False
    return how == 2 or (_stands_alone(p, text) and not tradewords.is_in(p.raw, tradewords.CODES))


def _stands_alone(p: Piece, text: SupplierText) -> bool:
    """Whether a piece is a whole word with nothing joined to it."""
    following = text.following(p.word)
    whole = p.start == p.word.start and p.end == p.word.end
    return whole and p.word.apart and (following is None or following.apart)


def is_there(word: str, text: SupplierText) -> bool:
    return word in text.joined or any(_likeness(w.raw, w.folded, [word])[0] == 2 for w in text.words)


def _slips(piece: str, word: str) -> bool:
    from rapidfuzz.distance import OSA

    allowed = 2 if len(word) >= 9 else 1
    return OSA.distance(piece, word, score_cutoff=allowed) <= allowed


def _thinned(piece: str, word: str) -> bool:
    """Whether the piece is the word with letters left out."""
    letters = iter(word)
    return all(c in letters for c in piece)
