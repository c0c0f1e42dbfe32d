"""``ferrule fit`` as a user runs it: options, documents, files, exit statuses, refusals."""

from __future__ import annotations

import csv
import json
import math
from pathlib import Path
from typing import Any

import pvlib
import pytest

TMY3 = Path(pvlib.__path__[0]) / "data" / "723170TYA.CSV"
MODULE = ("-m", "AF6K-270P")
INVERTER = ("-i", "QN-5000")
COLD_HOT = ("--low", "-12", "--high", "38")
PLACE = ("--lat", "52.1", "--lon", "4.3")

#: Keys of the fit document, by the object that holds them (what `ferrule.fit/1` is).
TOP = {"schema", "site", "rules", "ratio_window", "order", "options", "modules", "inverters", "totals"}
MODULE_KEYS = {
    "maker", "model", "pmax_w", "cell_cold_c", "cell_hot_c", "voc_cold_v", "vmp_hot_v", "vmp_25_v", "vmp_cold_v",
    "isc_design_a", "imp_a",
}  # fmt: skip
OPTION = {
    "rank", "verdict", "module", "inverter", "units", "modules", "arrangement", "label", "dc_ac_ratio",
    "clipping_loss_pct", "yearly_kwh",
}  # fmt: skip
FULL = {"checks", "confirm", "climate"}


def document(ran) -> dict[str, Any]:
    """The document of a run; its numbers are finite."""

    def refuse(text: str) -> None:
        raise AssertionError(f"{text} in the document")

    assert not ran.err, ran.err
    return json.loads(ran.out, parse_constant=refuse)


def check_shape(found: dict[str, Any], full: bool) -> None:
    """Every key of design and schema, none besides; numbers missing are null."""
    assert found["schema"] == "ferrule.fit/1"
    assert set(found) - {"rejected", "energy", "by_count"} == TOP
    assert set(found["site"]) == {"name", "design_low_c", "design_high_c", "mounting", "weather"}
    assert {"name", "isc_factor", "voltage_cap_v"} <= set(found["rules"])
    assert set(found["totals"]) == {"records_considered", "records_with_option", "arrangements"}
    assert [o["rank"] for o in found["options"]] == list(range(1, len(found["options"]) + 1))
    for key, module in found["modules"].items():
        assert key[0] == "m" and set(module) == MODULE_KEYS
    for key, inverter in found["inverters"].items():
        assert key[0] == "i" and set(inverter) == {"maker", "model", "ac_power_w", "trackers"}
    for o in found["options"]:
        assert set(o) - {"split", "clipping_parts"} == (OPTION | FULL if full else OPTION)
        assert o["verdict"] in ("fits", "to-confirm")
        module, inverter = found["modules"][o["module"]], found["inverters"][o["inverter"]]
        assert o["dc_ac_ratio"] == pytest.approx(o["modules"] * module["pmax_w"] / inverter["ac_power_w"] / o["units"])
        wired = o.get("split", [{"units": o["units"], "arrangement": o["arrangement"]}])
        assert sum(u["units"] for u in wired) == o["units"]
        total = 0
        for unit in wired:
            assert 0 < len(unit["arrangement"]) <= inverter["trackers"]
            for t in unit["arrangement"]:
                assert set(t) == {"inputs", "strings", "in_series"} and t["strings"] > 0 and t["in_series"] > 0
                total += unit["units"] * t["strings"] * t["in_series"]
        assert total == o["modules"]
        if full:
            assert set(o["climate"]) == {"coldest_c", "hottest_c"}
            for c in o["checks"]:
                assert set(c) - {"remark"} == {"check", "verdict", "value", "limit", "unit", "margin_pct", "rule"}
                assert c["limit"] != 0
            assert bool(o["confirm"]) == (o["verdict"] == "to-confirm")
            for c in o["confirm"]:
                assert c["record"] in ("module", "inverter")


ASKED = [
    ((*MODULE, *COLD_HOT), True),
    ((*INVERTER, *COLD_HOT), True),
    ((*MODULE, *INVERTER, *COLD_HOT), False),
    ((*MODULE, *INVERTER, *COLD_HOT, "--checks"), True),
    ((*MODULE, *COLD_HOT, "--every"), False),
    ((*MODULE, "--site", "Low Wharf", "--clip-cap", "1"), True),
    ((*MODULE, *COLD_HOT, *PLACE, "--tilt", "20", "--azimuth", "200"), True),
    ((*MODULE, *COLD_HOT, "--weather", TMY3), True),
    ((*MODULE, *COLD_HOT, "--count", "24", "--ratio", "0.5..2"), True),
    ((*MODULE, *COLD_HOT, *PLACE, "--count", "39..41", "--units", "1..3"), True),
    ((*MODULE, *COLD_HOT, "--strings", "2x11,1x12", "--units", "1..2", "--ratio", "0.3..2"), True),
    ((*MODULE, *COLD_HOT, "--mounting", "near-roof", "--voltage-cap", "600", "--rear-share", "0.1"), True),
    ((*MODULE, *COLD_HOT, "--rules", "nec-690", "--combiner", "--by", "margin", "--why"), True),
    ((*MODULE, *COLD_HOT, *PLACE, "--yearly-kwh", "9000"), True),
    ((*MODULE, *COLD_HOT, "--daily-kwh", "20", "--sun-hours", "4"), True),
    ((*MODULE, *INVERTER, *COLD_HOT, *PLACE, "--by-count", "--energy-price", "0.2", "--own-use", "3000",
      "--export-price", "0", "--module-price", "100", "--years", "15"), False),
]  # fmt: skip


