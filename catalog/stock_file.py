"""Stock lists as people keep them: columns by their usual names, quantities and prices as they are written.

``quantity`` and one of ``text``, ``article``, ``record`` or ``model`` are needed; the other columns are ``kind``,
``maker``, ``unit_price``, ``currency`` and ``place``. A currency may stand in its own column, in the heading of the
price, or beside the number. A bad row refuses the file, and every bad row is told.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

from catalog.currencies import currency_of, without_currency
from catalog.errors import CatalogError
from catalog.records import FieldSpec, Source
from catalog.sheet_values import BLANKS, DecimalSigns, value_of
from catalog.stock import StockItem
from catalog.tabular import Cell, Table, TableRow, read_table

#: Fields by the words that lists have for them, in the languages of the trade's usual lists.
_HEADINGS = {
    "article": "article, article no, article number, article code, art no, art, item, item no, item number, item code,"
    " sku, part no, part number, product no, product number, product code, order no, order number, order code, code,"
    " ref, reference, id, no, artikel, artikelnummer, artikelnr, artikel nr, art nr, bestellnummer, codigo, codice",
    "text": "text, article text, item text, description, item description, product description, article description,"
    " product, product name, item name, article name, name, designation, bezeichnung, artikelbezeichnung, beschreibung,"
    " artikeltext, descripcion, descrizione, omschrijving",
    "record": "record, datasheet, full name, maker and model, maker model",
    "kind": "kind, category, product group, group, product type, class, warengruppe, kategorie",
    "type": "type, typ, tipo",
    "maker": "maker, manufacturer, brand, make, producer, hersteller, marke, fabricant, fabricante, marque, merk",
    "model": "model, model no, model number, model name, modell, modele, modelo, modello",
    "quantity": "quantity, qty, stock, in stock, on stock, on hand, available, availability, stock quantity, stock qty,"
    " qty on hand, quantity on hand, qty in stock, quantity in stock, available quantity, qty available, pcs, pieces,"
    " count, units, number, amount, menge, bestand, lagerbestand, stuck, stueck, stk, anzahl, quantite, cantidad, aantal",
    "unit_price": "unit price, price, price each, price per unit, price per piece, price per pc, price pc, price pcs,"
    " price unit, price piece, net price, net unit price, list price, sales price, selling price, each, preis,"
    " stuckpreis, stueckpreis, einzelpreis, nettopreis, prix, prix unitaire, precio, prezzo, prijs",
    "currency": "currency, curr, cur, ccy, wahrung, waehrung, devise, moneda, valuta",
    "place": "place, location, warehouse, where, storage, store, hall, shelf, bin, depot, lager, lagerort, standort,"
    " lieu, entrepot, ubicacion, luogo, magazijn",
}
_FIELD = {key.strip(): name for name, keys in _HEADINGS.items() for key in keys.split(",")}
#: Words that say nothing about what a column holds.
_IDLE = frozenset("net netto each per pc pcs piece pieces stk stuck unit excl ex vat current actual our your the of in".split())
_LONG_KEYS = [key for key in _FIELD if len(key) > 4]
_PER_POWER = re.compile(r"(?:/|\bper\s|\bje\s)\s*k?w(?:p|att)?\b", re.IGNORECASE)

_MODULE = re.compile(r"(?:pv|solar)?\s*-?\s*(?:modules?|modul|module[ns]|panels?|paneel|paneles|panneaux?)|pv|moduli")
_INVERTER = re.compile(r"(?:(?:pv|solar|micro|mikro|string|hybrid|central)\s*-?\s*)?(?:inverters?|wechselrichter|onduleurs?|inversor(?:es)?|omvormers?|wr)")

_PRICE = FieldSpec("unit_price", float, "", "unit price", False, 0.0, 1e9)
_COUNTED = re.compile(r"\s*(?:pcs?|pieces?|pc\(s\)|units?|ea(?:ch)?|st(?:u|ü|ue)?ck|stk|st|no|x)\.?\s*", re.IGNORECASE)
_WHOLE = re.compile(r"\d+|[1-9]\d{0,2}(?:([ '\u2019.,\u00a0\u202f])\d{3})(?:\1\d{3})*")
_UNCLEAR = re.compile(r"[1-9]\d{0,2}[.,]\d{3}")

#: The largest quantity that is believed.
_MOST = 10**9
#: Bad rows that are told one by one.
_TOLD = 20


@dataclass(frozen=True, slots=True)
class StockFile:
    """What a list holds, in its order, and notes on what was left out or read with a remark (one line each)."""

    items: list[StockItem]
    notes: list[str] = field(default_factory=list)


def read_stock_file(path: str | Path, currency: str | None = None) -> StockFile:
    """Read a stock list from a CSV or XLSX file.

    Parameters
    ----------
    path : str or Path
    currency : str, optional
        Of prices that the list gives none for.

    Returns
    -------
    StockFile
        The items name no records yet: see `catalog.stock.matched`.

    Raises
    ------
    CatalogError
        If the file is no such list, or some of its rows are bad: one line per bad row with file, row and column.
    """
    table = read_table(path, lambda text: _exact_field(text) is not None)
    return _List(table, currency).read()


@dataclass(slots=True)
class _Column:
    place: int
    heading: str


class _List:
    """One list while it is read."""

    def __init__(self, table: Table, currency: str | None) -> None:
        self.table = table
        self.currency = _given(currency)
        self.notes = list(table.notes)
        self.signs = DecimalSigns()
        self.free = self.others = 0
        self.other_kinds: dict[str, int] = {}
        self.columns = self._columns()
        self.price_currency = self._price_currency()

    def read(self) -> StockFile:
        """The items, or every bad row."""
        self._look_at_prices()
        items, bad = [], []
        for row in self.table.rows:
            try:
                item = self._item(row)
            except CatalogError as problem:
                bad.append(str(problem))
            else:
                if item is not None:
                    items.append(item)
        if bad:
            left = len(bad) - _TOLD
            more = [f"... and {left:,} more bad row{'s' if left > 1 else ''}"] if left > 0 else []
            raise CatalogError("\n  ".join([*bad[:_TOLD], *more, "nothing was kept: correct these rows and load the list again"]))
        if not items:
            raise CatalogError(f"{self.table.path}: has a heading and no rows of modules or inverters")
        if self.free:
            prices = "1 price is" if self.free == 1 else f"{self.free:,} prices are"
            self._note(f"{prices} 0, which was taken for not known")
        if self.other_kinds:
            words = ", ".join(sorted(self.other_kinds)[:6])
            others = sum(self.other_kinds.values())
            left = "1 row of other kinds was" if others == 1 else f"{others:,} rows of other kinds were"
            self._note(f"{left} left out: {words}")
        return StockFile(items, self.notes)

    def _note(self, line: str) -> None:
        self.notes.append(f"{self.table.path}: {line}")

    def _columns(self) -> dict[str, _Column]:
        found: dict[str, _Column] = {}
        left = []
        for k, heading in enumerate(self.table.headings):
            name, near = _field_of(heading)
            if name == "unit_price" and _PER_POWER.search(heading):
                raise CatalogError(
                    f"{self._where()}, {heading}: is a price for power; give the price of a piece in a column 'unit price'"
                )
            if name == "type":
                name = "kind" if self._all_kinds(k) else "model"
            if name is None or (near and name in found):
                if heading:
                    left.append(repr(heading))
                continue
            if name in found:
                raise CatalogError(
                    f"{self._where()}: {found[name].heading!r} and {heading!r} may both be the {name.replace('_', ' ')};"
                    " take one out or name it otherwise"
                )
            if near:
                self._note(f"column {heading!r} was read as {name.replace('_', ' ')}")
            found[name] = _Column(k, heading)
        if left:
            self._note(f"columns left out: {', '.join(left)}")
        if "quantity" not in found:
            raise CatalogError(f"{self._where()}: no column says how many there are; name one 'quantity'")
        if not {"text", "article", "record", "model"} & found.keys():
            raise CatalogError(f"{self._where()}: no column says what they are; name one 'text' or 'article'")
        return found

    def _where(self) -> str:
        return f"{self.table.path}, row {self.table.heading_row}"

    def _all_kinds(self, k: int) -> bool:
        words = [row.cells[k] for row in self.table.rows if row.cells[k] is not None]
        return bool(words) and all(_kind_of(str(word)) for word in words)

    def _price_currency(self) -> str | None:
        column = self.columns.get("unit_price")
        return currency_of(column.heading) if column else None

    def _look_at_prices(self) -> None:
        """The decimal sign of the prices, before any is read."""
        column = self.columns.get("unit_price")
        if column:
            self.signs.look(
                (without_currency(cell), f"row {row.number}")
                for row in self.table.rows
                if isinstance(cell := row.cells[column.place], str)
            )

    def _item(self, row: TableRow) -> StockItem | None:
        kind_words = self._text(row, "kind")
        kind = _kind_of(kind_words)
        if kind_words and kind is None:
            self.other_kinds[kind_words] = self.other_kinds.get(kind_words, 0) + 1
            return None
        article, text = self._text(row, "article"), self._text(row, "text")
        record = self._text(row, "record")
        name = " ".join(filter(None, (self._text(row, "maker"), self._text(row, "model"))))
        if not self._text(row, "model"):
            name = ""
        text = text or record or name
        if not (text or article):
            raise self._bad(row, self._first("text", "article", "record", "model"), "is blank; say what lies there")
        price, currency = self._price(row)
        return StockItem(
            kind=kind,
            quantity=self._quantity(row),
            unit_price=price,
            currency=currency,
            place=self._text(row, "place"),
            article=article,
            text=text,
            named=record or name,
            source=Source(self.table.path.name),
        )

    def _first(self, *names: str) -> str:
        return next(name for name in names if name in self.columns)

    def _cell(self, row: TableRow, name: str) -> Cell:
        column = self.columns.get(name)
        cell = row.cells[column.place] if column else None
        return None if isinstance(cell, str) and cell.casefold() in BLANKS and name != "text" else cell

    def _text(self, row: TableRow, name: str) -> str:
        cell = self._cell(row, name)
        if cell is None:
            return ""
        if isinstance(cell, float) and cell.is_integer() and abs(cell) < 1e15:
            cell = int(cell)
        text = " ".join(str(cell).split())
        if re.match("'[=+@-]", text):
            text = text[1:]  # the mark that keeps a spreadsheet from taking a text for a formula
        if not text.isprintable() or len(text) > 2000:
            raise self._bad(row, name, "holds characters that cannot be printed, or far too many; write it anew")
        return text

    def _quantity(self, row: TableRow) -> int:
        cell = self._cell(row, "quantity")
        if cell is None:
            raise self._bad(row, "quantity", "is blank; write how many there are, 0 where none is left")
        if isinstance(cell, str):
            text = _COUNTED.sub("", cell).strip()
            text = re.sub(r"[.,]0{1,2}$", "", text)
            cell = int(re.sub(r"\D", "", text)) if _WHOLE.fullmatch(text) else cell
        if isinstance(cell, float) and cell.is_integer():
            cell = int(cell)
        if not isinstance(cell, int) or isinstance(cell, bool) or not 0 <= cell < _MOST:
            raise self._bad(row, "quantity", f"{cell!r} is no number of pieces; write a whole number, such as 96")
        return cell

    def _price(self, row: TableRow) -> tuple[float | None, str | None]:
        cell = self._cell(row, "unit_price")
        if cell is None:
            return None, None
        beside = currency_of(cell) if isinstance(cell, str) else None
        try:
            if isinstance(cell, str):
                text = without_currency(cell)
                if _UNCLEAR.fullmatch(text) and not (self.signs.comma or self.signs.point):
                    small, large = sorted((float(text.replace(",", ".")), float(re.sub("[.,]", "", text))))
                    raise CatalogError(f"{cell!r} may be {small:g} or {large:g}; write it with two decimals")
                cell = text
            price = value_of(cell, _PRICE, self.signs, f"row {row.number}")
        except CatalogError as problem:
            raise self._bad(row, "unit_price", str(problem)) from None
        if price is None:
            return None, None
        if not 0 <= price <= 1e9:
            raise self._bad(row, "unit_price", f"{cell!r} is no price; write what one piece costs, or leave it blank")
        if price == 0:
            self.free += 1
            return None, None
        return price, self._currency(row, beside)

    def _currency(self, row: TableRow, beside: str | None) -> str:
        own = self._text(row, "currency")
        stated = currency_of(own) if own else None
        if own and stated is None:
            raise self._bad(row, "currency", f"{own!r} is no currency; write its code, such as EUR")
        if stated and beside and stated != beside:
            raise self._bad(row, "currency", f"is {stated}, but the price is in {beside}; correct one of them")
        found = stated or beside or self.price_currency or self.currency
        if found is None:
            raise self._bad(row, "unit_price", "has no currency; name it in a column 'currency', or load the list with"
                            " --currency, such as --currency EUR")  # fmt: skip
        return found

    def _bad(self, row: TableRow, name: str, message: str) -> CatalogError:
        column = self.columns.get(name)
        heading = column.heading if column else name
        return CatalogError(f"{self.table.path}, row {row.number}, {heading}: {message}")


def _given(currency: str | None) -> str | None:
    if currency is None:
        return None
    found = currency_of(currency)
    if found is None:
        raise CatalogError(f"--currency {currency}: is no currency; write its code, such as EUR")
    return found


def _keys_of(heading: str) -> Iterator[str]:
    """Forms of a heading to look up: as it stands, then without what is in brackets, then without its currency."""
    for text in (heading, re.sub(r"[\[(].*?[\])]", " ", heading), without_currency(re.sub(r"[\[\](){}/]", " ", heading))):
        plain = "".join(c for c in unicodedata.normalize("NFKD", text.casefold()) if not unicodedata.combining(c))
        yield " ".join(re.sub(r"[^a-z0-9]+", " ", plain).split())


def _exact_field(heading: str) -> str | None:
    """The field that a heading means beyond doubt."""
    keys = list(_keys_of(heading))
    found = next((_FIELD[key] for key in keys if key in _FIELD), None)
    if found is None:
        telling = [word for word in keys[-1].split() if word not in _IDLE]
        means = {_FIELD.get(word) for word in telling}
        found = means.pop() if len(means) == 1 else None
    return found


def _field_of(heading: str) -> tuple[str | None, bool]:
    """The field that a heading means, and whether it is only near to a known one."""
    name = _exact_field(heading)
    if name is not None:
        return name, False
    from rapidfuzz import fuzz, process

    for key in _keys_of(heading):
        found = process.extractOne(key, _LONG_KEYS, scorer=fuzz.ratio, score_cutoff=86) if len(key) > 4 else None
        if found:
            return _FIELD[found[0]], True
    return None, False


def _kind_of(words: str) -> str | None:
    words = " ".join(words.casefold().split())
    if _MODULE.fullmatch(words):
        return "module"
    return "inverter" if _INVERTER.fullmatch(words) else None
