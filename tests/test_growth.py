"""The trade-off by module count: steps against every option of the pair, worth by hand and by brute force."""

from __future__ import annotations

import json
import random
from dataclasses import replace

import pytest

import matcher.search
from catalog.errors import CatalogError
from catalog.records import Inputs, Inverter, Site
from catalog_records import MODULE
from cli.wanted import worth_of
from matcher.errors import MatcherError
from matcher.fit import Request, fit
from matcher.growth import Worth, growth, last_that_pays
from random_records import random_case
from test_engine_properties import random_year, request_of

SITE = Site(name="Hand", design_low_c=-10.0, design_high_c=35.0)
BOX = Inverter(
    maker="Quillon", model="QN-5", ac_power_w=3000.0, max_dc_voltage_v=1000.0, mppt_low_v=150.0, mppt_high_v=800.0,
    weighted_efficiency_pct=96.0, inputs=(Inputs(trackers=2, strings_per_tracker=1, max_isc_a=20.0),),
)  # fmt: skip
FITS, TO_CONFIRM = "fits", "to-confirm"


@pytest.mark.parametrize("whole", [matcher.search.WHOLE, 0], ids=["listed", "best first"])
def test_steps_are_the_best_option_of_each_count(monkeypatch, whole):
    monkeypatch.setattr(matcher.search, "WHOLE", whole)
    tried = several = 0
    for seed in range(70):
        case = random_case(random.Random(seed))
        year = random_year(case.module, random.Random(seed))
        try:
            found = fit([case.module], [case.inverter], request_of(case), year)
        except MatcherError:
            continue
        if found.totals.arrangements > 3000:
            continue
        best: dict[int, tuple] = {}
        for option in found.options(full=False):
            key = (option.verdict != FITS, -round(option.yearly_kwh, 6))
            best[option.modules] = min(best.get(option.modules, key), key)
        steps = growth(found)
        assert [s.option.modules for s in steps] == sorted(best), f"seed {seed}"
        for step in steps:
            option = step.option
            assert (option.verdict != FITS, -round(option.yearly_kwh, 6)) == best[option.modules], f"seed {seed}"
        tried += bool(steps)
        several += len(steps) > 2
    assert tried > 15
    assert several > 8


def steps_of(worth: Worth | None, entries: int = 40):
    """Steps of a pair that clips more and more."""
    year = random_year(MODULE, random.Random(7), entries)
    year = replace(year, hours=year.hours * 8760 / 2 / entries)
    return growth(fit([MODULE], [BOX], Request(SITE, ratio=(0.5, 3.0), every=True), year), worth)


def test_added_energy_adds_up():
    steps = steps_of(None)
    assert len(steps) > 10
    assert sum(s.added_modules for s in steps) == steps[-1].option.modules
    assert sum(s.added_kwh for s in steps) == pytest.approx(steps[-1].option.yearly_kwh)
    assert all(s.worth is s.added_worth is s.net is s.pays is None for s in steps)
    assert last_that_pays(steps) is None


@pytest.mark.parametrize("module_price", [50.0, 250.0, 400.0, 600.0, 5000.0])
@pytest.mark.parametrize("own_use", [None, 0.0, 4000.0, 1e9])
@pytest.mark.parametrize("export_price", [0.0, 0.05])
def test_the_last_that_pays_has_the_most_worth(module_price, own_use, export_price):
    """Net worth over the years of each count, by hand; the last that pays is its maximum."""
    worth = Worth(0.25, own_use, export_price, module_price, years=15.0)
    steps = steps_of(worth)

    def net(modules: int, kwh: float) -> float:
        own = kwh if own_use is None else min(kwh, own_use)
        return 15 * (0.25 * own + export_price * (kwh - own)) - module_price * modules

    nets = {s.option.modules: net(s.option.modules, s.option.yearly_kwh) for s in steps}
    last = last_that_pays(steps)
    if last is None:
        assert max(nets.values()) < 0
    else:
        assert nets[last.option.modules] == pytest.approx(max(nets.values()))
        assert max(nets.values()) >= 0
    total = 0.0
    for step in steps:
        total += step.net
        assert total == pytest.approx(nets[step.option.modules])
        assert step.pays == (step.net >= 0)


