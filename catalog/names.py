"""Names of records: what a person types, found; what a supplier wrote, resolved.

`look_up` takes a name that is meant to be one record (a command line), `find` serves a search as one
types, `resolve` reads suppliers' free text, `twins` lists models that several makers sell. All are pure functions
over a list of `Named`; a `NameIndex` in its place keeps the work on the names for the next call.

A name that could be two records is never decided here, and digits decide: a 270 W type is no typing
error for a 275 W type.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

from catalog import namekeys
from catalog.typing_errors import slips


@dataclass(frozen=True, slots=True)
class Named:
    """The name of one record."""

    id: int
    maker: str
    model: str

    @property
    def name(self) -> str:
        """Full name, "Maker Model"."""
        return f"{self.maker} {self.model}"


@dataclass(frozen=True, slots=True)
class Candidate:
    """A record that a text may mean, with a score from 0 to 100."""

    id: int
    score: float


@dataclass(frozen=True, slots=True)
class LookUp:
    """The one record that a query means, or ``None`` and the records it may mean, best first.

    ``ambiguous`` tells records that it could equally be from names that are merely near.
    """

    match: int | None
    candidates: list[Candidate]
    ambiguous: bool = False


@dataclass(frozen=True, slots=True)
class Resolution:
    """What a free text means: ``sure`` the first candidate, ``choose`` among them, or ``none`` known."""

    confidence: Literal["sure", "choose", "none"]
    candidates: list[Candidate]


class NameIndex:
    """Names with their normal forms, each worked out when first needed."""

    def __init__(self, names: Iterable[Named]) -> None:
        self.names = list(names)

    def __len__(self) -> int:
        return len(self.names)

    @cached_property
    def ids(self) -> list[int]:
        return [n.id for n in self.names]

    @cached_property
    def full(self) -> list[str]:
        """Full names, squeezed."""
        return [f"{maker} {model}" for maker, model in zip(self.makers, self.models, strict=True)]

    @cached_property
    def makers(self) -> list[str]:
        """Makers, squeezed."""
        return namekeys.squeezed_all([n.maker for n in self.names])

    @cached_property
    def models(self) -> list[str]:
        """Models, squeezed."""
        return namekeys.squeezed_all([n.model for n in self.names])

    @cached_property
    def full_keys(self) -> list[str]:
        """Full names, compact."""
        return namekeys.compact_all(self.full)

    @cached_property
    def model_keys(self) -> list[str]:
        """Models, compact."""
        return namekeys.compact_all(self.models)

    @cached_property
    def text_index(self):
        """What `resolve` needs: letter groups of all names (built in some tenths of a second)."""
        from catalog.resolve import TextIndex

        return TextIndex(self)


Names = Sequence[Named] | NameIndex


def as_index(names: Names) -> NameIndex:
    """The names as an index; an index is handed back as it is."""
    return names if isinstance(names, NameIndex) else NameIndex(names)


def look_up(query: str, names: Names, limit: int = 10) -> LookUp:
    """The one record that a typed name means.

    In this order, and only where exactly one record answers: the full name as it stands, the full name
    whatever its case and punctuation, the same two for the model alone, the model with a part of
    the maker's name, a part of one record's name only, and a name with small typing errors in its
    letters. Digits must agree always.

    Parameters
    ----------
    query : str
        What was typed.
    names : list of Named, or NameIndex
        The records.
    limit : int
        How many candidates at most, where there is no match.

    Returns
    -------
    LookUp
        With a match, its one candidate is the match. Without, the candidates are the records that the
        query could equally be, or, where it is none of them, the nearest names.
    """
    index = as_index(names)
    text = namekeys.squeezed(query)
    key = namekeys.compact(query)
    if not key or not len(index):
        return LookUp(None, [])
    typed = " ".join(query.split())
    for rows in _exact(typed, text, key, index):
        if len(rows) == 1:
            return _match(rows[0], index)
        if rows:
            return _ambiguous(rows, key, index, limit)
    rows = _holding(text, key, index)
    whole = [i for i in rows if _is_model_with_part_of_maker(text, i, index)]
    for some in (whole, rows, slips(text, index)):
        if len(some) == 1:
            return _match(some[0], index)
        if some:
            return _ambiguous(some, key, index, limit)
    return LookUp(None, _nearest(text, key, index, limit))


def find(query: str, names: Names, limit: int = 20) -> list[Candidate]:
    """Records for a search as one types: all words must be in the name, in any order, the last may be unfinished.

    Ranked: the name or model itself, names that begin with the query, words found at the beginning of words, words
    found inside; shorter names first. Where no name holds all words, names with small typing errors in
    their letters, then the nearest names that hold the query's digits.
    """
    index = as_index(names)
    text = namekeys.squeezed(query)
    key = namekeys.compact(query)
    if not key or not len(index) or limit < 1:
        return []
    rows = _holding(text, key, index, unfinished=True)
    if rows:
        return _ranked(rows, text, key, index)[:limit]
    rows = slips(text, index)
    if rows:
        return _ranked(rows, text, key, index)[:limit]
    return _nearest(text, key, index, limit)


def resolve(text: str, names: Names, limit: int = 5) -> Resolution:
    """The record that a supplier's free text means, with a confidence; see `catalog.resolve`."""
    from catalog.resolve import resolve_text

    return resolve_text(text, as_index(names), limit)


