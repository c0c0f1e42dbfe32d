"""``ferrule stock`` and ``fit --in-stock``, as a user runs them."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path

import openpyxl
import pytest
from conftest import Ran

import seed_catalog
from catalog.records import Module
from catalog.stock_file import read_stock_file
from catalog.store import Catalog
from matcher.fit import fit as search
from matcher.request import Request

Run = Callable[..., Ran]
CLIMATE = ("--low", "-12", "--high", "37")


@pytest.fixture(scope="module")
def shelf_file(tmp_path_factory) -> Path:
    """A catalog of the demo's datasheets and stock. It is shared: copy it to change it."""
    from catalog.sheetfiles import read_sheets

    path = tmp_path_factory.mktemp("shelf") / "shelf.sqlite"
    with Catalog.open(path, create=True) as catalog:
        files = [read_sheets(seed_catalog.path(name)) for name in ("modules.toml", "inverters.csv")]
        catalog.load([m for f in files for m in f.modules], [i for f in files for i in f.inverters])
        catalog.load_stock(read_stock_file(seed_catalog.path("stock.csv")).items)
    return path


@pytest.fixture
def shelf(shelf_file: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A copy of the demo's catalog, the one that commands use."""
    path = tmp_path / "copy.sqlite"
    path.write_bytes(shelf_file.read_bytes())
    monkeypatch.setenv("FERRULE_CATALOG", str(path))
    return path


@pytest.fixture
def run(ferrule: Run, shelf: Path, monkeypatch: pytest.MonkeyPatch) -> Run:
    monkeypatch.setenv("FERRULE_CATALOG", str(shelf))
    return ferrule


@pytest.fixture
def prices() -> dict[str, float]:
    with seed_catalog.path("stock.csv").open(encoding="utf-8", newline="") as file:
        return {row["record"]: float(row["unit_price"]) for row in csv.DictReader(file)}


def document(ran: Ran) -> dict:
    return json.loads(ran.out)


# Load, list, review, decide


def test_loading_says_what_was_matched_and_what_waits(run: Run):
    ran = run("stock", "load", seed_catalog.path("stock.csv"))
    said = " ".join(ran.out.split())
    assert ran.status == 0
    assert "30 lines in stock: 29 matched to records (29 by the full name), 1 to review." in said
    assert "In the place of the 30 lines before, from stock.csv as it was; 'ferrule stock list --out FILE' keeps" in said
    assert "LL-M13: MARZIPAN KLASSIK poly 60 cells" in said and "1 Marzipan Photovoltaik Klassik 270P" in said
    assert 'ferrule stock decide LL-M13 "Maker Model"' in said


def test_only_what_shares_a_number_or_a_telling_word_is_offered(run: Run, tmp_path: Path):
    unlike = tmp_path / "unlike.csv"
    unlike.write_text(
        "article,quantity\nWibblemoor Sparrow 377,4\ncable 6mm2 red 100 m,3\nQF-415H black,2\nHoneycomb micro,1\n"
    )
    offered: dict[str, list[str]] = {}
    said = run("stock", "load", unlike).out
    assert "from stock.csv; load that list again to have them back" in " ".join(said.split())
    for line in said.partition("is meant:")[2].splitlines():
        if line.startswith("      "):
            offered[list(offered)[-1]].append(line.strip())
        elif line.endswith(("pieces)", "piece)")):
            offered[line.strip()] = []
    none = ["No record is near to it."]
    assert offered["Wibblemoor Sparrow 377 (4 pieces)"] == none == offered["cable 6mm2 red 100 m (3 pieces)"]
    assert offered["QF-415H black (2 pieces)"] == ["1  Quillfeather QF-410H"]
    assert {line.split("  ")[1] for line in offered["Honeycomb micro (1 piece)"]} == {
        "Bumblebridge Honeycomb 380", "Bumblebridge Honeycomb Twin 800",
    }  # fmt: skip


def test_a_bad_list_changes_nothing(run: Run, tmp_path: Path):
    bad = tmp_path / "bad.csv"
    bad.write_text("article,quantity\nA,1\nB,some\n")
    ran = run("stock", "load", bad)
    assert ran.status == 2 and f"{bad}, row 3, quantity: 'some' is no number of pieces" in ran.err
    assert len(document(run("stock", "list", "--json"))["items"]) == 30


def test_the_list_fits_the_screen_and_names_what_waits(run: Run):
    ran = run("stock", "list")
    lines = ran.out.splitlines()
    assert max(map(len, lines)) <= 100
    assert any(line.split()[:5] == ["LL-I03", "Sinewright", "Viola", "5", "named"] for line in lines)
    assert "price EUR" in lines[0]
    assert ran.err == "1 article in stock waits for a decision: ferrule stock review\n"


def test_the_document_of_the_stock(run: Run):
    found = document(run("stock", "list", "--json", "--kind", "module"))
    assert found["schema"] == "ferrule.stock/1"
    assert {i["kind"] for i in found["items"]} == {"module"} and len(found["items"]) == 14
    (unread,) = [i for i in found["items"] if i["record"] is None]
    assert (unread["article"], unread["match"], unread["quantity"]) == ("LL-M13", "none", 12)
    (waiting,) = document(run("stock", "list", "--json", "--open"))["items"]
    assert waiting == unread


def test_an_empty_list_says_why_it_is_empty(run: Run, ferrule: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    assert run("stock", "list", "--open", "--kind", "inverter").out == "No inverter article waits for a decision.\n"
    assert run("stock", "decide", "LL-M13", "--none").status == 0
    assert run("stock", "list", "--open").out == "Nothing waits for a decision.\n"
    monkeypatch.setenv("FERRULE_CATALOG", str(tmp_path / "new.sqlite"))
    with Catalog.open(tmp_path / "new.sqlite", create=True):
        pass
    assert "Nothing is in stock: 'ferrule stock load FILE'" in ferrule("stock", "list", "--open").out


@pytest.mark.parametrize("ending", ["csv", "xlsx"])
def test_what_is_written_can_be_loaded_again(run: Run, tmp_path: Path, ending: str):
    before = document(run("stock", "list", "--json"))["items"]
    out = tmp_path / f"stock.{ending}"
    ran = run("stock", "list", "--out", out)
    assert ran.status == 0 and f"30 lines. Written to {out}." in " ".join(ran.err.split())
    assert run("stock", "load", out).status == 0
    after = document(run("stock", "list", "--json"))["items"]
    for item in (*before, *after):
        item.pop("source")
    assert after == before


def test_text_that_looks_like_a_formula_comes_back_as_it_was(run: Run, tmp_path: Path):
    listed = tmp_path / "list.csv"
    listed.write_text('article,text,quantity\n=1+1,"=HYPERLINK(""x"")",2\n')
    assert run("stock", "load", listed).status == 0
    out = tmp_path / "out.csv"
    run("stock", "list", "--out", out)
    with out.open(newline="") as file:
        (row,) = csv.DictReader(file)
    assert row["article"] == "'=1+1" and row["text"].startswith("'=")
    run("stock", "load", out)
    assert document(run("stock", "list", "--json"))["items"][0]["text"] == '=HYPERLINK("x")'


def test_deciding_by_article_holds_for_the_next_list(run: Run):
    ran = run("stock", "decide", "ll-m13", "klassik 270p")
    assert ran.status == 0 and "Marzipan Photovoltaik Klassik 270P (1 line)" in " ".join(ran.out.split())
    ran = run("stock", "load", seed_catalog.path("stock.csv"))
    assert "1 as decided" in ran.out and "0 to review" in ran.out
    assert run("stock", "review").out.startswith("Nothing waits")
    assert "no record of the catalog" in " ".join(run("stock", "decide", "LL-M13", "--none").out.split())


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("LL-M99", "klassik 270p"), "near to it: LL-M"),
        (("LL-M13", "viola 5"), "no module is called 'viola 5'"),
        (("LL-M13",), "NAME or --none"),
        (("LL-M13", "klassik 270p", "--none"), "NAME or --none"),
    ],
)
def test_decisions_that_cannot_be_made(run: Run, arguments: tuple, said: str):
    ran = run("stock", "decide", *arguments)
    assert ran.status == 2 and said in ran.err


