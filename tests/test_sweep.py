"""The sweep: the best option of every pair, against the plain search, and as a command that may be killed."""

from __future__ import annotations

import random
import subprocess
import sys
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import pvlib
import pytest

from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.records import Inputs, Inverter, Module, Site
from matcher import shortlist
from matcher.fit import Request, fit
from matcher.moduleyear import ModuleYear, PlaneYear, condense_plane, plane_year
from matcher.singles import expand
from matcher.sweep import Takers, bests, years_of
from matcher.weather import clear_sky_weather, read_weather
from random_records import random_inverter, random_module

ROOT = Path(__file__).parents[1]
DATA = Path(pvlib.__file__).parent / "data"
SITE = Site(name="Quay", design_low_c=-15.0, design_high_c=38.0)


@pytest.fixture(scope="module")
def plane() -> PlaneYear:
    return condense_plane(plane_year(read_weather(DATA / "723170TYA.CSV"), 30.0, 180.0))


@pytest.fixture(scope="module")
def modules() -> list[Module]:
    """Types of the public table, with and without a system voltage; twins; one without a model of its power."""
    rng = random.Random(3)
    found = [replace(m, max_system_voltage_v=rng.choice((None, 600.0, 1000.0))) for m in rng.sample(read_cec_modules(), 12)]
    found.append(replace(found[2], model="Twin"))
    blank = dict.fromkeys(("a_ref", "I_L_ref", "I_o_ref", "R_s", "R_sh_ref", "Adjust", "pmax_coef_pct"))
    found.append(replace(found[3], model="No model", vmp_coef_pct=-0.4, **blank))
    return found


@pytest.fixture(scope="module")
def inverters() -> list[Inverter]:
    """Types of the public table, as they are and changed so that every branch of the order is met."""
    rng = random.Random(4)
    changes = (
        lambda i: {},
        lambda i: {"inputs": (Inputs(trackers=1, max_isc_a=1.4 * i.Pdco / i.Vdco),), "max_dc_voltage_v": 1.1 * i.mppt_high_v},
        lambda i: {"inputs": (Inputs(trackers=1, max_current_a=0.9 * i.Pdco / i.Vdco),)},
        lambda i: {"inputs": (Inputs(trackers=1, strings_per_tracker=2),)},
        lambda i: {"Pso": None, "weighted_efficiency_pct": 95.5},
        lambda i: {"Pso": None, "weighted_efficiency_pct": None},
        # Efficiencies that no inverter has: losses far from those of a mean voltage.
        lambda i: {"C0": 300 * i.C0, "C3": 3 * i.C3},
        lambda i: {"C1": 0.01, "ac_power_w": 0.4 * i.ac_power_w},
        lambda i: {"inputs": (Inputs(trackers=2, strings_per_tracker=2),)},
    )  # fmt: skip
    drawn = rng.sample(read_cec_inverters(), 126)
    found = [replace(i, **changes[k % len(changes)](i)) for k, i in enumerate(drawn)]
    return [*found, replace(found[0], model="Twin"), replace(found[1], model="Twin")]


def best_by_going_through_all(module: Module, inverter: Inverter, request: Request, year: ModuleYear | None):
    """The first of all options of a pair, each worked out, as (verdict, wiring, clipping, energy)."""
    return next(iter(fit([module], [inverter], replace(request, every=True), year).options(1, full=False)), None)


