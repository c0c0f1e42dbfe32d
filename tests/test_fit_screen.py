"""The short answer of ``ferrule fit``: one screen, what stands first and why, what to read, and why nothing fits."""

from __future__ import annotations

import json
import random
import re
from dataclasses import replace

import pytest

import cli.fit_growth
import cli.fit_screen
from catalog.errors import CatalogError
from cli.fit_confirm import _of_their_own, ranks_words
from cli.ranges import degrees
from matcher.checks import Confirm, Verdict
from matcher.errors import MatcherError
from matcher.fit import Option, fit
from matcher.nearest_counts import nearest_counts
from random_records import random_case
from test_engine_properties import request_of

KLASSIK = ("fit", "-m", "klassik 270p")
BARN = ("--site", "Butterfield Barn")
QUESTIONS = [
    (*KLASSIK, *BARN),
    (*KLASSIK, *BARN, "--count", "24", "--units", "1..3", "--in-stock", "--by", "cost"),
    (*KLASSIK, "-i", "viola 5", *BARN),
    (*KLASSIK, "-i", "viola 5", *BARN, "--by-count", "--energy-price", "0.2", "--module-price", "150"),
    (*KLASSIK, *BARN, "--yearly-kwh", "11100"),
    ("fit", "-i", "old faithful 4.6", *BARN),
]


@pytest.mark.parametrize("words", QUESTIONS, ids=lambda w: " ".join(w[1:])[:40])
def test_the_short_answer_fits_the_screen_and_uses_it(demo_catalog, ferrule, monkeypatch, words):
    shown = []
    for height in (29, 60):
        for module in (cli.fit_screen, cli.fit_growth):
            monkeypatch.setattr(module, "page_lines", lambda height=height: height)
        out = ferrule(*words).out
        lines = out.splitlines()
        assert len(lines) <= height
        said = " ".join(out.split())
        assert "qualified person decide" in said and "lethal voltages" in said and "cannot be switched off" in said
        shown.append(sum(bool(re.match(r" *\d+ ", line)) for line in lines))
    assert shown == sorted(shown)


def test_a_number_of_options_that_is_asked_for_is_obeyed(demo_catalog, ferrule):
    pair = (*KLASSIK, "-i", "viola 5", *BARN)

    def ranks(*more: str) -> int:
        return len(re.findall(r"^ *\d+ 1x", ferrule(*pair, *more).out, re.MULTILINE))

    assert ranks("--limit", "3") == 3
    assert ranks("--limit", "45") == 45
    assert 8 <= ranks() <= 20
    growth = ferrule(*pair, "--by-count")
    assert "Order:" not in growth.out
    assert "Order:" in ferrule(*pair, "--by-count", "--limit", "2").out


def test_in_short_says_what_stands_first_and_what_would_overtake_it(demo_catalog, ferrule):
    said = " ".join(ferrule(*QUESTIONS[1]).out.split())
    # Prices of the demo: 24 modules at 31 EUR and one Viola 5 at 649 EUR; an Old Faithful is 150 EUR.
    assert "In short: #1, Sinewright Viola 5, costs least, 1,393 EUR, of what fits." in said
    assert "#5, Humdrum Electric Old Faithful 4.6, would stand before it: do not pay before" in said
    # Two like strings of 12 or 11 and 13 of them: the same power; one length goes first.
    said = " ".join(ferrule(*KLASSIK, "-i", "viola 5", *BARN, "--count", "24").out.split())
    assert "#2-3 have the same power in other strings; #1 has fewer string lengths." in said
    # 3 Fiddle 1.5 are 4.5 kW of AC power for 24 * 270 W = 6.48 kW.
    said = " ".join(ferrule(*KLASSIK, *BARN, "--count", "24", "--units", "1..3").out.split())
    assert "#1, 3 x Sinewright Fiddle 1.5, is the least inverter for them (4.50 kW, DC/AC 1.44) that clips" in said


def test_in_short_minds_what_the_order_does_not_see(demo_catalog, ferrule):
    asked = ("fit", "-m", "qf 400h", "--count", "40", "--units", "1..3", *BARN)
    said = " ".join(ferrule(*asked, "--by", "cost").out.split())
    mind = re.search(r"Mind: #(\d) clips 5.68 % where 2 % is the most wanted, yields ([\d,]+) kWh a year less than #1 and brings", said)
    # Two strings of 13.0 A on a tracker of the Old Faithful 4.6, which states 15 A.
    assert mind and "brings 26.0 A to a tracker that takes 15 A and holds it back." in said
    assert "Mind:" not in ferrule(*KLASSIK, *BARN, "--count", "24", "--units", "1..3").out.split("In short")[1]


