"""Lists of bundles: several processes, clipping in lists, planted faults by brute force, climate windows in words."""

from __future__ import annotations

import csv
import json
import random
from dataclasses import replace
from pathlib import Path

import openpyxl
import pytest
from test_seed_catalog import INVERTERS, MODULES, SITES

import oracle
from catalog.records import Inputs, Inverter
from cli.processes import processes
from cli.vet_parts import Task, vet_all
from cli.vet_words import window_cells, window_short, window_words
from matcher import reach
from matcher.anyclimate import Window
from matcher.near import checks_of
from matcher.rules import DEFAULT_RULES
from matcher.vet import ANYWHERE, Bundle, Vetter
from random_records import random_case

QF = MODULES["Quillfeather QF-430X"]


# --- planted faults, by brute force -------------------------------------------------------------------


def faults(inverter: Inverter, ways: list, at: dict, module, count: int) -> dict[str, Inverter]:
    """One rating changed so that it stops every way to wire the count, each by the check that it breaks."""
    lengths = [[n for group in way for _, n in group] for way in ways]
    longest, shortest = min(map(max, lengths)), max(map(min, lengths))
    dead = tuple(replace(g, max_isc_a=0.99 * module.isc_a) for g in inverter.inputs)
    return {
        "max-dc-voltage": replace(inverter, max_dc_voltage_v=0.999 * longest * at["voc_cold"]),
        "mppt-high": replace(inverter, mppt_high_v=0.999 * longest * at["vmp_25"]),
        "mppt-low": replace(inverter, mppt_low_v=1.001 * shortest * at["vmp_hot"]),
        "array-power": replace(inverter, max_array_power_w=0.999 * count * module.pmax_w),
        "short-circuit": replace(inverter, inputs=dead),
    }


def test_a_planted_fault_is_found_and_what_is_named_fails_by_brute_force():
    named = planted = 0
    for seed in range(60):
        case = random_case(random.Random(seed))
        try:
            ways = oracle.arrangements(case.module, case.inverter, case.site, 0.5, 1.5, None, case.combiner, most=2_000)
            at = oracle.points(case.module, case.site)
        except (oracle.TooMany, oracle.CannotMatch):
            continue
        if not ways:
            continue
        count = oracle.modules_of(random.Random(seed).choice(sorted(ways)))
        alike = [way for way in ways if oracle.modules_of(way) == count]
        bundle = Bundle(case.module, 0, count)
        assert Vetter([case.inverter], combiner=case.combiner).vet(bundle, case.site, mending=False).sound
        for check, faulty in faults(case.inverter, alike, at, case.module, count).items():
            vetted = Vetter([faulty], combiner=case.combiner).vet(bundle, case.site, mending=False)
            assert not vetted.sound, f"seed {seed}, {check}"
            planted += 1
            named += check in vetted.failed
            if vetted.wired:
                (unit,) = vetted.wired
                wiring = tuple(
                    tuple((t.strings, t.in_series) for t in unit.trackers if t.inputs == g)
                    for g in range(len(faulty.inputs))
                )
                found = oracle.checks(case.module, faulty, case.site, wiring, combiner=case.combiner, at=at)
                failing = {name for name in oracle.STOPS if found[name] == oracle.FAIL}
                assert set(vetted.failed) == failing and failing, f"seed {seed}, {check}"
    assert planted > 60 and named > 0.6 * planted


# --- parts of a list ----------------------------------------------------------------------------------


def task(**more) -> Task:
    return Task(tuple(INVERTERS.values()), DEFAULT_RULES, False, None, ANYWHERE, **more)


def questions() -> list:
    names = list(INVERTERS)
    sites = [None, SITES["Butterfield Barn"]]
    bundles = [Bundle(m, names.index(i), n) for m in list(MODULES.values())[:5] for i in names[:3] for n in (9, 14)]
    return [(b, s) for b in bundles for s in sites]