def test_review_asks_on_a_terminal(run: Run, monkeypatch: pytest.MonkeyPatch):
    answers = iter(["99", "2"])
    monkeypatch.setattr("sys.stdin.isatty", lambda: True, raising=False)
    monkeypatch.setattr("typer.prompt", lambda *a, **k: next(answers))
    ran = run("stock", "review")
    assert "no module is called '99'" in " ".join(ran.err.split())
    assert "1 decided, 0 still open." in ran.out
    items = document(run("stock", "list", "--json"))["items"]
    (item,) = [i for i in items if i["article"] == "LL-M13"]
    assert item["record"]["model"] == "Klassik 275P" and item["match"] == "decided"


WAITING = "No,Manufacturer,Model,Description,Qty\nA-1,Paper Sun,P-400,mono black,12\nA-2,,,Paper Sun P-410,1\n"
SHEET = """maker,model,technology,bifacial,pmax_w,voc_v,isc_a,vmp_v,imp_a
Paper Sun,P-400,Mono-c-Si,no,400,45.6,11.2,37.9,10.56
Paper Sun,P-410,Mono-c-Si,no,410,45.8,11.4,38.1,10.77
"""


@pytest.mark.parametrize("loaded_first", [True, False])
def test_articles_whose_datasheet_is_loaded_later_are_matched_again(
    run: Run, shelf: Path, tmp_path: Path, loaded_first: bool
):
    (tmp_path / "list.csv").write_text(WAITING)
    (tmp_path / "sheet.csv").write_text(SHEET)
    said = " ".join(run("stock", "load", tmp_path / "list.csv").out.split())
    assert "A-1: mono black (Paper Sun P-400)" in said and "may not be loaded yet: 'ferrule sheet load FILE'" in said
    assert "A-2" in run("stock", "list").out and "2 articles in stock wait" in run("stock", "list").err
    if loaded_first:
        ran = run("sheet", "load", tmp_path / "sheet.csv")
    else:
        from catalog.sheetfiles import read_sheets

        with Catalog.open(shelf) as catalog:
            catalog.load(read_sheets(tmp_path / "sheet.csv").modules, [])
        ran = run("stock", "review")
        assert "Nothing waits for a decision." in ran.out
    assert "2 articles in stock that waited for a decision are sure now:" in ran.out
    assert "A-1: mono black (Paper Sun P-400): Paper Sun P-400" in ran.out
    assert {i["match"] for i in document(run("stock", "list", "--json"))["items"]} == {"named", "sure"}
    assert "sure now" not in run("stock", "review").out


