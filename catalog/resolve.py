"""Read suppliers' free text: which record it means, and how sure that is.

Candidates come from two sides: models that stand in the text in one piece (a dictionary of all models), and
records that share rare groups of three letters with it. Each is then held against the text
(`catalog.name_match`). A text means a record for sure only where the whole core of its model stands there,
nothing that could tell another type is left unexplained, every rival is told by less of the text, and
neither the power, nor the AC voltage, nor the maker that the text names speaks against it.
"""

from __future__ import annotations

import re
from bisect import bisect_left
from collections.abc import Iterable
from typing import TYPE_CHECKING

from catalog import namekeys, tradewords
from catalog.name_match import Match, Shape, core_of, match, place, placed_share
from catalog.supplier_text import AC_VOLTS, SupplierText

if TYPE_CHECKING:
    import numpy as np

    from catalog.names import NameIndex, Resolution

_NEAR = 120  # records looked at closely
_KNOWN = 45.0  # score below which a record counts as not in the catalog
_VOLTS_END = re.compile(r"\s*[\[(]\s*\d{3}\s*v(?:ac)?\s*[\])]\s*$")


class TextIndex:
    """What `resolve_text` needs of all names; built once, kept by the `NameIndex`."""

    def __init__(self, index: NameIndex) -> None:
        self.index = index
        self._shapes: dict[int, Shape] = {}
        self.by_full = _rows_by(index.full_keys)
        self.by_model = _rows_by(index.model_keys)
        maker_words = {m: {namekeys.folded(w) for w in re.findall(r"[^\W_]+", m)} for m in set(index.makers)}
        cores = [
            core_of(_VOLTS_END.sub("", model), maker_words[maker])[0] if " " in model or "[" in model else model
            for maker, model in zip(index.makers, index.models, strict=True)
        ]
        cores = [namekeys.folded(c) for c in namekeys.compact_all(cores)]
        self.by_core = _rows_by(cores)
        self.sorted_cores = sorted(self.by_core)
        self.longest = max(map(len, cores), default=0)
        self.maker_vocabulary = set().union(*maker_words.values()) - tradewords.COMMON - tradewords.TRADE
        self.grams = _Grams([namekeys.folded(k) for k in index.full_keys])

    def shape(self, row: int) -> Shape:
        """The name of one record, taken apart."""
        found = self._shapes.get(row)
        if found is None:
            found = self._shapes[row] = Shape(self.index.makers[row], self.index.models[row])
        return found

    def has_longer(self, core: str) -> bool:
        """Whether another model goes on with letters after this core ("AF6K-270P" after "AF6K-270")."""
        at = bisect_left(self.sorted_cores, core)
        following = self.sorted_cores[at + 1 : at + 40]
        return any(c.startswith(core) and not c[len(core)].isdigit() for c in following)


class _Grams:
    """Which records hold which groups of three characters."""

    def __init__(self, keys: list[str]) -> None:
        import numpy as np

        self._np = np
        self.count = len(keys)
        codes, rows = self._codes("\n".join(keys))
        pairs = np.unique(codes.astype(np.int64) * max(self.count, 1) + rows)
        codes, self.rows = np.divmod(pairs, max(self.count, 1))
        size = np.bincount(codes, minlength=37**3)
        self.begin = np.concatenate([[0], np.cumsum(size)])
        self.weight = np.log1p(self.count / np.maximum(size, 1))
        self.total = np.bincount(self.rows, weights=self.weight[codes], minlength=self.count)

    def _codes(self, joined: str) -> tuple[np.ndarray, np.ndarray]:
        """Codes of all groups inside lines, and the lines they are in."""
        np = self._np
        chars = np.frombuffer(joined.encode("latin-1", "replace"), np.uint8)
        table = np.full(256, 36, np.int32)
        table[48:58] = np.arange(10)
        table[97:123] = np.arange(10, 36)
        ends = chars == 10
        line = np.cumsum(ends)
        c = table[chars]
        codes = c[:-2] * 37 * 37 + c[1:-1] * 37 + c[2:]
        inside = ~(ends[:-2] | ends[1:-1] | ends[2:])
        return codes[inside], line[:-2][inside]

    def nearest(self, joined: str, count: int) -> list[tuple[int, float]]:
        """Rows that share most with a folded text, with their likeness from 0 to 1."""
        np = self._np
        if len(joined) < 3 or not self.count:
            return []
        codes = np.unique(self._codes(joined)[0])
        parts = [self.rows[self.begin[c] : self.begin[c + 1]] for c in codes]
        shared = np.bincount(
            np.concatenate(parts), weights=np.repeat(self.weight[codes], [len(p) for p in parts]), minlength=self.count
        )
        likeness = shared / np.maximum(self.total, 1e-9) * np.minimum(1.0, shared / (0.35 * self.weight[codes].sum()))
        count = min(count, self.count)
        top = np.argpartition(likeness, -count)[-count:]
        return [(int(i), float(likeness[i])) for i in top if shared[i] > 0]


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
        if rows and len(rows) == 1:
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