def test_several_processes_find_what_one_finds(monkeypatch):
    monkeypatch.setattr("cli.vet_parts.LONG", 2)
    monkeypatch.setattr("cli.vet_parts.SIZE", 20)
    asked = questions()
    one, two = (sorted(vet_all(task(), asked, jobs), key=lambda f: f[0]) for jobs in (1, 2))
    assert [k for k, _ in one] == list(range(len(asked)))
    for (_, a), (_, b) in zip(one, two, strict=True):
        assert a == b and a.inverters[a.bundle.inverter].name == b.inverter.name
    assert {v.verdict for _, v in one} >= {"fits", "does-not-fit"}


def test_an_interrupt_drops_what_still_waits(monkeypatch):
    """A second shutdown, as on the way out of the pool's own context, would let everything run to its end."""
    calls = []

    class Pool:
        def __init__(self, *_): ...

        def shutdown(self, **how):
            calls.append(how)

    monkeypatch.setattr("cli.processes.ProcessPoolExecutor", Pool)
    with pytest.raises(KeyboardInterrupt), processes(2, print, None):
        raise KeyboardInterrupt
    assert calls == [{"cancel_futures": True}]


def test_a_list_says_what_one_bundle_says():
    vetter = Vetter(list(INVERTERS.values()))
    for k, found in vet_all(task(), questions(), jobs=1):
        bundle, site = questions()[k]
        alone = vetter.vet(bundle, site)
        assert (found.verdict, found.failed, found.wired) == (alone.verdict, alone.failed, alone.wired)
        assert [(m.kind, m.label, m.verdict) for m in found.mends] == [(m.kind, m.label, m.verdict) for m in alone.mends]


@pytest.fixture
def of_place(ferrule, demo_catalog, tmp_path: Path):
    """A list of two bundles vetted at a place, as rows."""
    path, out = tmp_path / "list.csv", tmp_path / "out.csv"
    path.write_text("module,qty,inverter\nQF-410H,36,Cello 10\nQF-410H,24,Cello 10\n", encoding="utf-8")
    place = ("--low", -2, "--high", 44, "--lat", 31.5, "--lon", 34.8, "--catalog", demo_catalog)

    def vet(*more) -> list[dict[str, str]]:
        ran = ferrule("vet", path, *place, *more, "--out", out)
        assert ran.status == 0, ran.err
        with out.open(encoding="utf-8", newline="") as file:
            return list(csv.DictReader(file))

    return vet, lambda n: ferrule("vet", "-m", "QF-410H", "--count", n, "-i", "Cello 10", *place, "--json")


def test_a_list_at_a_place_tells_clipping_and_energy_as_one_bundle_does(of_place):
    vet, alone = of_place
    for row in vet():
        (one,) = json.loads(alone(row["modules"]).out)["bundles"]
        assert float(row["clipping loss [%]"]) == pytest.approx(one["clipping_loss_pct"], abs=0.02)
        assert float(row["yearly energy [kWh]"]) == pytest.approx(one["yearly_kwh"], rel=1e-3)
    assert float(vet()[0]["clipping loss [%]"]) > 1


# --- counts -------------------------------------------------------------------------------------------


def test_a_huge_count_of_small_modules_needs_no_listing():
    """97,883 modules on one tracker without a stated current: every listing of that would exhaust memory."""
    small = replace(QF, pmax_w=5.0)
    site = SITES["Butterfield Barn"]
    wide = replace(INVERTERS["Sinewright Cello 10"], ac_power_w=5e5, inputs=(Inputs(trackers=1),), max_array_power_w=None)
    vetter = Vetter([wide])
    sound, prime = (vetter.vet(Bundle(small, 0, n), site) for n in (97_880, 97_883))
    assert sound.sound and not prime.sound
    assert {m.kind for m in prime.mends} >= {"count"}


