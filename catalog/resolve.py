"""Read suppliers' free text: which record it means, and how sure that is.

Candidates come from two sides: models that stand in the text in one piece (a dictionary of all models), and
records that share rare groups of three letters with it. Each is then held against the text
(`catalog.name_match`). A text means a record for sure only where the whole core of its model stands there,
nothing that could tell another type is left unexplained, every rival is told by less of the text, and
neither the power, nor the AC voltage, nor the maker that the text names speaks against it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from catalog import namekeys
from catalog.name_match import Match, match, place, placed_share
from catalog.name_shape import Shape
from catalog.supplier_text import AC_VOLTS, SupplierText, mask
from catalog.text_index import TextIndex

if TYPE_CHECKING:
    from catalog.names import NameIndex, Resolution

_NEAR = 120  # records looked at closely
_KNOWN = 45.0  # score below which a record counts as not in the catalog


def resolve_text(text: str, index: NameIndex, limit: int = 5) -> Resolution:
    """The record that a supplier's free text means.

    Parameters
    ----------
    text : str
        The article text, line breaks and all.
    index : NameIndex
        The records.
    limit : int
        How many candidates at most.

    Returns
    -------
    Resolution
        ``sure``: the first candidate is meant. ``choose``: look at the candidates. ``none``: the
        text means no record of the catalog, as far as can be told.
    """
    from catalog.names import Candidate, Resolution

    read = SupplierText(text)
    if not read.words or not len(index):
        return Resolution("none", [])
    texts: TextIndex = index.text_index
    for rows in (texts.by_full.get(read.key), texts.by_model.get(read.key)):
        if rows and len(rows) > 1:
            rows = [i for i in rows if index.names[i].name == " ".join(text.split())]
        if rows and len(rows) == 1 and texts.is_alone(rows[0], text):
            return Resolution("sure", [Candidate(index.ids[rows[0]], 100.0)])
    likeness = dict(texts.grams.nearest(read.joined, _NEAR))
    matches = _matches(read, texts, likeness)
    best = _winner(matches, read, texts)
    ranked = _ranked(best, matches, likeness, read, texts)[:limit]
    candidates = [Candidate(index.ids[i], round(score, 1)) for i, score in ranked]
    if best is not None:
        return Resolution("sure", candidates)
    known = [c for c in candidates if c.score >= _KNOWN]
    return Resolution("choose", known) if known else Resolution("none", candidates)


def _matches(read: SupplierText, texts: TextIndex, likeness: dict[int, float]) -> list[Match]:
    """Records whose core stands in the text, in one piece or chunk by chunk."""
    best: dict[int, Match] = {}
    joined = read.joined
    for a in range(len(joined)):
        for b in range(a + 2, min(len(joined), a + texts.longest) + 1):
            for row in texts.by_core.get(joined[a:b], ()):
                if not _stands_free(a, b, read):
                    continue
                found = match(row, texts.shape(row), [(a, b)], read)
                if row not in best or _merit(found) > _merit(best[row]):
                    best[row] = found
    for row in likeness:
        if row not in best:
            shape = texts.shape(row)
            spans = place(shape, read) if shape.core else None
            if spans:
                best[row] = match(row, shape, spans, read)
    return list(best.values())


def _stands_free(a: int, b: int, read: SupplierText) -> bool:
    """Whether a piece of the text can be a model: no part of a number, and whole words if it is short."""
    if a in read.starts and b in read.ends:
        return True
    raw = read.joined_raw
    if a not in read.starts and raw[a].isdigit() and raw[a - 1].isdigit():
        return False
    if b not in read.ends and raw[b].isdigit() and raw[b - 1].isdigit():
        return False
    return b - a >= 4


def _merit(m: Match) -> tuple:
    return (-len(m.doubts), m.told.bit_count(), m.verbatim, m.exact, m.in_order, m.maker, -len(m.strangers))


def _winner(matches: list[Match], read: SupplierText, texts: TextIndex) -> Match | None:
    """The one match that the text means for sure, if there is one."""
    told = [m for m in matches if not m.doubts and _is_told(m, texts)]
    best = max(told, key=lambda m: (m.told.bit_count(), *_merit(m)), default=None)
    if best is None or _is_contradicted(best, read, texts):
        return None
    if any(
        m.told != best.told and not best.told & ~m.told for m in matches
    ):  # a longer name, with doubts about it
        return None
    return best if all(m is best or _beats(best, m, read) for m in told) else None


def _beats(a: Match, b: Match, read: SupplierText) -> bool:
    """Whether the text speaks for one match and not for the other."""
    if b.told & ~a.told or (b.in_order and not a.in_order):
        return False
    more = a.told & ~b.told
    if more:
        return bool(more & (~read.remarks | a.volts)) or (a.in_order and not b.in_order)
    if a.shape.plain == b.shape.plain and a.shape.volts == b.shape.volts:
        return a.maker > b.maker
    if a.shape.core == b.shape.core:
        return a.verbatim and not b.verbatim and a.shape.plain == b.shape.plain
    return a.in_order and not b.in_order


def _is_told(m: Match, texts: TextIndex) -> bool:
    """Whether so much of a record stands in the text that the text may mean it, and names no other maker."""
    if not m.line or (not _is_telling(m) and m.maker < 2):
        return False
    if m.strangers and not any(c.isdigit() for c in m.shape.plain):
        return False
    if m.strangers and not (m.in_order and (m.maker or m.shape.line_words)):
        return False
    return not any(namekeys.folded(word) in texts.maker_vocabulary for word in m.strangers)


def _is_telling(m: Match) -> bool:
    """Whether a core is no mere number or word that may stand in any text."""
    plain = m.shape.plain
    if m.shape.line_words and not all(w in m.shape.maker_words for w in m.shape.line_words):
        return m.line
    return len(plain) >= 5 and any(c.isdigit() for c in plain) and any(c.isalpha() for c in plain)


def _is_contradicted(m: Match, read: SupplierText, texts: TextIndex) -> bool:
    """Whether the text names another voltage or power, or only a remark completes the name."""
    if m.core & read.remarks and (not m.in_order or texts.has_longer(m.shape.core)):
        return True
    free = [w for w in read.words if not mask(w.start, w.end) & m.told]
    untold = [w for w in free if not w.remark or w.raw.isdigit()]
    if any(m.shape.core + w.folded in texts.by_core for w in untold):  # a suffix that strayed
        return True
    if m.in_order and texts.is_suffix(m.shape, read.word_after(m.core)):
        return True
    if m.shape.volts and not m.volts and m.shape.volts not in read.ac_volts:
        if read.ac_volts or read.bare_volts & ~m.told:
            return True
    return any(_is_other_power(watts, m.shape, texts) for watts in read.watts)


def _is_other_power(watts: float, shape: Shape, texts: TextIndex) -> bool:
    """Whether a stated power is not the model's, yet so near that the model's number must be its power.

    Names carry round classes and lists sometimes the measured power ("-250", "251 W"): up to 2 % off
    is the same type, unless the stated power is a class itself or there is a type for it. From 1 kW on
    (inverters, whose names are looser) only a type for the stated power counts.
    """
    writings = {
        f"{watts:g}".replace(".", ""),
        f"{watts / 1000:g}".replace(".", ""),
        f"{watts / 1000:.1f}".replace(".", ""),
    }
    digits = [n.replace(".", "") for n in shape.numbers]
    if any(w in d for w in writings for d in digits):
        return False
    for n in shape.numbers:
        if n in AC_VOLTS and n not in {"220", "230", "240"}:
            continue
        for part in {n, n[:3], n[-3:]} if len(n) > 4 and "." not in n else {n}:
            for size in (float(part), 1000 * float(part)):
                off = abs(size - watts) / watts
                if size < 50 or off > 0.15:
                    continue
                sibling = any(shape.core.replace(part.replace(".", ""), w) in texts.by_core for w in writings)
                classes = watts % 5 == 0 and size % 5 == 0
                if sibling or (watts < 1000 and (off > 0.02 or classes)):
                    return True
    return False


def _ranked(
    best: Match | None, matches: list[Match], likeness: dict[int, float], read: SupplierText, texts: TextIndex
) -> list[tuple[int, float]]:
    """All candidates with scores, best first."""
    size = max(len(read.joined), 1)
    score: dict[int, float] = {}
    for m in matches:
        told = m.told.bit_count() / size
        if m is best:
            score[m.row] = 100.0
        elif _is_telling(m) or m.maker == 2:
            score[m.row] = max(60.0, 86 + 12 * told - 9 * len(m.doubts) - (0 if m.maker else 1))
        else:
            score[m.row] = 20 + 40 * told
    for row, like in likeness.items():
        if row not in score:
            score[row] = 85 * (0.6 * placed_share(texts.shape(row), read) + 0.4 * like)
    return sorted(score.items(), key=lambda item: (-item[1], len(texts.index.full[item[0]]), item[0]))