def twins(names: Names) -> list[list[int]]:
    """Groups of records with the same model under two or more makers, as ids, in the order of the names.

    Models are compared without case and punctuation. A maker's name that the model repeats
    ("Alderfell", "Alderfell AF6K") does not part twins.
    """
    index = as_index(names)
    makers = namekeys.compact_all(index.makers)
    groups: dict[str, list[int]] = {}
    for i, (maker, model) in enumerate(zip(makers, index.model_keys, strict=True)):
        own = model[len(maker) :] if maker and model.startswith(maker) and len(model) > len(maker) else model
        groups.setdefault(own, []).append(i)
    several = (g for key, g in groups.items() if key and len({makers[i] for i in g}) > 1)
    return [[index.ids[i] for i in group] for group in several]


def _match(row: int, index: NameIndex) -> LookUp:
    return LookUp(index.ids[row], [Candidate(index.ids[row], 100.0)])


def _ambiguous(rows: list[int], key: str, index: NameIndex, limit: int) -> LookUp:
    return LookUp(None, _ranked(rows, key, key, index)[:limit], ambiguous=True)


def _exact(typed: str, text: str, key: str, index: NameIndex) -> Iterable[list[int]]:
    """Rows whose full name, then whose model is the query, ever more loosely."""
    for i, name in enumerate(index.full):
        if name == text and " ".join(index.names[i].name.split()) == typed:
            yield [i]
    yield [i for i, name in enumerate(index.full) if name == text]
    yield [i for i, k in enumerate(index.full_keys) if k == key and _digits_agree(text, index.full[i])]
    rows = [i for i, name in enumerate(index.models) if name == text]
    same_case = [i for i in rows if " ".join(index.names[i].model.split()) == typed]
    # With a full name that differs in case only there are still two records, but the one as typed is meant.
    yield same_case or rows
    yield [i for i, k in enumerate(index.model_keys) if k == key and _digits_agree(text, index.models[i])]


def _digits_agree(text: str, name: str) -> bool:
    """Whether no decimal point is lost or won: "6.0" may be typed "6 0" and "6,0", but "60" is another number."""
    pattern = _pattern(text)
    return re.search(pattern, name) is not None or re.search(_pattern(name), text) is not None