@pytest.mark.parametrize("total", range(1, 41))
def test_what_adds_up_is_split_as_evenly_as_can_be(total):
    """Against all multisets of three counts, by hand."""
    counts = (2, 3, 7, 11, 13)
    bits = sum(1 << c for c in counts)
    every = [(a, b, c) for a in counts for b in counts for c in counts if a >= b >= c and a + b + c == total]
    assert reach.adds_up(bits, total, 3) == bool(every)
    found = reach.split(bits, total, 3)
    assert (found is None) == (not every)
    if every:
        assert found in every and max(found) - min(found) == min(max(e) - min(e) for e in every)


def test_like_strings_are_shared_evenly():
    module, inverter = QF, INVERTERS["Sinewright Cello 25"]
    vetter = Vetter([inverter])
    bench = vetter.bench(module, SITES["Butterfield Barn"])
    space = bench.space(0)
    (unit,) = reach.any_wiring(replace(space, fewest=1, most=60), inverter, (40,))
    assert sum(t.strings * t.in_series for t in unit.trackers) == 40
    assert len({t.in_series for t in unit.trackers}) == 1
    assert checks_of(bench.pair(0), (unit,))


# --- climate windows in words -------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("window", "column", "words"),
    [
        (Window(None, None), "no limit", "sound in any climate"),
        (Window(-145.0, 41.6), "no limit to 41", "sound where the highest temperature on record is 41 degC or cooler"),
        (Window(None, 41.6, cold_open=True), "? to 41",
         "sound where the highest temperature on record is 41 degC or cooler; how cold it may get waits for a value to confirm"),
        (Window(-11.3, None, cold_open=True), "-11 to no limit",
         "sound where the lowest temperature on record is -11 degC or milder, once confirmed"),
        (Window(None, None, cold_open=True), "? to no limit",
         "sound as far as is known; how cold it may get waits for a value to confirm"),
        (Window(None, 41.6, by_hours=True), "file to 41",
         "sound in the cold of the weather file, where the highest temperature on record is 41 degC or cooler"),
        (None, "nowhere", "sound in no climate"),
    ],
)  # fmt: skip
def test_no_limit_and_not_known_are_told_apart(window, column, words):
    assert window_short(window) == column and window_words(window) == words


def test_a_list_as_a_page(ferrule, demo_catalog, tmp_path):
    out, path = tmp_path / "x.html", tmp_path / "list.csv"
    rows = "<b>A&1,Klassik 275P,14,Fiddle 3\nA2,QF-410H,2,Fiddle 3\nA3,Moonbeam 999,2,Fiddle 3\n"
    path.write_text(f"article,module,qty,inverter\n{rows}", encoding="utf-8")
    assert ferrule("vet", path, "--low", -12, "--high", 36, "--catalog", demo_catalog, "--out", out).status == 1
    page = out.read_text("utf-8")
    assert page.count('<tr data-verdict="does-not-fit"') == 2 and page.count('<tr data-verdict="no-verdict"') == 1
    assert "&lt;b&gt;A&amp;1" in page and "<b>A" not in page
    assert "13 modules instead of 14 (1x13)" in page and "lethal voltages" in page


def test_one_bundle_as_a_page(ferrule, demo_catalog, tmp_path):
    out = tmp_path / "x.html"
    one = ("vet", "-m", "klassik 275p", "--count", 14, "-i", "fiddle 3", "--catalog", demo_catalog, "--out", out)
    assert ferrule(*one).status == 0
    page = out.read_text("utf-8")
    assert "It fits. Sound where the lowest temperature on record is \u221211\u00a0°C or milder." in page
    assert page.count("<svg") == 1 and page.count('<th scope="row">') == 11
    assert ferrule(*one, "--low", -12, "--high", 36).status == 1
    page = out.read_text("utf-8")
    assert "What would mend it" in page and "13 modules instead of 14 (1x13)" in page and page.count("<svg") == 1
    # Without a weather file the energy is that of a clear sky, and said to be.
    assert ferrule(*one, "--low", -2, "--high", 36, "--lat", 47, "--lon", 1).status == 0
    assert "a year without clouds" in out.read_text("utf-8")


