"""Bundles: nothing that the search lists is called unsound, nothing that it leaves out is called sound, causes are true."""

from __future__ import annotations

import csv
import json
import random
from collections import Counter
from dataclasses import replace
from pathlib import Path

import openpyxl
import pytest
from test_seed_catalog import BUNDLES, INVERTERS, MODULES, SITES

import oracle
from catalog.records import Inputs, Site
from cli.bundle_lists import columns_of
from matcher.anyclimate import ORDINARY_C
from matcher.bench import ANY_RATIO
from matcher.checks import Verdict, verdict
from matcher.errors import MatcherError
from matcher.fit import Request, fit
from matcher.near import checks_of
from matcher.vet import Bundle, Vetter
from random_records import random_case

#: DC/AC ratio up to which brute force goes through all arrangements.
HIGHEST = 2.0

NAMES = list(INVERTERS)
SEED = Vetter(list(INVERTERS.values()))


def seed_bundle(row: dict[str, str], **change) -> Bundle:
    bundle = Bundle(
        MODULES[row["module"]], NAMES.index(row["inverter"]), int(row["modules"]), int(row["inverters"])
    )
    return replace(bundle, **change)


def row_of(article: str) -> dict[str, str]:
    return next(row for row in BUNDLES if row["article"] == article)


# --- against the search and the oracle ----------------------------------------------------------------


@pytest.mark.parametrize("block", range(3))
def test_sound_exactly_where_some_arrangement_passes(block):
    """Every module count of random pairs against brute force over all arrangements, whatever the ratio."""
    sound = unsound = 0
    for seed in range(100 * block, 100 * block + 40):
        case = random_case(random.Random(seed))
        try:
            ways = oracle.arrangements(case.module, case.inverter, case.site, 0.01, HIGHEST, None, case.combiner, most=4_000)
        except oracle.TooMany:
            continue
        best: dict[int, str] = {}
        for arrangement, outcome in ways.items():
            count = sum(s * n for group in arrangement for s, n in group)
            best[count] = min(best.get(count, outcome), outcome)  # "fits" before "to-confirm"
        vetter = Vetter([case.inverter], combiner=case.combiner)
        for count in {*list(best)[:6], *random.Random(seed).sample(range(1, 40), 6)}:
            if count * case.module.pmax_w > HIGHEST * case.inverter.ac_power_w:
                continue
            vetted = vetter.vet(Bundle(case.module, 0, count), case.site, mending=False)
            if vetted.verdict == "no-verdict":
                assert not best, f"seed {seed}"
                continue
            assert vetted.verdict == best.get(count, "does-not-fit"), f"seed {seed}, {count} modules"
            sound += vetted.sound
            unsound += not vetted.sound
            if vetted.option is not None:
                assert vetted.option.modules == count
            elif vetted.wired:
                failed = {c.check for c in vetted.checks if c.stop and c.verdict is Verdict.DOES_NOT_FIT}
                assert set(vetted.failed) == failed and failed
    assert sound > 10 and unsound > 20


def test_every_option_of_the_search_is_sound_on_any_number_of_units():
    tried = 0
    for seed in range(12):
        case = random_case(random.Random(seed))
        for units in (1, 2, 3):
            request = Request(case.site, ratio=(0.3, 2.5), counts=(8, 60), units=(units, units), combiner=case.combiner)
            try:
                options = list(fit([case.module], [case.inverter], replace(request, every=units == 1)).options(20))
            except MatcherError:
                continue
            vetter = Vetter([case.inverter], combiner=case.combiner)
            for option in options:
                tried += 1
                whole = Bundle(case.module, 0, option.modules, units)
                assert vetter.vet(whole, case.site).sound
                # The wiring itself, tracker by tracker, gets the verdict that the search gave it.
                if len(option.wired) == 1:
                    loads = tuple((t.strings, t.in_series) for t in option.arrangement)
                    given = vetter.vet(replace(whole, loads=loads), case.site)
                    assert given.sound and given.verdict <= str(option.verdict)
    assert tried > 50