@pytest.mark.parametrize(
    ("cap", "ratio", "weather"),
    [(2.0, (0.8, 1.5), True), (0.0, (0.5, 1.3), True), (0.5, (1.2, 3.0), True), (2.0, (0.8, 1.5), False)],
)
def test_best_of_every_pair_is_the_first_of_all_its_options(plane, modules, inverters, cap, ratio, weather):
    request = Request(SITE, ratio=ratio, clip_cap_pct=cap)
    found = bests(modules, Takers.of_records(inverters), request, plane if weather else None, 2.0)
    years = years_of(modules, plane, 2.0)
    rng = np.random.default_rng(5)
    compared = 0
    for m, i in rng.permutation([(m, i) for m in range(len(modules)) for i in range(len(inverters))])[:250]:
        year = ModuleYear(years.power_w[m], years.vmp_v[m], years.hours) if weather else None
        expected = best_by_going_through_all(modules[m], inverters[i], request, year)
        row = found.rows[m, i]
        assert (row < 0) == (expected is None)
        if expected is None:
            continue
        compared += 1
        t = found.options
        assert t.wired(row) == expected.wired
        assert bool(t.to_confirm[row]) == (expected.verdict == "to-confirm")
        for value, wanted in (
            (t.clipping_pct[row], expected.clipping_loss_pct),
            (t.yearly_kwh[row], expected.yearly_kwh),
        ):
            assert (np.isnan(value) and wanted is None) or value == pytest.approx(wanted, abs=1e-9, rel=1e-12)
    assert compared > 80


def test_few_options_are_worked_out_and_estimates_are_near(plane, modules, inverters, monkeypatch):
    # What makes the sweep quick: the losses of few options are worked out, and estimates do not call for more.
    asked = []
    monkeypatch.setattr("matcher.singlepairs.candidates", lambda *a: asked.append((len(a[0]), found := shortlist.candidates(*a))) or found)
    single = []
    monkeypatch.setattr("matcher.search.expand", lambda *a: single.append(found := expand(*a)) or found)
    plain = [i for i in inverters[::9] if i.Pso is not None]
    columns = Takers.of_records(plain)
    found = bests(modules[:12], columns, Request(SITE), plane, 2.0)
    options = sum(int(e.sizes.sum()) for e in single)
    near, kept = sum(n for n, _ in asked), sum(len(k) for _, k in asked)
    pairs = int((found.rows >= 0).sum())
    assert options > 20 * pairs and near < options / 3 and kept < 2.5 * pairs


def test_estimate_of_clipping_is_within_a_quarter_of_its_margin(modules):
    # Another climate than the one that the margin was chosen on.
    plane = condense_plane(plane_year(clear_sky_weather(-23.0, 133.0, -2.0, 44.0), 10.0, 0.0))
    plain = read_cec_inverters()[::70]
    for module in modules[:6]:
        year = years_of([module], plane, 2.0)
        year = ModuleYear(year.power_w[0], year.vmp_v[0], year.hours)
        found = fit([module], plain, Request(SITE, every=True), year)
        t = found.table
        near = t.take(np.flatnonzero((t.clipping_pct > 1) & (t.clipping_pct < 3)))
        in_series, strings = near.in_series[:, 0], near.strings[:, 0]
        estimates = shortlist.Estimates.of(
            shortlist.Heads.of(year, 2.0), found.search.inverters, np.zeros(len(near), dtype=np.int64), near.inverter,
            in_series, strings * in_series,
        )  # fmt: skip
        estimated = estimates.loss_pct(np.arange(len(near)), strings)
        assert len(near) > 20
        assert np.max(np.abs(estimated - near.clipping_pct) / shortlist.margin(estimated)) < 0.25


def test_random_pairs_with_several_trackers(plane):
    rng = random.Random(6)
    for _ in range(25):
        module = random_module(rng)
        inverter = random_inverter(rng, module, SITE)
        request = Request(SITE, combiner=rng.random() < 0.2)
        found = bests([module], Takers.of_records([inverter]), request, None, 2.0)
        try:
            expected = best_by_going_through_all(module, inverter, request, None)
        except Exception:
            expected = None  # the module cannot be matched
        row = found.rows[0, 0]
        assert (None if row < 0 else found.options.wired(row)) == (None if expected is None else expected.wired)


# -- the command -------------------------------------------------------------------------------------------

WHERE = ("--low", "-12", "--high", "38")
PLACE = (*WHERE, "--lat", "52", "--lon", "4")


