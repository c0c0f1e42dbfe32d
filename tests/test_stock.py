"""Stock lists: read as people write them, matched to records, kept all or nothing, decisions remembered."""

from __future__ import annotations

import csv
import sqlite3
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import numpy as np
import openpyxl
import pytest
from catalog_records import INVERTERS, MODULES

import seed_catalog
from catalog.currencies import currency_of, without_currency
from catalog.errors import CatalogError
from catalog.stock import StockItem, suggestions
from catalog.stock_file import read_stock_file
from catalog.store import Catalog
from matcher.limits import UNLIMITED
from matcher.shelf import Lots


def written(tmp_path: Path, text: str, name: str = "stock.csv", encoding: str = "utf-8") -> Path:
    path = tmp_path / name
    path.write_text(text, encoding=encoding)
    return path


def refusal(path: Path, currency: str | None = None) -> str:
    with pytest.raises(CatalogError) as refused:
        read_stock_file(path, currency)
    return str(refused.value)


@pytest.fixture
def stocked(store_location: str) -> Catalog:
    with Catalog.open(store_location, create=True) as catalog:
        catalog.load(MODULES, INVERTERS)
        yield catalog


# Reading


def test_the_list_of_the_demo_is_read_as_the_csv_module_reads_it():
    path = seed_catalog.path("stock.csv")
    with path.open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    found = read_stock_file(path)
    assert found.notes == []
    assert [(i.article, i.kind, i.text, str(i.quantity), i.currency, i.place) for i in found.items] == [
        (r["article"], r["kind"], r["text"], r["quantity"], r["currency"], r["place"]) for r in rows
    ]
    assert [i.unit_price for i in found.items] == [float(r["unit_price"]) for r in rows]


@pytest.mark.parametrize(
    ("head", "row", "quantity", "price", "currency"),
    [
        ("Item no.;Description;Qty;Price [EUR]", "A1;Thing;96;69,50", 96, 69.5, "EUR"),
        ("SKU;Product name;In stock (pcs);Net price/pc", "A1;Thing;5.208 pcs;1.090,00 €", 5208, 1090.0, "EUR"),
        ("Art.-Nr.;Bezeichnung;Bestand (Stk);Stückpreis", "A1;Thing;12 Stk;CHF 82,60", 12, 82.6, "CHF"),
        ("Part number|Text|On hand|Unit price (£)", "A1|Thing|1,204|1,090.00", 1204, 1090.0, "GBP"),
        ("Code\tItem description\tAvailable\tPrice\tCurrency", "A1\tThing\t0\t12\tusd", 0, 12.0, "USD"),
        ("Code,Text,Quantitiy,Price", "A1,Thing,7,$5.25", 7, 5.25, "$"),
        ("Code,Text,Qty,Price", "A1,Thing,7,", 7, None, None),
        ("Code,Text,Qty,Price", "A1,Thing,7,0.00", 7, None, None),
    ],
)
def test_columns_and_numbers_as_people_write_them(tmp_path, head, row, quantity, price, currency):
    (item,) = read_stock_file(written(tmp_path, f"{head}\n{row}\n")).items
    assert (item.article, item.text) == ("A1", "Thing")
    assert (item.quantity, item.unit_price, item.currency) == (quantity, price, currency)


def test_a_workbook_with_a_title_is_read(tmp_path):
    book = openpyxl.Workbook()
    book.active.append(["Stock of hall 1, November"])
    book.active.append([])
    book.active.append(["Manufacturer", "Model", "Qty", "Price EUR", "Warehouse"])
    book.active.append(["Alderfell Solar", "AF6K-270P", 12, 31.5, "hall 1"])
    book.active.append(["Alderfell Solar", "AF9B-440", 3.0, None, None])
    path = tmp_path / "stock.xlsx"
    book.save(path)
    first, second = read_stock_file(path).items
    assert (first.named, first.quantity, first.unit_price, first.currency, first.place) == (
        "Alderfell Solar AF6K-270P", 12, 31.5, "EUR", "hall 1",
    )  # fmt: skip
    assert (second.quantity, second.unit_price, second.place) == (3, None, "")


def test_an_old_code_page_is_read_and_said(tmp_path):
    found = read_stock_file(written(tmp_path, "Text;Menge;Preis\nGerät;3;5,00 €\n", encoding="cp1252"))
    assert found.items[0].text == "Gerät" and found.items[0].currency == "EUR"
    assert "Windows-1252" in found.notes[0]


def test_other_goods_are_left_out_and_said(tmp_path):
    found = read_stock_file(written(tmp_path, "kind,text,qty\nsolar panel,A,1\nbattery,B,2\nHybrid inverter,C,3\n"))
    assert [(i.kind, i.text) for i in found.items] == [("module", "A"), ("inverter", "C")]
    assert "1 row of other kinds was left out: battery" in found.notes[0]