def test_a_small_screen_keeps_the_command_that_puts_a_value_on_record(demo_catalog, ferrule, monkeypatch):
    monkeypatch.setattr(cli.fit_screen, "page_lines", lambda: 35)
    said = ferrule("fit", "-m", "qf 400h", "--count", "40", "--units", "1..3", *BARN, "--in-stock", "--by", "cost").out
    assert "ferrule sheet amend " in said and "at least 34.3 A (#4), 17.2 A (#5)" in said


def test_the_nearest_miss_is_not_one_of_quite_another_size(demo_catalog, ferrule):
    asked = ("fit", "-m", "qf 430x", "--strings", "2x11@100/30,1x12@280/30", "--units", "2", *BARN)
    said = " ".join(ferrule(*asked).out.split())
    # 22 modules of 430 W on one unit are 9,460 W of 9,000 W; the half of all 34 would be 7,310 W.
    assert "The nearest is Sinewright Viola 6, stopped by array-power: wired as 1 of (1x11 | 1x11) + 1 of (1x12): 9,460 W" in said
    assert "(strings stay whole: they cannot be parted into 7,310 W on each of 2 units)" in said
    told = json.loads(ferrule(*asked, "--why", "--json").out)["rejected"]
    # 34 modules on two inverters of 2.5 MW are DC/AC 0.003, whatever else stops them.
    (nearest,) = (r["nearest"] for r in told if r["model"] == "Mainstay 2500")
    assert nearest.endswith("; and the DC/AC ratio, 0.00, is outside the asked 0.8 to 1.5")


def _waiting(rank: int, at_least: float) -> Option:
    confirm = Confirm("inverter", "max_dc_voltage_v", at_least, "V")
    return Option(rank, Verdict.TO_CONFIRM, 0, 0, 12, (), 1.2, None, None, None, confirm=(confirm,))


def test_what_to_confirm_is_grouped_by_value(demo_catalog, ferrule):
    said = " ".join(ferrule(*KLASSIK, "-i", "old faithful 4.6", *BARN, "--limit", "4").out.split())
    # 2 strings of 12 need more than the top of the MPPT window, those of 9 to 11 do not.
    assert re.search(r"inverter: maximum DC input voltage of at least [\d.]+ V \(#1\) inverter", said)
    assert re.search(r"maximum short-circuit current of one tracker of at least [\d.]+ A \(#1-4\)", said)
    four = [_waiting(1, 500.0), _waiting(2, 600.0), _waiting(3, 550.0), _waiting(4, 520.0)]
    # A few values are told apart on a small screen too: a range would leave open which option needs what.
    for waiting, brief, words in (
        (four[:2], False, "600.0 V (#2), 500.0 V (#1)"),
        (four[:2], True, "600.0 V (#2), 500.0 V (#1)"),
        (four, True, "500.0 to 600.0 V (#1-4)"),
    ):
        (line,) = _of_their_own(waiting, "inverter", brief)
        assert line == f"inverter: maximum DC input voltage of at least {words}"
    assert ranks_words([2, 4, 5, 6, 9]) == "#2, #4-6, #9"


def test_costs_stand_in_checks_and_in_the_report(demo_catalog, ferrule, tmp_path):
    asked = (*KLASSIK, *BARN, "--count", "24", "--in-stock")
    assert "on Sinewright Viola 5, 1,393 EUR" in " ".join(ferrule(*asked, "--checks", "--limit", "2").out.split())
    assert ferrule(*asked, "--out", tmp_path / "a.html").status == 0
    page = (tmp_path / "a.html").read_text(encoding="utf-8")
    assert "cost EUR" in page and "1,393.00" in page


def test_a_count_that_nothing_takes_is_told_the_nearest_that_goes(demo_catalog, ferrule):
    ran = ferrule(*KLASSIK, *BARN, "--count", "1000000")
    assert ran.status == 1
    said = " ".join(ran.out.split())
    most = int(re.search(r"(\d+) modules \(the most that any takes", said)[1])
    assert ferrule(*KLASSIK, *BARN, "--count", str(most)).status == 0
    assert ferrule(*KLASSIK, *BARN, "--count", f"{most + 1}..{2 * most}").status == 1
    strings = ferrule(*KLASSIK, *BARN, "--strings", "1x30")
    assert strings.status == 1 and "The nearest is " in strings.out and "--why says" in strings.out