def _rows_by(keys: Iterable[str]) -> dict[str, list[int]]:
    out: dict[str, list[int]] = {}
    for i, key in enumerate(keys):
        out.setdefault(key, []).append(i)
    return out


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
    """Whether a piece of the text can be a model: a short one must be made of whole words."""
    if a in read.starts and b in read.ends:
        return True
    return b - a >= 4


def _merit(m: Match) -> tuple:
    return (-len(m.doubts), m.told.bit_count(), m.verbatim, m.exact, m.in_order, m.maker, -len(m.strangers))


def _winner(matches: list[Match], read: SupplierText, texts: TextIndex) -> Match | None:
    """The one match that the text means for sure, if there is one."""
    clean = [m for m in matches if not m.doubts]
    best = max(clean, key=lambda m: (m.told.bit_count(), *_merit(m)), default=None)
    if best is None or not _is_evident(best, read, texts):
        return None
    return best if all(m is best or _beats(best, m, read) for m in clean) else None


def _beats(a: Match, b: Match, read: SupplierText) -> bool:
    """Whether the text speaks for one match and not for the other."""
    if b.told & ~a.told:
        return False
    more = a.told & ~b.told
    if more:
        return bool(more & (~read.remarks | a.volts))
    if a.shape.plain == b.shape.plain and a.shape.volts == b.shape.volts:
        return a.maker > b.maker
    if namekeys.folded(a.shape.plain) == namekeys.folded(b.shape.plain):
        return a.verbatim and not b.verbatim and a.shape.plain == b.shape.plain
    return a.in_order and not b.in_order


def _is_evident(m: Match, read: SupplierText, texts: TextIndex) -> bool:
    """Whether a match that has no doubts about it is told well enough, and nothing contradicts it."""
    core = m.shape.core
    plain = m.shape.plain
    telling = len(core) >= 5 and any(c.isdigit() for c in plain) and any(c.isalpha() for c in plain)
    if not telling and m.maker < 2 and not m.line:
        return False
    if m.maker < 2 and not m.line and (m.strangers if not m.maker else _other_maker(m, texts)):
        return False
    remarks = m.core & read.remarks
    if remarks and texts.has_longer(core):
        return False
    if m.shape.volts and read.ac_volts and m.shape.volts not in read.ac_volts:
        return False
    return not any(_contradicts(watts, m.shape) for watts in read.watts)


def _other_maker(m: Match, texts: TextIndex) -> bool:
    """Whether the text names a maker, and another one."""
    return any(namekeys.folded(word) in texts.maker_vocabulary for word in m.strangers)


def _contradicts(watts: float, shape: Shape) -> bool:
    """Whether a stated power lies near a number of the model, yet is another one: 275 W and "-270"."""
    digits = [n.replace(".", "") for n in shape.numbers]
    for written in (f"{watts:g}", f"{watts / 1000:g}"):
        if any(written.replace(".", "") in d for d in digits):
            return False
    for n in shape.numbers:
        sizes = [float(n), float(n) * 1000] + [float(p) for p in (n[:3], n[-3:]) if len(n) > 4 and "." not in n]
        if n not in AC_VOLTS and any(s >= 50 and 0 < abs(s - watts) <= 0.15 * watts for s in sizes):
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
        score[m.row] = max(60.0, 86 + 12 * told - 9 * len(m.doubts) - (0 if m.maker else 1)) if m is not best else 100.0
    for row, like in likeness.items():
        if row not in score:
            score[row] = 85 * (0.6 * placed_share(texts.shape(row), read) + 0.4 * like)
    return sorted(score.items(), key=lambda item: (-item[1], len(texts.index.full[item[0]]), item[0]))