def test_what_waits_is_said_wherever_the_stock_is_asked(run: Run):
    waits = "1 article in stock waits for a decision: ferrule stock review"
    for command in (
        ("stock", "list", "--json"),
        ("fit", "-m", "klassik 270p", "-i", "viola 5", *CLIMATE, "--in-stock"),
        ("vet", "-m", "klassik 270p", "--count", "40", "-i", "viola 5", *CLIMATE, "--in-stock"),
        ("swap", "-m", "klassik 270p", "-i", "viola 5", "--strings", "1x8|1x8", *CLIMATE, "--in-stock"),
    ):
        ran = run(*command)
        assert ran.status < 2 and waits in ran.err and waits not in ran.out


def test_long_articles_are_shown_whole(run: Run, tmp_path: Path):
    article, text = "A-" + "123456789-" * 5, "Something nobody knows " * 4
    (tmp_path / "list.csv").write_text(f"article,text,qty,price,currency,place\n{article},{text},1,5,EUR,Hall 1\n")
    run("stock", "load", tmp_path / "list.csv")
    out = run("stock", "list").out
    assert max(map(len, out.splitlines())) <= 100
    assert article in out.replace("\n", "").replace(" ", "") or all(p in out for p in article.split("-"))
    assert out.count("nobody") == 4


# Fit