def test_best_arrangement_is_that_of_the_search():
    """The short way without losses and the engine's own order agree on verdict, string lengths and margin."""
    tried = 0
    for seed in range(24):
        case = random_case(random.Random(seed))
        for count in (12, 18):
            try:
                request = Request(case.site, ratio=ANY_RATIO, counts=(count, count), combiner=case.combiner)
                best = list(fit([case.module], [case.inverter], request).options(1))
            except MatcherError:
                continue
            option = Vetter([case.inverter], combiner=case.combiner).vet(Bundle(case.module, 0, count), case.site).option
            if best:
                tried += 1
                for told in (lambda o: o.verdict, lambda o: len({t.in_series for t in o.arrangement}),
                             lambda o: max(t.in_series for t in o.arrangement)):  # fmt: skip
                    assert told(option) == told(best[0]), f"seed {seed}, {count}"
            else:
                assert option is None
    assert tried > 8


# --- the climate solved for ---------------------------------------------------------------------------


def test_the_window_holds_at_its_edges_and_no_further():
    """Without a site, against the search at sites inside and outside of the window that is told."""
    tried = 0
    for row in BUNDLES:
        bundle = seed_bundle(row)
        vetted = SEED.vet(bundle, None)
        if vetted.option is None:
            continue
        window = vetted.window
        low = max(ORDINARY_C[0], window.coldest_c if window.coldest_c is not None else -99)
        high = min(ORDINARY_C[1], window.hottest_c if window.hottest_c is not None else 99)
        for cold, hot, inside in ((low + 0.05, high - 0.05, True), (low - 1, high, False), (low, high + 1, False)):
            if not inside and (cold < ORDINARY_C[0] or hot > ORDINARY_C[1]):
                continue
            site = Site(name="edge", design_low_c=cold, design_high_c=hot)
            at = SEED.vet(bundle, site, mending=False)
            tried += 1
            if inside:
                assert at.sound, row["article"]
            elif at.sound:
                # Another wiring holds there: then no wiring holds over as wide a span as the one that was told.
                assert site.design_high_c - site.design_low_c <= high - low + 1.01
    assert tried > 20


def test_an_unsound_bundle_is_told_where_it_would_be_sound():
    vetted = SEED.vet(seed_bundle(row_of("LL-B07")), SITES["Butterfield Barn"])
    assert vetted.window.coldest_c == pytest.approx(-11.27, abs=0.01)
    site = replace(SITES["Butterfield Barn"], design_low_c=-11.2)
    assert SEED.vet(seed_bundle(row_of("LL-B07")), site).sound


def test_a_window_is_known_without_a_site_for_what_is_sound_nowhere():
    crowded = SEED.vet(seed_bundle(row_of("LL-B12")), None)
    assert (crowded.verdict, crowded.window, crowded.failed) == ("does-not-fit", None, ("module-count",))


# --- the demo's bundles -------------------------------------------------------------------------------

#: What the lessons of the demo's bundles name as the cause, by hand.
LESSONS = {
    "LL-B07": "max-dc-voltage", "LL-B08": "max-dc-voltage", "LL-B10": "mppt-low", "LL-B11": "module-count",
    "LL-B12": "module-count", "LL-B13": "short-circuit", "LL-B15": "short-circuit", "LL-B20": "array-power",
}  # fmt: skip


@pytest.mark.parametrize("row", BUNDLES, ids=lambda row: row["article"])
def test_the_demos_bundles_are_told_rightly(row):
    for site in [SITES[row["site"]]] if row["site"] else SITES.values():
        vetted = SEED.vet(seed_bundle(row), site)
        assert vetted.verdict == row["expect"]
        assert vetted.failed[:1] == ((LESSONS[row["article"]],) if row["expect"] == "does-not-fit" else ())
        for mend in vetted.mends:
            changed = replace(seed_bundle(row), modules=mend.modules, units=mend.units, inverter=mend.inverter)
            assert SEED.vet(changed, site).verdict == mend.verdict
            same = (mend.modules == vetted.bundle.modules, mend.units == vetted.bundle.units,
                    mend.inverter == vetted.bundle.inverter)  # fmt: skip
            assert sum(same) == 2, "a mend changes one thing"


def test_the_ratio_is_remarked_on_and_never_a_verdict():
    module = MODULES["Quillfeather QF-410H"]
    vetted = SEED.vet(Bundle(module, NAMES.index("Sinewright Cello 25"), 12), SITES["Butterfield Barn"])
    assert vetted.sound and "DC/AC 0.20 is unusual" in vetted.remarks[0]