def test_every_bad_row_is_told_with_row_and_column(tmp_path):
    text = "Code,Text,Qty,Price EUR\nA,x,many,1.00\nB,y,,2.00\nC,z,3,cheap\n,,4,5.00\nD,w,2.5,1.00\n"
    path = written(tmp_path, text)
    lines = refusal(path).splitlines()
    assert [line.split(": ")[0].strip() for line in lines[:5]] == [
        f"{path}, row 2, Qty", f"{path}, row 3, Qty", f"{path}, row 4, Price EUR", f"{path}, row 5, Text",
        f"{path}, row 6, Qty",
    ]  # fmt: skip
    assert "nothing was kept" in lines[5]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("text,qty,price\nA,1,5.00\n", "has no currency"),
        ("text,qty,price,currency\nA,1,5.00,pounds sterling\n", "is no currency"),
        ("text,qty,price,currency\nA,1,5.00 €,USD\n", "is USD, but the price is in EUR"),
        ("text,qty,price EUR\nA,1,1.090\n", "may be 1.09 or 1090"),
        ("text,qty,price EUR/Wp\nA,1,0.12\n", "is a price for power"),
        ("text,price EUR\nA,1\n", "no column says how many"),
        ("place,qty\nA,1\n", "no column says what they are"),
        ("qty,stock,text\n1,2,A\n", "may both be the quantity"),
        ("nothing,known\n1,2\n", "no row with known column names"),
        ("text,qty\n", "no rows of modules or inverters"),
        ("", "is empty"),
        ('text,qty\n"A,1\n', "the quotes do not match"),
        ("text,qty\nA,1,2\n", "has 3 cells, the heading has 2"),
        ("text,qty\nA,-3\n", "is no number of pieces"),
    ],
)
def test_what_cannot_be_read_is_refused_in_a_line(tmp_path, text, said):
    assert said in refusal(written(tmp_path, text))


def test_an_unclear_price_is_clear_beside_others(tmp_path):
    items = read_stock_file(written(tmp_path, 'text,qty,price EUR\nA,1,"1.090"\nB,1,"12,50"\n')).items
    assert [i.unit_price for i in items] == [1090.0, 12.5]


def test_a_currency_for_prices_without_one(tmp_path):
    path = written(tmp_path, "text,qty,price\nA,1,5.00\n")
    assert read_stock_file(path, "EUR").items[0].currency == "EUR"
    assert "--currency shells" in refusal(path, "shells")


@pytest.mark.parametrize(
    ("name", "content", "said"),
    [
        ("xl/worksheets/sheet1.xml", b"\0" * 2**25, "unpacks to"),
        ("xl/worksheets/sheet1.xml", b'<!DOCTYPE a [<!ENTITY b "bb">]><a>&b;</a>', "definitions that no workbook needs"),
        ("xl/externalLinks/externalLink1.xml", b"<a/>", "links to other files"),
        ("xl/workbook.xml", b"<a/>", "no workbook that can be read"),
    ],
)
def test_a_workbook_that_could_do_harm_or_is_damaged_is_refused(tmp_path, name, content, said):
    """The same guard stands before stock lists as before datasheets."""
    import zipfile

    path = tmp_path / "stock.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as file:
        file.writestr(name, content)
    line = refusal(path)
    assert line.startswith(f"{path}: ") and said in line and "\n" not in line
    path.write_bytes(b"PK\x03\x04 torn")
    assert "is no workbook (XLSX)" in refusal(path)


def test_every_row_that_is_too_wide_is_told(tmp_path):
    path = written(tmp_path, "text,qty\n" + "A,1,2\n" * 13)
    lines = refusal(path).splitlines()
    assert lines[0] == f"{path}, row 2: has 3 cells, the heading has 2" and len(lines) == 11
    assert lines[-1] == "  ... and 3 more; put a cell with the separator in it in quotes"


def test_currencies():
    # Codes and signs: ISO 4217 and the Unicode block "Currency Symbols" (from memory).
    texts = ["69,00 €", "EUR 69", "US$ 5", "$5", "Price (GBP)", "12 CHF", "250 Kč", "neurons", "€ or $"]
    assert [currency_of(t) for t in texts] == ["EUR", "EUR", "USD", "$", "GBP", "CHF", "CZK", None, None]
    assert without_currency("EUR 1.090,-") == "1.090"


# Matching and keeping