def test_costs_are_modules_and_inverters_at_their_prices(run: Run, prices: dict[str, float]):
    found = document(run("fit", "-m", "klassik 270p", *CLIMATE, "--count", "24", "--units", "1..3", "--in-stock", "--json"))
    assert found["stock"]["currency"] == "EUR" and "54 of Marzipan" in found["stock"]["notes"][0]
    assert found["options"]
    for option in found["options"]:
        inverter = found["inverters"][option["inverter"]]
        each = prices[f"{inverter['maker']} {inverter['model']}"]
        assert option["cost"] == pytest.approx(24 * prices["Marzipan Photovoltaik Klassik 270P"] + option["units"] * each)
        assert option["currency"] == "EUR"
    names = {i["model"] for i in found["inverters"].values()}
    assert "Viola 5" in names and "Viola 6" not in names  # none of it is left


@pytest.mark.parametrize("direction", [("-m", "klassik 270p"), ("-i", "cello 10")])
def test_by_cost_orders_each_verdict_by_what_it_costs(run: Run, direction: tuple[str, str]):
    found = document(run("fit", *direction, *CLIMATE, "--by", "cost", "--every", "--in-stock", "--json"))
    assert "by rising cost" in found["order"]
    for verdict in ("fits", "to-confirm"):
        costs = [o["cost"] for o in found["options"] if o["verdict"] == verdict]
        assert costs == sorted(costs)
    assert found["options"]


def test_the_cheapest_of_each_record_is_the_least_of_all_its_options(run: Run):
    """Also for inverters whose options are gone through without listing them all."""
    asked = ("fit", "-m", "qf-410h", *CLIMATE, "--by", "cost", "--in-stock", "--json")
    best = document(run(*asked))
    pair = document(run(*asked, "-i", "cello 25"))
    (first,) = [o for o in best["options"] if o["inverter"] == pair["options"][0]["inverter"]]
    assert first["cost"] == min(o["cost"] for o in pair["options"] if o["verdict"] == first["verdict"])
    assert {m["model"] for m in best["inverters"].values()} >= {"Hive 110", "Cello 25"}


def test_no_option_takes_more_than_is_in_stock(run: Run):
    found = document(run("fit", "-i", "larder 12t", *CLIMATE, "--every", "--in-stock", "--json"))
    left = {(i["record"] or {}).get("model"): i["quantity"] for i in document(run("stock", "list", "--json"))["items"]}
    most: dict[str, int] = {}
    for option in found["options"]:
        model = found["modules"][option["module"]]["model"]
        most[model] = max(most.get(model, 0), option["modules"])
    assert most and all(count <= left[model] for model, count in most.items())
    # One type at least is bound by the shelf and not by the ratings.
    assert any(count == left[model] for model, count in most.items())


def test_what_is_missing_is_said(run: Run):
    said = " ".join(run("fit", "-m", "klassik 270p", *CLIMATE, "--count", "60", "--in-stock").out.split())
    assert "In stock: 54 of Marzipan Photovoltaik Klassik 270P; 6 of 60 modules are missing." in said
    said = " ".join(run("fit", "-i", "viola 6", *CLIMATE, "--in-stock").out.split())
    assert "In stock: 0 of Sinewright Viola 6; 1 of 1 inverter is missing." in said
    said = " ".join(run("fit", "-i", "hive 50", *CLIMATE, "--count", "120", "--in-stock").out.split())
    assert "Left out, fewer than 120 in stock:" in said and "Quillfeather QF-430X (93)" in said


def test_without_stock_everything_is_as_before(run: Run):
    plain = document(run("fit", "-m", "klassik 270p", *CLIMATE, "--json"))
    assert "stock" not in plain and "cost" not in plain["options"][0]
    assert "cost" not in run("fit", "-m", "klassik 270p", *CLIMATE).out


def test_costs_in_files(run: Run, tmp_path: Path):
    for ending in ("csv", "xlsx"):
        run("fit", "-m", "klassik 270p", *CLIMATE, "--in-stock", "--out", tmp_path / f"x.{ending}")
    with (tmp_path / "x.csv").open(newline="") as file:
        rows = list(csv.DictReader(file))
    sheet = openpyxl.load_workbook(tmp_path / "x.xlsx")["Options"]
    head = [cell.value for cell in sheet[1]]
    costs = [row[head.index("cost [EUR]")].value for row in sheet.iter_rows(min_row=2)]
    assert [float(r["cost"]) for r in rows] == pytest.approx(costs)
    assert {r["currency"] for r in rows} == {"EUR"}