def test_causes_of_planted_faults():
    """One sound bundle, and what is wrong once a single rating or number is changed."""
    module = MODULES["Quillfeather QF-430X"]
    sound = INVERTERS["Sinewright Cello 10"]
    site = SITES["Butterfield Barn"]
    voc = 10 * module.voc_v * (1 + module.voc_coef_pct / 100 * (site.design_low_c - 25))

    def failed(count: int = 20, inverter=sound, units: int = 1, **bundle) -> str:
        vetted = Vetter([inverter]).vet(Bundle(module, 0, count, units, **bundle), site)
        return "sound" if vetted.sound else vetted.failed[0]

    # Two trackers with one string each, of eleven modules at most.
    one = replace(
        sound, inputs=(Inputs(trackers=2, strings_per_tracker=1, max_isc_a=25.0),), max_dc_voltage_v=1.12 * voc
    )
    points = Vetter([one]).bench(module, site).fit.module_points(0)
    assert failed() == failed(inverter=one) == "sound"
    assert failed(inverter=replace(one, max_dc_voltage_v=voc - 0.5)) == "max-dc-voltage"
    assert failed(inverter=replace(one, mppt_low_v=11.02 * points.vmp_hot_v)) == "mppt-low"
    assert failed(inverter=replace(one, start_voltage_v=11.02 * points.voc_hot_v)) == "start"
    assert failed(inverter=replace(one, inputs=(replace(one.inputs[0], max_isc_a=module.isc_a),))) == "short-circuit"
    assert failed(inverter=replace(one, max_array_power_w=20 * module.pmax_w - 1)) == "array-power"
    assert failed(inverter=replace(one, mppt_high_v=10 * module.vmp_v - 0.1)) == "mppt-high"
    three = replace(one, inputs=(Inputs(trackers=1, strings_per_tracker=3, max_isc_a=80.0),), mppt_low_v=250.0, max_dc_voltage_v=1100.0)
    assert failed(count=29, inverter=three) == "module-count", "a prime of which no strings can be made"
    assert failed(strings=((10, 4),), count=40, inverter=replace(one, max_array_power_w=None)) == "string-inputs"
    assert failed(count=2, units=3) == "module-count"


def test_refusals():
    module = MODULES["Quillfeather QF-430X"]
    with pytest.raises(MatcherError, match="the strings have 22 modules, the bundle has 24"):
        Bundle(module, 0, 24, strings=((11, 2),))
    with pytest.raises(MatcherError, match="needs 2 trackers, and Sinewright Fiddle 3 has 1"):
        SEED.vet(Bundle(module, NAMES.index("Sinewright Fiddle 3"), 12, loads=((1, 6), (1, 6))), SITES["Rimefell"])


# --- the command --------------------------------------------------------------------------------------


@pytest.fixture
def demo(ferrule, demo_catalog: Path):
    """The command on the demo's catalog."""
    return ferrule


ONE = ("vet", "--module", "klassik 275p", "--count", 14, "--inverter", "fiddle 3")


def test_one_bundle_without_a_site_is_told_its_climates(demo):
    ran = demo(*ONE)
    assert ran.status == 0
    assert "Sound where the lowest temperature on record is -11 degC or milder." in ran.out
    assert max(map(len, ran.out.splitlines())) <= 100 and len(ran.out.splitlines()) < 30


def test_one_unsound_bundle_is_told_the_cause_and_the_mend(demo):
    ran = demo(*ONE, "--site", "Butterfield Barn")
    assert ran.status == 1
    assert "does-not-fit: too long in the cold." in ran.out
    assert "13 modules instead of 14 (1x13)" in ran.out
    document = json.loads(demo(*ONE, "--site", "Butterfield Barn", "--json").out)
    (bundle,) = document["bundles"]
    assert document["schema"] == "ferrule.vet/1" and bundle["failed"] == ["max-dc-voltage"]
    assert bundle["mends"][0] == {"kind": "count", "modules": 13, "units": 1, "inverter": "Sinewright Fiddle 3",
                                  "label": "1x13", "verdict": "fits"}  # fmt: skip