def _pattern(word: str, *, unfinished: bool = False) -> str:
    """Pattern that finds a typed word in a squeezed name.

    Separators may stand anywhere in the name and be missing in the word, but digits with a decimal point or comma
    between them are another number than the same digits without. A number is found whole, and
    letters from the beginning of a run of letters on; ``unfinished`` words, still being typed, may begin inside
    a run and their last number may go on.
    """
    parts = []
    for i, char in enumerate(word):
        if not (char.isalnum() or char == "+"):
            continue
        if parts:
            before = word[i - 1]
            if char.isdigit() and before.isdigit():
                parts.append(r"[^\w.,+]*")
            elif char.isdigit() and before in ".," and word[i - 2 : i - 1].isdigit():
                parts.append(r"(?:[^\w+]|_)+")
            else:
                parts.append(r"(?:[^\w+]|_)*")
        parts.append(re.escape(char))
    if word[:1].isdigit():
        begin = r"(?<!\d)"
    else:
        begin = "" if unfinished else r"(?<![^\W\d_])"
    end = r"(?!\d)" if word[-1:].isdigit() and not unfinished else ""
    return begin + "".join(parts) + end


def _holding(text: str, key: str, index: NameIndex, *, unfinished: bool = False) -> list[int]:
    """Rows whose full name holds the query in one piece, or else all its words."""
    whole = re.compile(_pattern(text, unfinished=unfinished))
    rows = [i for i, k in enumerate(index.full_keys) if key in k and whole.search(index.full[i])]
    if rows and not unfinished:
        return rows
    parts = namekeys.words(text)
    if len(parts) < 2:
        return rows
    known = set(rows)
    left: Iterable[int] = [i for i in range(len(index)) if i not in known]
    for n, part in enumerate(parts):
        part_key = namekeys.compact(part)
        pattern = re.compile(_pattern(part, unfinished=unfinished and n == len(parts) - 1))
        left = [i for i in left if part_key in index.full_keys[i] and pattern.search(index.full[i])]
    return rows + list(left)


def _is_model_with_part_of_maker(text: str, row: int, index: NameIndex) -> bool:
    """Whether the query is the whole model and otherwise only words, or beginnings of words, of the maker."""
    found = re.search(_pattern(index.models[row]), text)
    if not found:
        return False
    maker = namekeys.words(index.makers[row])
    rest = namekeys.words(text[: found.start()]) + namekeys.words(text[found.end() :])
    return all(any(m.startswith(word) for m in maker) for word in rest)


def _ranked(rows: Iterable[int], text: str, key: str, index: NameIndex) -> list[Candidate]:
    """Rows that hold the query, best first; the score is the share of the name that the query tells."""
    starts = [re.compile(rf"(?<![^\W_]){_pattern(word, unfinished=True)}") for word in namekeys.words(text)]

    def rank(i: int) -> tuple:
        full, model = index.full_keys[i], index.model_keys[i]
        return (
            key not in (full, model),
            not (full.startswith(key) or model.startswith(key)),
            sum(not start.search(index.full[i]) for start in starts),
            len(model),
            index.full[i],
        )

    def score(i: int) -> float:
        told = len(key) / max(len(key), min(len(index.model_keys[i]), len(index.full_keys[i])))
        return round(100 * min(told, 1.0), 1)

    return [Candidate(index.ids[i], score(i)) for i in sorted(rows, key=rank)]


def _nearest(text: str, key: str, index: NameIndex, limit: int) -> list[Candidate]:
    """The nearest names, for "did you mean"; those that hold the query's digits come first."""
    from rapidfuzz import fuzz, process

    best: dict[int, float] = {}
    for keys in (index.full_keys, index.model_keys):
        for _, score, i in process.extract(key, keys, scorer=fuzz.ratio, limit=5 * limit, score_cutoff=50):
            best[i] = max(score, best.get(i, 0.0))
    digits = set(namekeys.digit_runs(text))

    def rank(i: int) -> tuple:
        missing = len(digits.difference(namekeys.digit_runs(index.full[i])))
        return (best[i] - 8 * missing) * -1, index.full[i]

    return [Candidate(index.ids[i], round(best[i], 1)) for i in sorted(best, key=rank)[:limit]]
