"""``fit --in-stock`` and ``--by cost``: what of a question is on the shelf, how many, and at what price.

Costs are modules times their price plus inverters times theirs, taken from the cheapest lots first, in one currency:
that of the record that was named. Tables, CSV files and documents have ``cost`` and ``currency`` if and only if
``--in-stock`` or ``--by cost`` is given; a cost is blank (``null``) where a price is missing or in another currency.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from catalog.errors import CatalogError

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from catalog.stock import StockItem
    from catalog.store import Catalog
    from matcher.request import Request
    from matcher.shelf import Shelf

#: Lines of the stock lists by the id of the record that they mean.
Lots = Mapping[int, Sequence["StockItem"]]

#: Records that are named one by one in a note.
_NAMED = 5


@dataclass(frozen=True, slots=True)
class OnShelf:
    """The records of a question that can be had, their bounds and prices, and what must be said about them."""

    modules: list[Module]
    inverters: list[Inverter]
    shelf: Shelf
    notes: tuple[str, ...]

    def check_count(self, request: Request) -> None:
        """Refuse a module count that nothing in stock reaches.

        Raises
        ------
        CatalogError
        """
        most = int(self.shelf.modules_at_most.max())
        if request.counts is not None and request.counts[0] > most:
            raise CatalogError(f"{request.counts[0]:,} modules are needed, and of no type are more than {most:,} in stock")

    def entry(self) -> dict[str, Any]:
        """The entry ``stock`` of a document."""
        return {"stock": {"currency": self.shelf.currency, "notes": list(self.notes)}}


def stock_lots(catalog: Catalog) -> dict[int, list[StockItem]]:
    """Lines in stock by the record that they mean.

    Raises
    ------
    CatalogError
        Where no stock list is kept, or none of its articles is matched to a record.
    """
    items = catalog.stock()
    if not items:
        raise CatalogError("no stock list is kept: load one with 'ferrule stock load FILE'")
    note_waiting(items)
    lots: dict[int, list[StockItem]] = {}
    for item in items:
        if item.record is not None:
            lots.setdefault(item.record, []).append(item)
    if not lots:
        raise CatalogError("no article in stock is matched to a record yet: 'ferrule stock review'")
    return lots


def note_waiting(items: Sequence[StockItem]) -> None:
    """Say on stderr how many articles no search can see, as nobody has decided what they are."""
    from cli.console import note

    line = waiting_line(items)
    if line:
        note(line)


def waiting_line(items: Sequence[StockItem]) -> str:
    """How many articles wait for a decision, and how it is made; blank where none does."""
    from catalog.stock import decision_key
    from cli.console import counted

    waiting = len({decision_key(item) for item in items if item.open})
    waits = "waits" if waiting == 1 else "wait"
    return f"{counted(waiting, 'article')} in stock {waits} for a decision: ferrule stock review" if waiting else ""


def held(catalog: Catalog, kind: str) -> dict[int, int]:
    """Pieces in stock by the id of the record, of one kind; says and raises what `held_lots` does."""
    return {id_: pieces_of(some) for id_, some in held_lots(catalog, kind).items()}


def held_lots(catalog: Catalog, kind: str) -> dict[int, list[StockItem]]:
    """Lines in stock by the id of the record, of one kind; says how many articles wait for a decision.

    Raises
    ------
    CatalogError
        Where no record of the kind is on a stock list.
    """
    found: dict[int, list[StockItem]] = {}
    items = catalog.stock()
    note_waiting(items)
    for item in items:
        if item.kind == kind and item.record is not None:
            found.setdefault(item.record, []).append(item)
    if not found:
        raise CatalogError(f"--in-stock: no {kind} is in stock; load a list with 'ferrule stock load FILE'")
    return found


def only_in_stock(catalog: Catalog, lots: Lots, kind: str) -> list[Any]:
    """Records of a kind of which at least one piece is in stock.

    Raises
    ------
    CatalogError
        Where there is none.
    """
    ids = sorted(id_ for id_, some in lots.items() if some[0].kind == kind and pieces_of(some) > 0)
    if not ids:
        raise CatalogError(f"no {kind} is in stock: 'ferrule stock list' shows what is")
    return catalog.modules(ids) if kind == "module" else catalog.inverters(ids)


def on_shelf(
    modules: list[Module], inverters: list[Inverter], request: Request, lots: Lots, *, bounded: bool
) -> OnShelf:
    """Bounds and prices of the records of a question.

    A single module or inverter is the one that was named: where fewer are in stock than the question asks for, it is
    said how many are missing and the search goes on. Others of which there are too few are left out, and it is said.

    Parameters
    ----------
    bounded : bool
        Take no more than is in stock; else only prices are looked up.
    """
    from matcher.shelf import Lots as Priced
    from matcher.shelf import Shelf

    notes: list[str] = []
    asked = request.modules_in_strings or (request.counts[0] if request.counts else 1)
    modules, most_modules = _bounds("module", modules, asked, lots, bounded, notes)
    inverters, most_units = _bounds("inverter", inverters, request.units[0], lots, bounded, notes)
    currency = _currency(modules, inverters, lots, bounded, notes)
    priced = [[_lots_of(r.id, lots, currency, bounded) for r in records] for records in (modules, inverters)]
    if currency is not None:
        for kind, records, some in (("module", modules, priced[0]), ("inverter", inverters, priced[1])):
            _note_unknown(kind, records, some, lots, currency, notes)
    shelf = Shelf(most_modules, most_units, Priced.of(priced[0]), Priced.of(priced[1]), currency)
    return OnShelf(modules, inverters, shelf, tuple(notes))


def pieces_of(items: Sequence[StockItem]) -> int:
    """How many pieces some lines are together."""
    return sum(item.quantity for item in items)


def _bounds(
    kind: str, records: list[Any], asked: int, lots: Lots, bounded: bool, notes: list[str]
) -> tuple[list[Any], Any]:
    """The records of which enough are there, and the most that can be had of each."""
    import numpy as np

    from matcher.limits import UNLIMITED

    if not bounded:
        return records, np.full(len(records), UNLIMITED, dtype=np.int64)
    there = {r.id: pieces_of(lots[r.id]) if r.id in lots else None for r in records}
    if len(records) == 1:
        (record,) = records
        number = there[record.id]
        if number is None:
            notes.append(f"{record.name} is in no stock list: how many there are, and their price, is not known.")
        elif number < asked:
            lacking = asked - number
            missing = f"{lacking:,} of {asked:,} {_many(kind, asked)} {'is' if lacking == 1 else 'are'} missing"
            notes.append(f"In stock: {number:,} of {record.name}; {missing}.")
        else:
            notes.append(f"In stock: {number:,} of {record.name}{_places(lots[record.id])}; no option takes more.")
        most = UNLIMITED if number is None or number < asked else number
        return records, np.array([most], dtype=np.int64)
    enough = [r for r in records if (there[r.id] or 0) >= asked]
    short = sorted((r for r in records if r not in enough), key=lambda r: -(there[r.id] or 0))
    if short:
        some = ", ".join(f"{r.name} ({there[r.id] or 0:,})" for r in short[:_NAMED])
        more = f" and {len(short) - _NAMED:,} more" if len(short) > _NAMED else ""
        notes.append(f"Left out, fewer than {asked:,} in stock: {some}{more}.")
    if not enough:
        raise CatalogError(f"no {kind} is in stock {asked:,} times: {notes[-1]}")
    return enough, np.array([there[r.id] for r in enough], dtype=np.int64)


def _many(kind: str, number: int) -> str:
    return kind if number == 1 else f"{kind}s"


def _places(items: Sequence[StockItem]) -> str:
    places = sorted({item.place for item in items if item.place and item.quantity})
    return f" ({'; '.join(places)})" if 0 < len(places) <= 2 else ""


def _currency(
    modules: Sequence[Any], inverters: Sequence[Any], lots: Lots, bounded: bool, notes: list[str]
) -> str | None:
    """The one currency of the record that was named (of both, for a pair); ``None`` where there is none."""
    found: set[str] = set()
    for records in (modules, inverters):
        if len(records) != 1:
            continue
        own = {lot.currency for lot in _offered(records[0].id, lots, bounded) if lot.currency}
        if not own:
            notes.append(f"No costs: the stock list has no price of {records[0].name}.")
            return None
        found |= own
    if len(found) != 1:
        notes.append(f"No costs: prices are in {' and '.join(sorted(found))}, which are not added up.")
        return None
    return found.pop()


def _offered(id_: int, lots: Lots, bounded: bool) -> list[StockItem]:
    return [lot for lot in lots.get(id_, ()) if lot.quantity > 0 or not bounded]


def _lots_of(id_: int, lots: Lots, currency: str | None, bounded: bool) -> list[tuple[int, float | None]]:
    """Pieces and prices of a record in the currency."""
    return [
        (lot.quantity, lot.unit_price if currency is not None and lot.currency == currency else None)
        for lot in _offered(id_, lots, bounded)
    ]


def _note_unknown(
    kind: str, records: Sequence[Any], priced: Sequence[Sequence[tuple]], lots: Lots, currency: str, notes: list[str]
) -> None:
    """Say why some records have no cost."""
    without = [r for r, some in zip(records, priced, strict=True) if all(price is None for _, price in some)]
    foreign = [r for r in without if any(lot.currency not in (None, currency) for lot in lots.get(r.id, ()))]
    unpriced = len(without) - len(foreign)
    if foreign:
        names = ", ".join(r.name for r in foreign[:_NAMED])
        notes.append(f"No cost for {len(foreign):,} {_many(kind, len(foreign))} priced in other than {currency}: {names}.")
    if unpriced:
        notes.append(f"No cost for {unpriced:,} {_many(kind, unpriced)} without a price in the stock list.")