def test_a_bundle_that_lacks_a_value_has_no_verdict(demo):
    ran = demo("vet", "-m", "kehraus 245p", "--count", 16, "-i", "fiddle 3")
    assert ran.status == 1 and ran.out.count("no-verdict:") == 1 and "not stated" in ran.out
    assert json.loads(demo("vet", "-m", "kehraus 245p", "--count", 16, "-i", "fiddle 3", "--json").out)["totals"] == {
        "bundles": 1, "fits": 0, "to-confirm": 0, "does-not-fit": 0, "no-verdict": 1
    }  # fmt: skip


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ((), "name one bundle"),
        (("--module", "klassik 275p"), "a bundle needs"),
        ((*ONE[1:], "--low", "-5"), "give both design temperatures"),
        ((*ONE[1:], "--strings", "2x11|1x12,1x13"), "a tracker takes strings of one length"),
        ((*ONE[1:], "--strings", "1x13"), "make them agree"),
        (("nowhere.csv",), "cannot be read"),
    ],
)
def test_bad_input_is_one_line(demo, arguments, said):
    ran = demo("vet", *arguments)
    assert ran.status == 2 and said in ran.err and ran.err.count("\n") == 1 and not ran.out


def test_in_stock_needs_a_stock(ferrule, small_catalog):
    ran = ferrule("vet", "-m", "AF9B-440", "--count", 40, "-i", "QN-8000 Duo", "--low", -12, "--high", 36, "--in-stock")
    assert ran.status == 2 and "no inverter is in stock" in ran.err


def test_the_demos_list(demo, tmp_path):
    import seed_catalog

    path = seed_catalog.path("bundles.csv")
    ran = demo("vet", path, "--all")
    assert ran.status == 1 and "'modules' is modules" in ran.err and "not used: price" in ran.err
    assert "20 bundles: 9 fits, 1 to-confirm, 2 no-verdict, 8 does-not-fit." in ran.out
    for row in BUNDLES:
        (line,) = [part for part in ran.out.splitlines() if row["article"] in part]
        assert f" {row['expect']} " in line
    short = demo("vet", path).out.splitlines()
    assert len(short) <= 32 and max(map(len, short)) <= 100


FAULTS = [
    # article, panel, pcs, WR-type, inverters, expected verdict, word of the reason
    ("S1", "Quillfeather QF-410H", "10", "Sinewright Fiddle 3", "1", "fits", ""),
    ("S2", "QF-430X", "24", "sinewright cello 10", "1", "fits", ""),
    ("S3", "Klassik 270P", "16", "Old Faithful 4.6", "", "to-confirm", ""),
    ("F1", "Klassik 275P", "14", "Fiddle 3", "1", "does-not-fit", "too long in the cold"),
    ("F2", "Meadow 590", "4577", "Mainstay 2500", "1", "fits", ""),
    ("F3", "Meadow 660", "10", "Viola 6", "1", "does-not-fit", "too much current"),
    ("F4", "QF-400H", "7", "Honeycomb Twin 800", "3", "does-not-fit", "wrong count"),
    ("F5", "Meadow 590", "26", "Cello 10", "1", "does-not-fit", "too much array"),
    ("F6", "QF-410H", "2", "Fiddle 3", "1", "does-not-fit", "too short in the heat"),
    ("F7", "Klassik", "14", "Fiddle 3", "1", "no-verdict", "choose among"),
    ("F8", "Kehraus 245P", "16", "Fiddle 3", "1", "no-verdict", "not stated"),
    ("F9", "QF-410H", "ten", "Fiddle 3", "1", "no-verdict", "whole number"),
    ("F10", "Moonbeam 999", "10", "Fiddle 3", "1", "no-verdict", "no module of the catalog"),
]  # fmt: skip