@pytest.mark.parametrize(("words", "full"), ASKED, ids=lambda w: " ".join(map(str, w))[14:60] if isinstance(w, tuple) else "")
def test_every_option_of_the_command_once(small_catalog, ferrule, words, full):
    ran = ferrule("fit", *words, "--json")
    assert ran.status == 0, ran.err
    found = document(ran)
    check_shape(found, full)
    assert found["options"]
    assert ("rejected" in found) == ("--why" in words)
    has_year = bool({"--lat", "--weather", "--site", "--sun-hours"} & set(map(str, words)))
    # INVERTER has an efficiency on record, TWO_GROUPS has none: its energy is not known, and no 0.
    known = [o["yearly_kwh"] is not None for o in found["options"] if found["inverters"][o["inverter"]]["model"] == "QN-5000 [240V]"]
    assert all(k == has_year for k in known)
    assert all(o["yearly_kwh"] is None for o in found["options"] if found["inverters"][o["inverter"]]["model"] == "QN-8000 Duo")
    screen = ferrule("fit", *words)
    assert screen.status == 0 and not screen.err
    said = " ".join(screen.out.split())
    if "--by-count" in words:
        assert "by rising count:" in said and "Order:" not in said
    else:
        assert "Order: " + found["order"] in said
    assert "replaces no licensed practice" in said
    assert len(screen.out.splitlines()) <= 40 or {"--checks", "--why"} & set(map(str, words))
    assert all(len(line) <= 100 for line in screen.out.splitlines())


def test_limit_cuts_the_screen_only(small_catalog, ferrule, tmp_path):
    words = ("fit", *MODULE, *INVERTER, *COLD_HOT)
    whole = document(ferrule(*words, "--json"))
    assert document(ferrule(*words, "--limit", "2", "--json")) == whole
    screen = ferrule(*words, "--limit", "2").out
    assert f"... and {len(whole['options']) - 2} more" in screen
    shared = ("fit", *MODULE, *INVERTER, *COLD_HOT, "--count", "30..60", "--units", "1..3")
    found = document(ferrule(*shared, "--json"))
    assert f"... and {len(found['options']) - 1} more" in ferrule(*shared, "--limit", "1").out