def test_articles_are_matched_by_name_and_text_and_what_is_unsure_waits(stocked):
    items = stocked.load_stock(
        [
            StockItem(article="1", text="whatever it says", named="alderfell solar af6k 270p", quantity=5),
            StockItem(article="2", text="ALDERFELL SOL. AF9B 440 bifacial 440Wp", kind="module", quantity=2),
            StockItem(article="3", text="Alderfell module", kind="module", quantity=2),
            StockItem(article="4", text="copper wire", quantity=1),
        ]
    )
    assert [i.confidence for i in items[:2]] == ["named", "sure"]
    assert [i.record for i in items[:2]] == [1, 2] and items[0].kind == "module"
    assert all(i.open and i.record is None for i in items[2:])
    assert [replace(i, id=None) for i in stocked.stock()] == items
    assert {s.id for s in suggestions(items[2], stocked.name_indexes())} >= {1, 2}


def test_a_decision_holds_for_the_next_list_and_for_the_same_text(stocked):
    lot = StockItem(article="9", text="Alderfell old label", kind="module", quantity=4, place="hall 1")
    stocked.load_stock([lot, replace(lot, article="10"), replace(lot, text="Alderfell other label")])
    first = stocked.stock()[0]
    assert stocked.decide_stock(first, ("module", 1)) == 2
    assert [(i.record, i.confidence) for i in stocked.stock()][:2] == [(1, "decided")] * 2
    assert stocked.stock()[2].open
    again = stocked.load_stock([replace(lot, text="ALDERFELL  old label", quantity=1)])
    assert (again[0].record, again[0].confidence) == (1, "decided")
    assert stocked.decide_stock(stocked.stock()[0], None) == 1
    assert stocked.load_stock([lot])[0].confidence == "left-out"


def test_a_decision_of_the_other_kind_is_refused_and_changes_nothing(stocked):
    stocked.load_stock([StockItem(article="9", text="Alderfell label", kind="module", quantity=4)])
    with pytest.raises(CatalogError, match="of the kind module, not inverter"):
        stocked.decide_stock(stocked.stock()[0], ("inverter", 3))
    assert stocked.stock()[0].open
    assert stocked.load_stock([StockItem(article="9", text="Alderfell label", quantity=4)])[0].confidence != "decided"


def test_a_list_takes_the_place_of_the_last_one_or_stands_beside_it(stocked):
    a, b = (StockItem(article=name, text=name, quantity=1, place="hall") for name in "ab")
    stocked.load_stock([a, b])
    stocked.load_stock([b])
    assert [i.article for i in stocked.stock()] == ["b"]
    stocked.load_stock([a, replace(b, quantity=7), replace(b, place="yard")], add=True)
    assert [(i.article, i.quantity, i.place) for i in stocked.stock()] == [
        ("a", 1, "hall"), ("b", 7, "hall"), ("b", 1, "yard"),
    ]  # fmt: skip
    stocked.load_stock([])
    assert stocked.stock() == []


def test_the_texts_of_the_demo_are_matched_as_its_records_say(stocked):
    from catalog.sheetfiles import read_sheets

    files = [read_sheets(seed_catalog.path(name)) for name in ("modules.toml", "inverters.csv")]
    stocked.load([m for f in files for m in f.modules], [i for f in files for i in f.inverters])
    names = {n.id: n.name for kind in ("module", "inverter") for n in stocked.names(kind)}
    listed = read_stock_file(seed_catalog.path("stock.csv")).items
    by_text = stocked.load_stock([replace(i, named="") for i in listed])
    for item, row in zip(by_text, listed, strict=True):
        assert item.record is None or names[item.record] == row.named, row.text
    assert sum(i.confidence == "sure" for i in by_text) >= 0.7 * len(listed)


def test_a_catalog_of_the_first_schema_gets_its_stock_tables_and_a_copy_is_kept(tmp_path):
    path = tmp_path / "old.sqlite"
    with closing(sqlite3.connect(path)) as old:
        old.executescript((Path(__file__).parent / "schema_1.sql").read_text())
    with Catalog.open(path) as catalog:
        assert catalog.stock() == []
        catalog.load_stock([StockItem(text="AF6K-270P", quantity=3)])
    with Catalog.open(path, readonly=True) as catalog:
        assert catalog.stock()[0].quantity == 3
    assert (tmp_path / "old.schema-1.sqlite").exists()


# Prices


def test_cheapest_lots_go_first_and_an_unknown_price_is_an_unknown_cost():
    lots = Lots.of([[(10, 70.0), (5, 65.0)], [(4, None)], [(2, 3.0), (9, None)], []])
    record = np.array([0, 0, 0, 1, 2, 2, 3])
    number = np.array([5, 12, 20, 1, 2, 3, 1])
    # By hand: 5*65; 5*65 + 7*70; 5*65 + 15*70; no price; 2*3; beyond it no price; nothing known.
    expected = [325.0, 815.0, 1375.0, np.nan, 6.0, np.nan, np.nan]
    assert lots.cost(record, number).tolist() == pytest.approx(expected, nan_ok=True)
    assert (lots.pieces[:, -1] == UNLIMITED).all()
