"""Stock: what lies on the shelf, how many, at what price, and which record each article of a list means.

A list is read by `catalog.stock_file`, its articles are matched to records by `matched`, and `replace` keeps them.
What a person decided on an article is kept too, and holds for the same text in every list that follows.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Literal

from catalog.errors import CatalogError
from catalog.names import NameIndex, resolve
from catalog.namekeys import compact, squeezed
from catalog.records import Source

if TYPE_CHECKING:
    from sqlmodel import Session

    from catalog.database import Run

#: How an article came to its record: its full name stood in the list; its text means this record beyond doubt; a
#: person decided. Or why it has none: several are possible; no record is like it; a person said that it is none.
Confidence = Literal["named", "sure", "decided", "choose", "none", "left-out"]

#: Articles that wait for a decision.
OPEN: tuple[Confidence, ...] = ("choose", "none")


@dataclass(frozen=True, slots=True, kw_only=True)
class StockItem:
    """One line of a stock list.

    ``kind`` is "module" or "inverter", ``None`` where the list does not tell and no record is known. ``record`` is the id
    of the record that it means. ``quantity`` is in pieces, ``unit_price`` in ``currency`` per piece. ``named`` is the
    full name of a record where the list has a column for it.
    """

    quantity: int
    kind: str | None = None
    record: int | None = None
    unit_price: float | None = None
    currency: str | None = None
    place: str = ""
    article: str = ""
    text: str = ""
    named: str = ""
    source: Source = Source("unnamed list")
    confidence: Confidence = "none"
    id: int | None = None

    @property
    def label(self) -> str:
        """Article, text and the name that the list gives, as a person would find it in the list."""
        return f"{self.article}: {self.words}" if self.article and self.words else self.article or self.words

    @property
    def words(self) -> str:
        """Text, and the name that the list gives beside it."""
        beside = self.named and self.named.casefold() not in self.text.casefold()
        return f"{self.text} ({self.named})" if beside and self.text else self.text or self.named

    @property
    def open(self) -> bool:
        """Whether it waits for a decision."""
        return self.confidence in OPEN


@dataclass(frozen=True, slots=True)
class Suggestion:
    """A record that an article may mean: kind, id and score from 0 to 100."""

    kind: str
    id: int
    score: float


#: Decided records (``None``: none of the catalog) by article and text, both as `decision_key` writes them.
Decisions = Mapping[tuple[str, str], int | None]

#: Names of each kind, as an index.
NamesByKind = Mapping[str, NameIndex]


def decision_key(item: StockItem) -> tuple[str, str]:
    """Article and text, whatever their case and spaces; the article alone where there is no text."""
    return squeezed(item.article), squeezed(item.text)


def matched(items: Iterable[StockItem], names: NamesByKind, decisions: Decisions) -> list[StockItem]:
    """The items with the records that they mean.

    In this order: what was decided on the same article and text, or on the same text; a full name that the list
    gives; the text. Nothing is taken for granted that `catalog.names.resolve` is not sure of.
    """
    kinds = {named.id: kind for kind, index in names.items() for named in index.names}
    by_text: dict[str, set[int | None]] = {}
    for (_, text), record in decisions.items():
        by_text.setdefault(text, set()).add(record)
    full = {kind: _by_full_name(index) for kind, index in names.items()}
    return [_matched(item, names, kinds, decisions, by_text, full) for item in items]


def _by_full_name(index: NameIndex) -> dict[str, int]:
    """Ids by compact full name, where only one record has it."""
    found: dict[str, int] = {}
    twice = set()
    for key, id_ in zip(index.full_keys, index.ids, strict=True):
        if key in found:
            twice.add(key)
        found[key] = id_
    return {key: id_ for key, id_ in found.items() if key not in twice}


def _matched(
    item: StockItem,
    names: NamesByKind,
    kinds: Mapping[int, str],
    decisions: Decisions,
    by_text: Mapping[str, set[int | None]],
    full: Mapping[str, Mapping[str, int]],
) -> StockItem:
    key = decision_key(item)
    said = by_text.get(key[1], set()) if key[1] else set()
    if key in decisions or len(said) == 1:
        record = decisions[key] if key in decisions else next(iter(said))
        if record is None:
            return replace(item, record=None, confidence="left-out")
        if item.kind in (None, kinds.get(record)):
            return replace(item, record=record, kind=kinds[record], confidence="decided")
    possible = [item.kind] if item.kind else list(names)
    if item.named:
        hits = [(kind, full[kind][compact(item.named)]) for kind in possible if compact(item.named) in full[kind]]
        if len(hits) == 1:
            return replace(item, kind=hits[0][0], record=hits[0][1], confidence="named")
    sure, some = _read(item, names, possible)
    if len(sure) == 1:
        ((kind, record),) = sure
        return replace(item, kind=kind, record=record, confidence="sure")
    return replace(item, record=None, confidence="choose" if some else "none")


def _read(item: StockItem, names: NamesByKind, kinds: Sequence[str]) -> tuple[set[tuple[str, int]], bool]:
    """Records that the name and the text of an item mean for sure, and whether there are candidates at all."""
    sure: set[tuple[str, int]] = set()
    some = False
    for text in filter(None, (item.named, item.text or item.article)):
        for kind in kinds:
            found = resolve(text, names[kind])
            some = some or found.confidence != "none"
            if found.confidence == "sure":
                sure.add((kind, found.candidates[0].id))
    return sure, some


#: Candidates that are looked at for each that is suggested, where only those with something in common count.
_LOOKED_AT = 5


def suggestions(item: StockItem, names: NamesByKind, limit: int = 5) -> list[Suggestion]:
    """Records that an article may mean, best first; where none is near, those that share a number or a telling word."""
    from catalog.common_ground import has_in_common

    best: dict[tuple[str, int], float] = {}
    for text in filter(None, (item.named, item.text or item.article)):
        for kind in [item.kind] if item.kind else names:
            found = resolve(text, names[kind], limit * _LOOKED_AT)
            called = {n.id: n for n in names[kind].names} if found.confidence == "none" and found.candidates else {}
            for c in found.candidates:
                if not called or has_in_common(text, called[c.id].maker, called[c.id].model):
                    best[kind, c.id] = max(c.score, best.get((kind, c.id), 0.0))
    ranked = sorted(best.items(), key=lambda entry: -entry[1])[:limit]
    return [Suggestion(kind, id_, score) for (kind, id_), score in ranked]


def read_stock(run: Run) -> list[StockItem]:
    """All lines that are kept, in the order of their lists."""
    rows = run(
        'SELECT t."id", t."kind", t."record_id", t."quantity", t."unit_price", t."currency", t."place", t."article",'
        ' t."text", t."named", t."confidence", s."name", s."revision" FROM stock t JOIN source s ON s."id" = t."source_id"'
        ' ORDER BY t."id"',
        {},
    )
    return [
        StockItem(
            id=id_, kind=kind, record=record, quantity=quantity, unit_price=price, currency=currency, place=place,
            article=article, text=text, named=named, confidence=confidence, source=Source(name, revision),
        )
        for id_, kind, record, quantity, price, currency, place, article, text, named, confidence, name, revision in rows
    ]  # fmt: skip


def read_decisions(run: Run) -> dict[tuple[str, str], int | None]:
    """What people decided."""
    rows = run('SELECT d."article_key", d."text_key", d."record_id" FROM stock_decision d', {})
    return {(article, text): record for article, text, record in rows}


def keep_list(session: Session, run: Run, items: Sequence[StockItem], created_at: str, *, add: bool) -> None:
    """Put a list in the place of all that was in stock; with ``add``, beside it.

    A line that is added takes the place of the earlier ones of the same article, text and place.
    """
    from sqlalchemy import delete, insert

    from catalog.revisions import Sources
    from catalog.tables import StockRow

    connection = session.connection()
    first = 1
    if add:
        lines = {(*decision_key(item), squeezed(item.place)) for item in items}
        old = [i.id for i in read_stock(run) if (*decision_key(i), squeezed(i.place)) in lines]
        for start in range(0, len(old), 500):
            connection.execute(delete(StockRow.__table__).where(StockRow.__table__.c.id.in_(old[start : start + 500])))
        first += run('SELECT COALESCE(MAX(t."id"), 0) FROM stock t', {})[0][0]
    else:
        connection.execute(delete(StockRow.__table__))
    sources = Sources(session, run, created_at)
    rows = [
        {
            "id": id_, "kind": i.kind, "record_id": i.record, "quantity": i.quantity, "unit_price": i.unit_price,
            "currency": i.currency, "place": i.place, "article": i.article, "text": i.text,
            "named": i.named, "confidence": i.confidence, "source_id": sources.id_of(i.source), "loaded_at": created_at,
        }
        for id_, i in enumerate(items, start=first)
    ]  # fmt: skip
    if rows:
        connection.execute(insert(StockRow.__table__), rows)


def keep_matches(session: Session, items: Iterable[StockItem]) -> None:
    """Keep the records of lines that waited for a decision; lines that were decided meanwhile stay."""
    from sqlalchemy import bindparam, or_, update

    from catalog.tables import StockRow

    table = StockRow.__table__
    rows = [{"row": i.id, "kind_": i.kind, "record_": i.record, "how": i.confidence} for i in items]
    is_open = or_(*(table.c.confidence == how for how in OPEN))
    statement = update(table).where(table.c.id == bindparam("row"), is_open)
    statement = statement.values(
        kind=bindparam("kind_"), record_id=bindparam("record_"), confidence=bindparam("how")
    )
    session.connection().execute(statement, rows)


def keep_decision(session: Session, run: Run, item: StockItem, record: tuple[str, int] | None, created_at: str) -> int:
    """Keep what an article means, for it and for all lines with the same text that are not decided otherwise.

    Parameters
    ----------
    record : (kind, id) or None
        ``None``: no record of the catalog.

    Returns
    -------
    int
        How many lines it now holds for.

    Raises
    ------
    CatalogError
        If the list says that the article is of the other kind.
    """
    from sqlalchemy import bindparam, update

    from catalog.tables import DecisionRow, StockRow

    article, text = decision_key(item)
    id_ = record[1] if record else None
    session.merge(DecisionRow(article_key=article, text_key=text, record_id=id_, decided_at=created_at))
    decided = read_decisions(run) | {(article, text): id_}
    table = StockRow.__table__
    rows = []
    for other in read_stock(run):
        key = decision_key(other)
        own = key == (article, text)
        if not own and not (text and key[1] == text and key not in decided):
            continue
        if record and other.kind not in (None, record[0]):
            if own:
                raise CatalogError(f"{other.label}: the list says that it is of the kind {other.kind}, not {record[0]}")
            continue
        confidence = "decided" if record else "left-out"
        rows.append({"row": other.id, "kind_": record[0] if record else other.kind, "record_": id_, "how": confidence})
    if rows:
        statement = update(table).where(table.c.id == bindparam("row"))
        statement = statement.values(
            kind=bindparam("kind_"), record_id=bindparam("record_"), confidence=bindparam("how")
        )
        session.connection().execute(statement, rows)
    return len(rows)