@pytest.mark.parametrize("words", [(*MODULE, *COLD_HOT, *PLACE, "--every"), (*INVERTER, *COLD_HOT), (*MODULE, *COLD_HOT, "--count", "40", "--units", "2")])
def test_files_hold_what_the_document_holds(small_catalog, ferrule, tmp_path, words):
    found = document(ferrule("fit", *words, "--json"))
    assert ferrule("fit", *words, "--out", tmp_path / "a.json").out == ""
    assert json.loads((tmp_path / "a.json").read_text(encoding="utf-8")) == found
    assert ferrule("fit", *words, "--out", tmp_path / "a.csv").status == 0
    with (tmp_path / "a.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == len(found["options"])
    for row, o in zip(rows, found["options"], strict=True):
        inverter = found["inverters"][o["inverter"]]
        assert (int(row["rank"]), row["verdict"], row["arrangement"]) == (o["rank"], o["verdict"], o["label"])
        assert (row["inverter_maker"], row["inverter_model"]) == (inverter["maker"], inverter["model"])
        assert (int(row["units"]), int(row["modules"])) == (o["units"], o["modules"])
        assert row["rules"] == found["rules"]["name"]
        for column in ("dc_ac_ratio", "clipping_loss_pct", "yearly_kwh"):
            if o[column] is None:
                assert row[column] == ""
            else:
                assert math.isclose(float(row[column]), o[column], rel_tol=1e-5, abs_tol=1e-9)


def test_nothing_fits_is_status_1_and_says_why(small_catalog, ferrule):
    words = ("fit", *MODULE, *INVERTER, *COLD_HOT, "--count", "23", "--ratio", "1..2")
    ran = ferrule(*words)
    assert ran.status == 1 and not ran.err
    assert "Nothing fits." in ran.out and "Stopped by" in ran.out
    ran = ferrule(*words, "--json")
    assert ran.status == 1
    assert document(ran)["options"] == [] and document(ran)["totals"]["arrangements"] == 0
    ran = ferrule("fit", *MODULE, *COLD_HOT, "--strings", "1x30", "--why", "--json")
    assert ran.status == 1
    assert len(document(ran)["rejected"]) == 2


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ((), "--module NAME, --inverter NAME"),
        ((*INVERTER, *COLD_HOT, "--strings", "2x11"), "--module NAME"),
        (MODULE, "--low and --high"),
        ((*MODULE, "--low", "-12"), "--low and --high"),
        ((*MODULE, "--low", "40", "--high", "-10"), "design low"),
        ((*MODULE, "--low", "nan", "--high", "30"), "design low"),
        ((*MODULE, "--low", "-300", "--high", "30"), "-70 to 40 degC"),
        ((*MODULE, "--site", "Nowhere"), "Nowhere"),
        ((*MODULE, *COLD_HOT, "--ratio", "1.4..0.9"), "low to high"),
        ((*MODULE, *COLD_HOT, "--ratio", "0..1"), "above 0"),
        ((*MODULE, *COLD_HOT, "--ratio", "wide"), "two dots"),
        ((*MODULE, *COLD_HOT, "--count", "60.5"), "whole numbers"),
        ((*MODULE, *COLD_HOT, "--count", "64..56"), "low to high"),
        ((*MODULE, *COLD_HOT, "--count", "-3"), "above 0"),
        ((*MODULE, *COLD_HOT, "--count", "nan"), "above 0"),
        ((*MODULE, *COLD_HOT, "--units", "1..4"), "module count, or strings"),
        ((*MODULE, *COLD_HOT, "--units", "0"), "above 0"),
        ((*MODULE, *COLD_HOT, "--strings", "2*11"), "2x11,1x12"),
        ((*MODULE, *COLD_HOT, "--strings", "0x11"), "2x11,1x12"),
        ((*MODULE, *COLD_HOT, "--strings", "2x11", "--count", "22"), "leave the module count away"),
        ((*MODULE, *COLD_HOT, *PLACE, "--yearly-kwh", "9000", "--count", "30"), "leave --count"),
        ((*MODULE, *COLD_HOT, "--yearly-kwh", "9000"), "needs weather"),
        ((*MODULE, *COLD_HOT, "--sun-hours", "4"), "--daily-kwh or --yearly-kwh"),
        ((*MODULE, *COLD_HOT, "--by-count"), "--module and --inverter"),
        ((*MODULE, *COLD_HOT, "--by", "luck"), "least-inverter"),
        ((*MODULE, *COLD_HOT, "--rules", "nec"), "iec-62548 or nec-690"),
        ((*MODULE, *COLD_HOT, "--clip-cap", "-1"), "0 to 100"),
        ((*MODULE, *COLD_HOT, "--limit", "0"), "--limit"),
        ((*MODULE, *COLD_HOT, "--mounting", "roof"), "open-rack"),
        ((*MODULE, *COLD_HOT, "--lat", "52"), "lon"),
        ((*MODULE, *COLD_HOT, "--weather", "none.epw"), "none.epw"),
        ((*MODULE, *COLD_HOT, "--weather", __file__), "test_cli_fit.py"),
        ((*MODULE, *COLD_HOT, "--out", "result.doc"), ".csv"),
        ((*MODULE, *COLD_HOT, "--out", "no/such/folder/a.csv"), "no/such/folder/a.csv"),
        ((*MODULE, *COLD_HOT, "--catalog", "no/such.sqlite"), "no/such.sqlite"),
    ],
    ids=lambda w: " ".join(map(str, w[2:]))[:50] if isinstance(w, tuple) else "",
)
def test_bad_input_is_one_line_and_status_2(small_catalog, ferrule, words, said):
    ran = ferrule("fit", *words)
    assert ran.status == 2, ran.out
    assert not ran.out
    assert ran.err.startswith("ferrule: ") and ran.err.count("\n") == 1, ran.err
    assert said in ran.err


def test_a_name_that_could_be_two_or_none_lists_candidates(small_catalog, ferrule):
    """Digits decide: a 275 W type is no typing error for a 270 W type."""
    ran = ferrule("fit", "-m", "AF6K-275P", *COLD_HOT)
    assert ran.status == 2 and not ran.out
    assert "no module" in ran.err and "AF6K-270P" in ran.err
    ran = ferrule("fit", "-i", "QN", *COLD_HOT)
    assert ran.status == 2 and not ran.out
    assert "QN-5000" in ran.err and "QN-8000 Duo" in ran.err


def test_names_are_found_as_people_write_them(small_catalog, ferrule):
    for name in ("AF6K-270P", "af6k 270p", "Alderfell Solar AF6K-270P", "alderfell af6k270p"):
        ran = ferrule("fit", "-m", name, *INVERTER, *COLD_HOT, "--json")
        assert ran.status == 0, ran.err
        assert [m["model"] for m in document(ran)["modules"].values()] == ["AF6K-270P"]