def test_net_metering_is_worth_no_less_than_a_lower_export_price():
    netted = steps_of(Worth(0.25, None, 0.0, 300.0))
    exported = steps_of(Worth(0.25, 5000.0, 0.08, 300.0))
    unpaid = steps_of(Worth(0.25, 5000.0, 0.0, 300.0))
    for n, e, u in zip(netted, exported, unpaid, strict=True):
        kwh = n.option.yearly_kwh
        assert n.worth == pytest.approx(0.25 * kwh)
        assert e.worth == pytest.approx(0.25 * min(kwh, 5000) + 0.08 * max(0, kwh - 5000))
        assert u.worth == pytest.approx(0.25 * min(kwh, 5000))
    counts = [last_that_pays(s).option.modules for s in (unpaid, exported, netted)]
    assert counts == sorted(counts)
    assert counts[0] < counts[2]


@pytest.mark.parametrize(
    ("prices", "words"),
    [
        (dict(module_price=90.0), "--energy-price"),
        (dict(energy_price=0.2, own_use=4000.0), "--export-price"),
        (dict(energy_price=0.2, export_price=0.05), "--own-use"),
        (dict(energy_price=-0.2), "below 0"),
        (dict(energy_price=0.2, years=0.0), "years"),
        (dict(energy_price=float("nan")), "prices"),
        (dict(energy_price=0.2, module_price=float("inf")), "prices"),
    ],
)
def test_prices_that_do_not_go_together_are_refused(prices, words):
    values = dict(energy_price=None, own_use=None, export_price=None, module_price=None, years=20.0) | prices
    with pytest.raises(CatalogError, match=words):
        worth_of(**values)


# --- on the command line ---------------------------------------------------------------------------------

FIT = ("fit", "-m", "AF6K-270P", "-i", "QN-5000", "--low", "-12", "--high", "38", "--by-count", "--ratio", "0.5..2")
PLACE = ("--lat", "52", "--lon", "4")


def test_the_document_holds_every_step(small_catalog, ferrule):
    ran = ferrule(*FIT, *PLACE, "--energy-price", "0.2", "--module-price", "400", "--json")
    assert ran.status == 0, ran.err
    document = json.loads(ran.out)
    steps = document["by_count"]["steps"]
    counts = [s["modules"] for s in steps]
    assert counts == sorted({o["modules"] for o in document["options"]})
    nets = [sum(s["net"] for s in steps[: k + 1]) for k in range(len(steps))]
    assert document["by_count"]["most_worth_modules"] == counts[nets.index(max(nets))]
    for step in steps:
        same = [o["yearly_kwh"] for o in document["options"] if o["modules"] == step["modules"]]
        assert step["yearly_kwh"] == pytest.approx(max(same))
    assert steps[1]["added_kwh"] == pytest.approx(steps[1]["yearly_kwh"] - steps[0]["yearly_kwh"])


def test_without_weather_there_is_no_worth_and_that_is_said(small_catalog, ferrule):
    ran = ferrule(*FIT, "--energy-price", "0.2", "--module-price", "400")
    assert ran.status == 0, ran.err
    assert "cannot be said" in ran.out and "No module count pays" not in ran.out
    document = json.loads(ferrule(*FIT, "--energy-price", "0.2", "--module-price", "400", "--json").out)
    assert document["by_count"]["most_worth_modules"] is None
    assert all(s["net"] is None and s["worth"] is None for s in document["by_count"]["steps"])


@pytest.mark.parametrize(
    ("module_price", "words"),
    [("1", "still pays"), ("1000000", "No module count pays"), ("200", "no longer pays")],
)
def test_the_screen_says_where_one_more_no_longer_pays(small_catalog, ferrule, module_price, words):
    ran = ferrule(*FIT, *PLACE, "--energy-price", "0.05", "--years", "10", "--module-price", module_price)
    assert ran.status == 0, ran.err
    said = " ".join(ran.out.split())
    assert words in said
    assert sum(w in said for w in ("still pays", "No module count pays", "no longer pays")) == 1


@pytest.mark.parametrize(
    "more", [("--units", "1..2", "--count", "20"), ("--strings", "2x10"), ("--yearly-kwh", "5000", *PLACE)]
)
def test_by_count_is_about_one_unit(small_catalog, ferrule, more):
    ran = ferrule(*FIT, *more)
    assert ran.status == 2 and "--by-count" in ran.err and ran.err.count("\n") == 1