def test_prices_in_two_currencies_are_not_added_up(run: Run, tmp_path: Path):
    mixed = tmp_path / "mixed.csv"
    mixed.write_text(
        "record,kind,quantity,price,currency\nMarzipan Photovoltaik Klassik 270P,module,40,31,EUR\n"
        "Sinewright Viola 5,inverter,3,700,USD\nSinewright Fiddle 3,inverter,3,400,EUR\nSinewright Cello 10,inverter,1,,\n"
    )
    run("stock", "load", mixed)
    ran = run("fit", "-m", "klassik 270p", *CLIMATE, "--in-stock", "--by", "cost", "--json")
    found = document(ran)
    cost = {found["inverters"][o["inverter"]]["model"]: o["cost"] for o in found["options"]}
    assert cost["Viola 5"] is None and cost["Cello 10"] is None and cost["Fiddle 3"] == pytest.approx(400 + 9 * 31)
    assert next(iter(cost)) == "Fiddle 3"
    notes = " ".join(found["stock"]["notes"])
    assert "priced in other than EUR: Sinewright Viola 5" in notes and "1 inverter without a price" in notes


@pytest.mark.parametrize(("list_", "said"), [(None, "no stock list is kept"), ("text,quantity\nxyzzy,3\n", "stock review")])
def test_in_stock_needs_a_list(ferrule: Run, small_catalog: Path, tmp_path: Path, list_: str | None, said: str):
    if list_:
        (tmp_path / "s.csv").write_text(list_)
        assert ferrule("stock", "load", tmp_path / "s.csv").status == 0
    ran = ferrule("fit", "-m", "af6k 270p", *CLIMATE, "--in-stock")
    assert ran.status == 2 and said in ran.err


# Grid


@pytest.fixture
def grid(shelf_file: Path, run: Run) -> dict:
    """The document of the demo's grid, made once."""
    kept = shelf_file.with_suffix(".grid.json")
    if not kept.exists():
        ran = run("stock", "grid", *CLIMATE, "--json")
        assert ran.status == 0
        kept.write_text(ran.out)
    return json.loads(kept.read_text())


def test_the_grid_agrees_with_the_search_of_each_pair(grid: dict, shelf: Path):
    """Verdict, fewest and most modules, and the best ratio of a pair come out of the options of that pair."""
    from catalog.records import Site

    assert grid["schema"] == "ferrule.grid/1"
    site = Site(name="as given", design_low_c=-12.0, design_high_c=37.0)
    with Catalog.open(shelf, readonly=True) as catalog:
        modules = {f"m{m.id}": m for m in catalog.modules()}
        inverters = {f"i{i.id}": i for i in catalog.inverters()}
    pairs = {(p["module"], p["inverter"]): p for p in grid["pairs"]}
    assert len(pairs) > 90
    checked = 0
    for (m, i), pair in sorted(pairs.items()):
        if inverters[i].ac_power_w > 12_000:
            continue  # thousands of options each
        options = _options(modules[m], inverters[i], site, grid["modules"][m]["pieces"])
        same = [o for o in options if o[0] == pair["verdict"]]
        assert {o[0] for o in options} <= {"to-confirm", pair["verdict"]}
        counts = {o[1] for o in same}
        assert (pair["fewest"], pair["most"], pair["counts"]) == (min(counts), max(counts), len(counts))
        assert pair["best"]["dc_ac_ratio"] == pytest.approx(max(o[2] for o in same))
        checked += 1
    assert checked > 50


def _options(module: Module, inverter, site, pieces: int) -> list[tuple[str, int, float]]:
    found = search([module], [inverter], Request(site=site, every=True, counts=(1, pieces)))
    return [(str(o.verdict), o.modules, o.dc_ac_ratio) for o in found.options(full=False)]


def test_what_goes_with_nothing_is_named_with_what_stops_it(grid: dict):
    models = {key: m["model"] for key, m in grid["modules"].items()}
    paired = {p["module"] for p in grid["pairs"]}
    alone = {models[a["module"]]: a for a in grid["alone"] if a["kind"] == "module"}
    assert set(alone) == {model for key, model in models.items() if key not in paired}
    assert "max-dc-voltage" in alone["Crepe 120"]["failed"] or "mppt-low" in alone["Crepe 120"]["failed"]
    assert "cannot be matched" in alone["Kehraus 245P"]["nearest"]