def test_the_nearest_counts_are_the_nearest():
    """Against the counts of every option that the search lists."""
    tried = between = 0
    for seed in range(60):
        case = random_case(random.Random(seed))
        whole = replace(request_of(case), counts=None)
        try:
            found = fit([case.module], [case.inverter], whole)
        except MatcherError:
            continue
        if not 0 < found.totals.arrangements < 3000 or found.request.several:
            continue
        counts = {o.modules for o in found.options(full=False)}
        gaps = sorted(set(range(1, max(counts) + 3)) - counts)
        for asked in gaps[:: max(1, len(gaps) // 6)]:
            empty = fit([case.module], [case.inverter], replace(whole, counts=(asked, asked)))
            smaller, larger = nearest_counts(empty)
            assert (smaller and smaller.modules) == max((c for c in counts if c < asked), default=None), f"seed {seed}"
            assert (larger and larger.modules) == min((c for c in counts if c > asked), default=None), f"seed {seed}"
            tried += 1
            between += bool(smaller and larger)
    assert tried > 40 and between > 3


@pytest.mark.parametrize(
    ("text", "celsius"), [("-12", -12.0), ("-12,5", -12.5), ("+38.5 °C", 38.5), ("\u22123degC", -3.0), (".5", 0.5)]
)
def test_temperatures_as_people_write_them(text, celsius):
    assert degrees(text, "--low") == celsius


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("14F", "--low 14F: temperatures are in degC; 14 degF is --low -10.0"),  # 14 degF is -10 degC
        ("-40 °F", "-40 degF is --low -40.0"),
        ("273.15 K", "273.15 K is --low 0.0"),
        ("cold", "--low cold: write the temperature in degC as a number"),
        ("-12..30", "as a number"),
    ],
)
def test_temperatures_in_other_units_are_told_what_to_write(text, said):
    with pytest.raises(CatalogError, match=re.escape(said)):
        degrees(text, "--low")


def narrow(monkeypatch, width):
    """Tables are made for a screen of so many columns."""
    from cli import console as terminal

    def screen(stderr=False):
        from rich.console import Console

        return Console(width=width, highlight=False, emoji=False, markup=False)

    monkeypatch.setattr(terminal, "console", screen)


@pytest.mark.parametrize("width", [72, 80, 90, 100])
def test_a_table_keeps_to_the_screen_and_every_number_whole(monkeypatch, width):
    from cli.console import Column, table_lines

    narrow(monkeypatch, width)
    columns = [Column("#", number=True), Column("inverter", fold=True, min_width=30), Column("AC kW", number=True),
               Column("wiring", fold=True), Column("mod.", number=True), Column("kWh/year", number=True),
               Column("cost EUR", number=True), Column("holds at degC", number=True)]  # fmt: skip
    wirings = ["1 unit: 2x7 | 2x7 + 2 units: 1x13 | 1x12 | 3 of 1x11", "1x12"]
    rows = [[str(k + 1), "Humdrum Electric Old Faithful 4.6", "1,004.60", wirings[k % 2], "1,240", "1,226,541", "13,210", "-67 to 66"]
            for k in range(3)]  # fmt: skip
    lines = table_lines(columns, rows)
    assert max(map(len, lines)) <= width
    text = "\n".join(lines)
    for cell in ("1,004.60", "1,240", "1,226,541", "13,210", "-67 to 66"):
        assert text.count(cell) == 3
    assert set(" ".join(wirings).split()) <= set(text.split())


def test_a_text_breaks_at_no_space_that_forbids_it(monkeypatch):
    from cli.console import Column, table_lines

    narrow(monkeypatch, 20)
    lines = table_lines([Column("wiring", fold=True), Column("kWh", number=True)], [["2x7 | 2x7 + 2\u00a0units: 1x13", "1,000"]])
    assert [line.split("  ")[0].rstrip() for line in lines] == ["wiring", "2x7 | 2x7 +", "2 units: 1x13"]


def test_reasons_are_as_many_as_asked_for_whatever_fits(demo_catalog, ferrule):
    words = (*KLASSIK, *BARN, "--ratio", "1.2..1.21", "--why")
    few, all_ = ferrule(*words, "--limit", "2").out, ferrule(*words, "--limit", "50").out
    assert ", 2 of them shown (--limit)" in few
    number = int(re.search(r"Without option: (\d+);", all_)[1])
    assert number > 2 and "shown (--limit)" not in all_


def test_files_say_what_is_in_stock(demo_catalog, ferrule, tmp_path):
    from openpyxl import load_workbook

    words = (*KLASSIK, *BARN, "--count", "24", "--units", "1..2", "--in-stock")
    for ending in ("html", "xlsx"):
        assert ferrule(*words, "--out", str(tmp_path / f"s.{ending}")).status == 0
    page = (tmp_path / "s.html").read_text("utf-8")
    assert "Which inverters in stock take" in page and "In stock: 54 of " in page and "AC kW each" in page
    book = load_workbook(tmp_path / "s.xlsx")
    lines = list(book["Options"].iter_rows(values_only=True))
    pieces = {line[lines[0].index("inverter model")]: line[lines[0].index("in stock")] for line in lines[1:]}
    assert pieces["Viola 5"] == 9
    assert "Which inverters in stock take" in ferrule(*words).out