def test_a_name_is_read_aloud_where_it_is_misspelt_and_near_ones_are_named(ferrule, demo_catalog, tmp_path):
    path, out = tmp_path / "list.csv", tmp_path / "out.json"
    rows = "A1,Klasik 270P,11,Viola 5\nA2,qf 430x,16,Cello 10\nA3,QF-420H,10,Fiddle 3\n"
    path.write_text(f"article,module,qty,inverter\n{rows}", encoding="utf-8")
    ran = ferrule("vet", path, "--catalog", demo_catalog)
    said = " ".join(ran.out.split())
    assert ran.status == 1 and "module 'Klasik 270P' read as" in said and "'qf 430x'" not in said
    assert "within -40 to 50 degC in the air, open-rack" in said
    ferrule("vet", path, "--catalog", demo_catalog, "--out", out)
    read, exact, unknown = json.loads(out.read_text("utf-8"))["bundles"]
    assert read["listed"]["module"] == "Klasik 270P"
    assert read["remarks"][0] == "module 'Klasik 270P' read as Marzipan Photovoltaik Klassik 270P"
    assert not any("read as" in remark for remark in exact["remarks"])
    assert "Quillfeather QF-410H" in unknown["reason"] and "Quillfeather QF-400H" in unknown["reason"]


def test_a_list_says_in_every_form_for_which_place_it_holds(ferrule, demo_catalog, tmp_path):
    path = tmp_path / "list.csv"
    path.write_text("module,qty,inverter\nKlassik 275P,14,Fiddle 3\nKlassik 275P,13,Fiddle 3\n", encoding="utf-8")
    asked = ("vet", path, "--low", -12, "--high", 36, "--mounting", "gap-roof", "--catalog", demo_catalog)
    assert "Judged at the site (-12 to 36 degC, gap-roof)." in ferrule(*asked).out
    for ending in (".xlsx", ".html"):
        ferrule(*asked, "--out", tmp_path / f"out{ending}")
    book = openpyxl.load_workbook(tmp_path / "out.xlsx")
    rests_on = {row[1] for row in book["Rests on"].iter_rows(values_only=True)}
    assert "Judged at the site (-12 to 36 degC, gap-roof)." in rests_on and any("clipping" in words for words in rests_on)
    assert "12 to 36\u00a0\u00b0C, gap-roof)" in (tmp_path / "out.html").read_text("utf-8")
    heading, _, sound = book["Bundles"].iter_rows(values_only=True)
    assert sound[heading.index("hottest [degC]")] == "no limit"


@pytest.mark.parametrize(
    ("window", "cells"),
    [
        (None, ("nowhere", "nowhere")),
        (Window(-11.3, None), (-11.3, "no limit")),
        (Window(-145.0, 41.6), ("no limit", 41.6)),
        (Window(None, 41.6, cold_open=True), ("to confirm", 41.6)),
        (Window(None, None, by_hours=True), ("file", "no limit")),
    ],
)
def test_cells_of_a_file_say_why_there_is_no_number(window, cells):
    assert window_cells(window) == cells


def test_progress_counts_rows(demo_catalog):
    from catalog.store import Catalog
    from cli.bundle_lists import BundleRow
    from cli.vet_lists import vet_rows
    from matcher.rules import DEFAULT_RULES
    from matcher.vet import ANYWHERE

    names = ("Klassik 275P", "Klassik 275P", "Moonbeam 999")
    rows = [BundleRow(k, "", name, "14", "Fiddle 3", "", "", "") for k, name in enumerate(names)]
    told = []
    with Catalog.open(demo_catalog, readonly=True) as catalog:
        vet_rows(catalog, rows, None, ANYWHERE, DEFAULT_RULES, False, progress=lambda done, of: told.append((done, of)))
    assert told == [(3, 3)]
