"""Names of records: what a person types, found; what a supplier wrote, resolved.

`look_up` takes a name that is meant to be one record (a command line), `find` and `search` serve one as it is
typed, `resolve` reads suppliers' free text, `twins` lists models that several makers sell. All are pure
functions over a list of `Named`; a `NameIndex` in its place keeps the work on the names for the next call.

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
from catalog.typed_names import exact, holding, is_model_with_part_of_maker, pattern, slips


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
class Found:
    """The first records that answer a search, and how many there are; ``None`` where names are merely near."""

    candidates: list[Candidate]
    total: int | None


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
        from catalog.text_index import TextIndex

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
    for rows in exact(typed, text, key, index):
        if len(rows) == 1:
            return _match(rows[0], index)
        if rows:
            return _ambiguous(rows, key, index, limit)
    rows = holding(text, key, index)
    whole = [i for i in rows if is_model_with_part_of_maker(text, i, index)]
    for some in (whole, rows, slips(text, index)):
        if len(some) == 1:
            return _match(some[0], index)
        if some:
            return _ambiguous(some, key, index, limit)
    return LookUp(None, _nearest(text, key, index, limit))


def find(query: str, names: Names, limit: int = 20) -> list[Candidate]:
    """Records for a search as one types: the name holds all words, in any order, the last perhaps unfinished.

    Ranked: the name or model itself, names that begin with the query, words found at the beginning of words,
    words found inside; shorter names first. Where no name holds all words, names with small typing errors in
    their letters, then the nearest names that hold the query's digits.
    """
    return search(query, names, limit).candidates


def search(query: str, names: Names, limit: int = 20) -> Found:
    """As `find`, with the number of all records that answer; of names that are merely near none is the last."""
    index = as_index(names)
    text = namekeys.squeezed(query)
    key = namekeys.compact(query)
    if not key or not len(index) or limit < 1:
        return Found([], 0)
    rows = holding(text, key, index, unfinished=True) or slips(text, index)
    if rows:
        return Found(_ranked(rows, text, key, index)[:limit], len(rows))
    return Found(_nearest(text, key, index, limit), None)


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


def _ranked(rows: Iterable[int], text: str, key: str, index: NameIndex) -> list[Candidate]:
    """Rows that hold the query, best first; the score is the share of the name that the query tells."""
    starts = [re.compile(rf"(?<![^\W_]){pattern(word, unfinished=True)}") for word in namekeys.words(text)]

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