def test_csv_and_parquet_hold_what_fit_says(ferrule, small_catalog, tmp_path):
    ran = ferrule("sweep", *PLACE, "--out", tmp_path / "a.csv", "--jobs", 1)
    assert ran.status == 0, ran.err
    assert ferrule("sweep", *PLACE, "--out", tmp_path / "a.parquet", "--jobs", 1).status == 0
    text, binary = pd.read_csv(tmp_path / "a.csv"), pd.read_parquet(tmp_path / "a.parquet")
    assert list(text.columns) == list(binary.columns) and len(text) == len(binary) > 0
    assert f"{len(text)} of 4 pairs go together" in ran.out
    for name in text:
        if text[name].dtype.kind == "f":
            np.testing.assert_allclose(text[name], binary[name].astype(float), rtol=1e-5)
        else:
            assert list(text[name]) == list(binary[name])
    for _, row in text.iterrows():
        inverter = f"{row.inverter_maker} {row.inverter_model}"
        assert ferrule("fit", "--inverter", inverter, *PLACE, "--out", tmp_path / "fit.csv").status == 0
        one = pd.read_csv(tmp_path / "fit.csv")
        one = one[(one.module_maker == row.module_maker) & (one.module_model == row.module_model)].iloc[0]
        assert (row.arrangement, row.verdict) == (one.arrangement, one.verdict)
        assert row.clipping_loss_pct == pytest.approx(one.clipping_loss_pct, rel=1e-6, nan_ok=True)
    assert sorted(p.name for p in tmp_path.glob("a.*")) == ["a.csv", "a.parquet"]


def test_fit_writes_parquet_too(ferrule, small_catalog, tmp_path):
    for form in ("csv", "parquet"):
        ran = ferrule("fit", "--inverter", _first_inverter(small_catalog), *PLACE, "--every", "--out", tmp_path / f"b.{form}")
        assert ran.status == 0, ran.err
    text, binary = pd.read_csv(tmp_path / "b.csv"), pd.read_parquet(tmp_path / "b.parquet")
    assert list(text.columns) == list(binary.columns)
    assert list(text.arrangement) == list(binary.arrangement) and list(binary["rank"]) == list(text["rank"])
    np.testing.assert_allclose(text.clipping_loss_pct, binary.clipping_loss_pct, rtol=1e-5, atol=1e-12)


def test_without_pyarrow_the_extra_is_named(ferrule, small_catalog, tmp_path, monkeypatch):
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    monkeypatch.setitem(sys.modules, "pyarrow.parquet", None)
    for command in (("sweep",), ("fit", "--inverter", _first_inverter(small_catalog))):
        ran = ferrule(*command, *WHERE, "--out", tmp_path / "a.parquet")
        assert ran.status == 2 and "ferrule[parquet]" in ran.err and ran.err.count("\n") == 1
    assert not list(tmp_path.glob("a.parquet*"))


def test_what_is_refused(ferrule, small_catalog, tmp_path):
    ran = ferrule("sweep", *WHERE, "--out", tmp_path / "a.xlsx")
    assert ran.status == 2 and ".csv or .parquet" in ran.err
    ran = ferrule("sweep", *WHERE, "--out", tmp_path / "a.csv", "--modules", "no such words")
    assert ran.status == 2 and "--modules no such words" in ran.err
    ran = ferrule("sweep", *WHERE, "--out", tmp_path / "none" / "a.csv")
    assert ran.status == 2 and "choose another place" in ran.err
    (tmp_path / "b.csv.parts").mkdir()
    (tmp_path / "b.csv.parts" / "diary.txt").write_text("mine")
    ran = ferrule("sweep", *WHERE, "--out", tmp_path / "b.csv")
    assert ran.status == 2 and "holds something else" in ran.err
    assert (tmp_path / "b.csv.parts" / "diary.txt").read_text() == "mine"


def test_chosen_sets(ferrule, small_catalog, tmp_path):
    from catalog.store import Catalog

    with Catalog.open(small_catalog) as catalog:
        module, inverter = catalog.modules()[0], catalog.inverters()[1]
    listed = tmp_path / "list.txt"
    listed.write_text(f"{inverter.name}\n\n")
    ran = ferrule("sweep", *WHERE, "--modules", module.name, "--inverters", listed, "--out", tmp_path / "a.csv")
    assert ran.status in (0, 1) and "of 1 pairs" in ran.out