def test_the_grid_on_screen_is_one_screen_or_the_whole(run: Run, monkeypatch: pytest.MonkeyPatch, capsys):
    from cli import grid_screen, grid_short

    made = []
    monkeypatch.setattr(grid_short, "show", made.append)
    assert run("stock", "grid", *CLIMATE).status == 0
    capsys.readouterr()

    # A terminal of 36 lines, and a pipe: what goes with nothing comes first, and every pair has its letter.
    for room in (34, 39):
        short = grid_short.lines(made[0], room)
        assert len(short) <= room and max(map(len, short)) <= 100
        said = " ".join(" ".join(short).split())
        assert said.index("Go with nothing in stock") < said.index("pairs of 13 modules")
        assert "Kehraus 245P (48): cannot be matched" in said and "F fits, C to confirm" in said
        rows = [line for line in short if line.split()[-1:] in (["C"], ["F"], ["-"]) and "(" in line]
        assert sum(line.split(")")[1].count("F") + line.split(")")[1].count("C") for line in rows) == len(made[0].grid.pairs)
    # However low it is: some of both, and how to see the rest.
    low = " ".join(grid_short.lines(made[0], 20))
    assert "and 7 modules more (--all shows them)" in low and "Griddle 475" in low

    grid_screen.show(made[0])
    whole = capsys.readouterr().out.splitlines()
    assert max(map(len, whole)) <= 100
    assert any(line.startswith("Marzipan Photovoltaik") and "F 5-8" in line for line in whole)
    assert any("Go with nothing in stock (modules)" in line for line in whole[:6])


def test_the_grid_as_files(run: Run, tmp_path: Path):
    few = tmp_path / "few.csv"
    few.write_text(
        "record,kind,quantity\nMarzipan Photovoltaik Klassik 270P,module,54\nQuillfeather QF-410H,module,9\n"
        "Pancake Thin Films Crepe 120,module,61\nSinewright Fiddle 1.5,inverter,3\nSinewright Viola 5,inverter,1\n"
        "Humdrum Electric Old Faithful 4.6,inverter,2\nHumdrum Electric Mainstay 2500,inverter,1\n"
    )
    run("stock", "load", few)
    grid = document(run("stock", "grid", *CLIMATE, "--json"))
    for ending in ("csv", "xlsx", "json", "svg", "png"):
        ran = run("stock", "grid", *CLIMATE, "--out", tmp_path / f"g.{ending}")
        assert ran.status == 0 and f"Written to {tmp_path / f'g.{ending}'}." in " ".join(ran.err.split())
    with (tmp_path / "g.csv").open(newline="") as file:
        rows = list(csv.DictReader(file))
    fits = [r for r in rows if r["verdict"] != "does-not-fit"]
    assert len(fits) == len(grid["pairs"]) and len(rows) - len(fits) == len(grid["alone"])
    assert json.loads((tmp_path / "g.json").read_text()) == grid
    book = openpyxl.load_workbook(tmp_path / "g.xlsx")
    cells = [cell.value for row in book["Grid"].iter_rows(min_row=2, min_col=3) for cell in row if cell.value]
    assert sum(str(c)[:2] in ("F ", "C ") for c in cells) == len(grid["pairs"])
    assert book["Pairs"].max_row == 1 + len(rows)
    picture = (tmp_path / "g.svg").read_text(encoding="utf-8")
    # A verdict is told by its letter as well as by its colour.
    assert "<svg" in picture and "F  1.44" in picture and "Klassik 270P (54)" in picture
    assert (tmp_path / "g.png").read_bytes().startswith(b"\x89PNG")


def test_a_grid_of_nothing_and_a_form_that_is_none(run: Run):
    assert run("stock", "grid", *CLIMATE, "--ratio", "40..50").status == 1
    ran = run("stock", "grid", *CLIMATE, "--out", "grid.doc")
    assert ran.status == 2 and ".csv, .json, .xlsx, .svg or .png" in ran.err