@pytest.mark.parametrize("ending", [".csv", ".xlsx"])
def test_planted_faults_are_each_named_and_nothing_sound_is_called_unsound(demo, tmp_path, ending):
    path = tmp_path / f"list{ending}"
    heading = ["Article", "Panel type", "Qty", "Inverter model", "No. of inverters"]
    rows = [list(f[:5]) for f in FAULTS]
    if ending == ".csv":
        with path.open("w", newline="", encoding="utf-8") as file:
            csv.writer(file, delimiter=";").writerows([heading, *rows])
    else:
        book = openpyxl.Workbook()
        for row in [["Our bundles, spring"], [], heading, *rows]:
            book.active.append([int(v) if v.isdigit() else v for v in row])
        book.save(path)
    out = tmp_path / "out.json"
    ran = demo("vet", path, "--low", -12, "--high", 30, "--out", out)
    assert ran.status == 1
    bundles = json.loads(out.read_text("utf-8"))["bundles"]
    assert [(b["article"], b["verdict"]) for b in bundles] == [(f[0], f[5]) for f in FAULTS]
    for bundle, fault in zip(bundles, FAULTS, strict=True):
        assert fault[6] in f"{bundle['reason']} {bundle.get('cause')}"


def test_files_hold_every_bundle_with_its_reasons(demo, tmp_path):
    import seed_catalog

    for ending in (".csv", ".xlsx"):
        assert demo("vet", seed_catalog.path("bundles.csv"), "--out", tmp_path / f"out{ending}").status == 1
    with (tmp_path / "out.csv").open(encoding="utf-8", newline="") as file:
        told = {row["article"]: row for row in csv.DictReader(file)}
    assert {article: row["verdict"] for article, row in told.items()} == {r["article"]: r["expect"] for r in BUNDLES}
    assert told["LL-B07"]["smallest change"] == "13 modules instead of 14 (1x13)"
    book = openpyxl.load_workbook(tmp_path / "out.xlsx")
    assert book.sheetnames == ["Bundles", "Reasons", "Rests on"]
    bundles = list(book["Bundles"].iter_rows(values_only=True))
    assert len(bundles) == 21 and isinstance(bundles[1][4], int)
    reasons = Counter(row[1] for row in book["Reasons"].iter_rows(min_row=2, values_only=True))
    assert all(reasons[row["article"]] for row in BUNDLES if row["expect"] != "fits")


@pytest.mark.parametrize(
    ("headings", "wanted"),
    [
        (["module", "qty", "inverter", "qty "], {"module": 0, "modules": 1, "inverter": 2, "units": 3}),
        (["SKU", "Module", "Modules", "Inverter", "Inverters"],
         {"article": 0, "module": 1, "modules": 2, "inverter": 3, "units": 4}),
        (["Qty", "Panel", "Inverter model"], {"modules": 0, "module": 1, "inverter": 2}),
        (["Inverter", "pcs", "PV-Module", "pcs."], {"inverter": 0, "units": 1, "module": 2, "modules": 3}),
        (["number of modules", "module type", "inverter type", "location"],
         {"modules": 0, "module": 1, "inverter": 2, "site": 3}),
    ],
)  # fmt: skip
def test_columns_as_people_name_them(headings, wanted):
    assert columns_of(headings) == wanted


def test_a_list_without_the_columns_is_refused(demo, tmp_path):
    path = tmp_path / "list.csv"
    path.write_text("module,inverter\nQF-410H,Fiddle 3\n", encoding="utf-8")
    ran = demo("vet", path)
    assert ran.status == 2 and "no column for modules" in ran.err


def test_only_what_is_in_stock_takes_an_inverters_place():
    available = [name == "Sinewright Cello 10" for name in NAMES]
    row = row_of("LL-B15")
    offered = [m for m in Vetter(list(INVERTERS.values()), available=available).vet(
        seed_bundle(row), SITES[row["site"]]).mends if m.kind == "inverter"]  # fmt: skip
    assert [NAMES[m.inverter] for m in offered] in ([], ["Sinewright Cello 10"])
    anything = [m for m in SEED.vet(seed_bundle(row), SITES[row["site"]]).mends if m.kind == "inverter"]
    assert [NAMES[m.inverter] for m in anything] == ["Sinewright Viola 6"]


def test_checks_of_several_units_name_the_worst():
    row = row_of("LL-B03")
    vetted = SEED.vet(seed_bundle(row), SITES[row["site"]])
    pair = SEED.bench(vetted.bundle.module, vetted.site).pair(vetted.bundle.inverter)
    assert verdict(checks_of(pair, vetted.option.wired)) is vetted.option.verdict
    assert {c.check: c.value for c in vetted.checks}["string-inputs"] == 1