def test_two_sweeps_do_not_write_one_file(ferrule, small_catalog, tmp_path):
    from filelock import FileLock

    out = tmp_path / "a.csv"
    _some_parts(small_catalog, tmp_path, out, low=-12.0)
    with FileLock(tmp_path / "a.csv.parts" / ".lock"):
        ran = ferrule("sweep", *WHERE, "--out", out)
        assert ran.status == 2 and "another sweep is at work" in ran.err and ran.err.count("\n") == 1
    assert ferrule("sweep", *WHERE, "--out", out).status == 0
    assert not (tmp_path / "a.csv.parts").exists()


def test_parts_of_another_question_are_not_mixed_in(ferrule, small_catalog, tmp_path):
    ferrule("sweep", *WHERE, "--out", tmp_path / "whole.csv")
    out = tmp_path / "a.csv"
    _some_parts(small_catalog, tmp_path, out, low=-12.0)
    ran = ferrule("sweep", *WHERE, "--out", out)
    assert "4 of 4 pairs are there already" in ran.err
    assert out.read_bytes() == (tmp_path / "whole.csv").read_bytes()
    _some_parts(small_catalog, tmp_path, out, low=-30.0)
    ran = ferrule("sweep", *WHERE, "--out", out)
    assert "started afresh" in ran.err and "already" not in ran.err
    assert out.read_bytes() == (tmp_path / "whole.csv").read_bytes()


@pytest.mark.parametrize("form", ["csv", "parquet"])
def test_killed_in_the_middle_and_started_again_gives_the_same_file(cec_catalog, tmp_path, form):
    command = [
        sys.executable, "-m", "cli", "sweep", *PLACE, "--catalog", str(cec_catalog), "--jobs", "2",
        "--modules", "24", "--inverters", "SMA SB50", "--out",
    ]  # fmt: skip

    def run(out: Path) -> subprocess.CompletedProcess[str]:
        return subprocess.run([*command, str(out)], cwd=ROOT, capture_output=True, text=True, timeout=120)

    whole, cut = tmp_path / f"whole.{form}", tmp_path / f"cut.{form}"
    assert run(whole).returncode == 0
    folder = tmp_path / f"cut.{form}.parts"
    process = subprocess.Popen([*command, str(cut)], cwd=ROOT, stderr=subprocess.DEVNULL, stdout=subprocess.DEVNULL)
    deadline = time.monotonic() + 60
    while not list(folder.glob(f"0*.{form}")) and process.poll() is None and time.monotonic() < deadline:
        time.sleep(0.002)
    process.kill()
    process.wait()
    assert folder.exists() and not cut.exists(), "killed too late to prove anything"
    ran = run(cut)
    assert ran.returncode == 0 and "are there already: going on with the rest" in ran.stderr
    assert cut.read_bytes() == whole.read_bytes()
    assert len(pd.read_csv(whole) if form == "csv" else pd.read_parquet(whole)) > 10_000
    assert not folder.exists()


def _first_inverter(location: Path) -> str:
    from catalog.store import Catalog

    with Catalog.open(location) as catalog:
        return catalog.inverters()[0].name


def _some_parts(location: Path, tmp_path: Path, out: Path, low: float) -> None:
    """Leave the parts of a sweep behind, as one that was broken off just before the end."""
    from catalog.store import Catalog
    from cli.asking import request_of
    from cli.sweep_parts import Parts, Task

    with Catalog.open(location) as catalog:
        modules, inverters = catalog.modules(), tuple(catalog.inverters())
    site = Site(name="as given", design_low_c=low, design_high_c=38.0)
    request = request_of(site, "0.8..1.5", None, 2.0, "iec-62548", False, "least-inverter", False)
    parts = Parts(Task(inverters, request, None, None, 2.0, ".csv"), modules, out)
    parts.open()
    assert list(parts.make(1)) == [0]
