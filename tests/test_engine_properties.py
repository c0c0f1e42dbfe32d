"""The engine against the brute-force oracle on random records, and properties that must hold of any engine.

Every failure names its seed: ``random_case(random.Random(seed))`` is the case.
"""

from __future__ import annotations

import random
from collections import Counter, defaultdict
from dataclasses import replace

import pytest

import matcher.fit
import matcher.search
import oracle
from catalog.records import Inputs, Inverter, Module
from matcher.checks import Pair, Tracker, check_option, verdict
from matcher.electrical import design_points
from matcher.errors import MatcherError
from matcher.fit import Fit, Option, Request, fit, module_points
from matcher.rules import DEFAULT_RULES
from matcher.singlediode import six_parameters
from random_records import Case, fit_module, random_case, random_inverter, random_site

#: How the oracle's verdict of one check is called by the engine.
NAMES = {oracle.PASS: "fits", oracle.OPEN: "to-confirm", oracle.FAIL: "does-not-fit"}


def request_of(case: Case) -> Request:
    """The case's question as the engine takes it."""
    counts = None if case.counts is None else (min(case.counts), max(case.counts))
    ratio = (case.ratio_low, case.ratio_high)
    return Request(case.site, ratio=ratio, counts=counts, combiner=case.combiner, every=True)


def form(option: Option, inverter: Inverter) -> oracle.Arrangement:
    """An option's arrangement in the oracle's form."""
    return tuple(
        tuple(sorted((t.strings, t.in_series) for t in option.arrangement if t.inputs == g))
        for g in range(len(inverter.inputs))
    )


def verdicts(result: Fit) -> dict[oracle.Arrangement, str]:
    """All arrangements of a search of one pair with their verdicts; asserts that none comes twice."""
    options = list(result.options(full=False))
    found = {form(o, result.inverters[0]): str(o.verdict) for o in options}
    assert len(found) == len(options) == result.totals.arrangements
    return found


def by_engine(case: Case) -> dict[oracle.Arrangement, str]:
    """All arrangements of a case with their verdicts; none where the engine refuses the module."""
    try:
        return verdicts(fit([case.module], [case.inverter], request_of(case)))
    except MatcherError:
        return {}


def by_oracle(case: Case) -> dict[oracle.Arrangement, str]:
    """The same by brute force."""
    ratio = (case.ratio_low, case.ratio_high)
    return oracle.arrangements(
        case.module, case.inverter, case.site, *ratio, case.counts, case.combiner, most=4_000
    )


def cases(seeds: range) -> list[tuple[int, Case]]:
    """Seeded random cases."""
    return [(seed, random_case(random.Random(seed))) for seed in seeds]


# --- against the oracle -----------------------------------------------------------------------------


@pytest.mark.parametrize("block", range(4))
def test_same_arrangements_and_verdicts(block):
    walked = some = 0
    for seed, case in cases(range(100 * block, 100 * block + 100)):
        try:
            wanted = by_oracle(case)
        except oracle.TooMany:
            continue
        walked += 1
        some += bool(wanted)
        assert by_engine(case) == wanted, f"seed {seed}"
    assert walked > 80
    assert some > 20


def test_same_arrangements_best_first(monkeypatch):
    """The lazy way lists the same, and in order, as when all options are sorted at once."""
    for _, case in cases(range(1000, 1120)):
        year = random_year(case.module, random.Random(1))

        def options(case=case, year=year, **change) -> list[Option]:
            request = replace(request_of(case), **change)
            return list(fit([case.module], [case.inverter], request, year).options(full=False))

        eager = options()
        with monkeypatch.context() as patch:
            patch.setattr(matcher.search, "WHOLE", 0)
            patch.setattr(matcher.fit, "WHOLE_EVERY", 0)
            lazy, best = options(), options(every=False)
        assert {form(o, case.inverter) for o in lazy} == {form(o, case.inverter) for o in eager}
        assert [in_order(o, case) for o in lazy] == [in_order(o, case) for o in eager]
        assert [in_order(o, case) for o in best] == [in_order(o, case) for o in eager[:1]]


def test_same_arrangements_with_parameters_fitted_to_a_datasheet():
    """The oracle takes the fitted parameters as the record's own; the fit itself is tested elsewhere."""
    some = 0
    for seed in range(25):
        rng = random.Random(seed)
        bare = fit_module(rng)
        six = six_parameters(bare)
        names = ("a_ref", "I_L_ref", "I_o_ref", "R_s", "R_sh_ref", "Adjust")
        module = replace(bare, **{name: float(getattr(six, name)) for name in names})
        site = random_site(rng)
        case = Case(module, random_inverter(rng, module, site), site, 0.8, 1.5, None, False)
        try:
            wanted = by_oracle(case)
        except oracle.TooMany:
            continue
        some += bool(wanted)
        assert by_engine(replace(case, module=bare)) == wanted, f"seed {seed}"
    assert some > 5


def random_arrangement(rng: random.Random, inverter: Inverter) -> oracle.Arrangement:
    """Any arrangement, valid or not."""
    while True:
        used = [rng.randint(0, group.trackers) for group in inverter.inputs]
        if any(used):
            return tuple(
                tuple(sorted((rng.randint(1, 3), rng.randint(1, 12)) for _ in range(n))) for n in used
            )


def test_same_verdict_of_every_check():
    """Also of arrangements that do not fit."""
    for seed, case in cases(range(300)):
        rng = random.Random(seed)
        points = module_points(design_points([case.module], case.site, DEFAULT_RULES), 0)
        pair = Pair(case.module, points, case.inverter, case.site, DEFAULT_RULES, case.combiner)
        for _ in range(4):
            arrangement = random_arrangement(rng, case.inverter)
            trackers = [Tracker(g, s, n) for g, used in enumerate(arrangement) for s, n in used]
            wanted = oracle.checks(case.module, case.inverter, case.site, arrangement, combiner=case.combiner)
            found = check_option(pair, trackers)
            assert str(verdict(found)) == oracle.verdict(wanted), f"seed {seed}: {arrangement}"
            by_name = defaultdict(set)
            for check in found:
                by_name[check.check].add("does-not-fit" if check.verdict == "note" else str(check.verdict))
            for name, asked in wanted.items():
                if name == "input-current" and asked == oracle.OPEN:
                    continue  # a note, told only of the trackers whose limit is stated
                seen = max(by_name[name], key=tuple(NAMES.values()).index, default=None)
                assert seen == NAMES.get(asked), f"seed {seed}: {arrangement}: {name}"


def test_same_design_points():
    pairs = {
        "t_cold": "cell_cold_c",
        "t_hot": "cell_hot_c",
        "voc_cold": "voc_cold_v",
        "voc_hot": "voc_hot_v",
        "vmp_hot": "vmp_hot_v",
        "vmp_25": "vmp_25_v",
        "vmp_cold": "vmp_cold_v",
        "isc_design": "isc_design_a",
    }
    for seed, case in cases(range(2000, 2100)):
        found = module_points(design_points([case.module], case.site, DEFAULT_RULES), 0)
        for theirs, ours in pairs.items():
            wanted, value = oracle.points(case.module, case.site)[theirs], getattr(found, ours)
            assert (value is None) == (wanted is None), f"seed {seed}: {ours}"
            assert value is None or value == pytest.approx(wanted, rel=1e-9), f"seed {seed}: {ours}"


def test_many_records_at_once_give_what_each_gives_alone():
    rng = random.Random(5)
    case = random_case(rng)
    boxes = [
        replace(random_inverter(rng, case.module, case.site), maker=f"Maker {i % 7}", model=f"{i}")
        for i in range(40)
    ]
    request = Request(case.site, every=True)
    together = fit([case.module], boxes, request)
    found = defaultdict(dict)
    for option in together.options(full=False):
        found[option.inverter][form(option, boxes[option.inverter])] = str(option.verdict)
    alone = [verdicts(fit([case.module], [box], request)) for box in boxes]
    assert [found[i] for i in range(len(boxes))] == alone
    assert together.totals.arrangements == sum(map(len, alone))
    assert together.totals.records_with_option == sum(map(bool, alone)) > 0


# --- counts of big inverters --------------------------------------------------------------------------


def big_inverter(trackers: tuple[int, int, int], module: Module) -> Inverter:
    """Three unlike groups; one bounded by nothing but the ratio window."""
    a, b, c = trackers
    return Inverter(
        maker="Random",
        model="Big",
        ac_power_w=float(sum(trackers)) * 22 * module.pmax_w / 1.2,
        max_dc_voltage_v=1100.0,
        mppt_low_v=400.0,
        mppt_high_v=900.0,
        inputs=(
            Inputs(trackers=a, strings_per_tracker=2, max_isc_a=60.0),
            Inputs(trackers=b, strings_per_tracker=1, max_isc_a=60.0),
            Inputs(trackers=c, strings_per_tracker=2),
        ),
    )


@pytest.mark.parametrize("trackers", [(2, 2, 2), (6, 3, 3), (12, 8, 4)])
def test_exact_count_of_big_inverters(trackers):
    """Against the oracle's coin-by-coin count, for the whole window and for single module counts."""
    case = random_case(random.Random(3))
    module, site = replace(case.module, max_system_voltage_v=None), replace(case.site, voltage_cap_v=None)
    inverter = big_inverter(trackers, module)
    wanted = oracle.count_by_modules(module, inverter, site, 0.8, 1.5)
    request = Request(site)
    assert fit([module], [inverter], request).totals.arrangements == sum(wanted.values()) > 0
    for modules in (*list(wanted)[::40], max(wanted) + 1):
        result = fit([module], [inverter], replace(request, counts=(modules, modules)))
        assert result.totals.arrangements == wanted.get(modules, 0)


# --- clipping and order -------------------------------------------------------------------------------


def random_year(module: Module, rng: random.Random, entries: int = 25):
    """A short year of any powers and voltages, hours of unlike weight."""
    import numpy as np

    from matcher.moduleyear import ModuleYear

    power = [rng.uniform(0, 1.1) * module.pmax_w for _ in range(entries)]
    volts = [rng.uniform(0.8, 1.05) * module.vmp_v for _ in range(entries)]
    return ModuleYear(np.array(power), np.array(volts), np.ones(entries))


def in_order(option: Option, case: Case) -> tuple:
    """The oracle's sort key of an option."""
    arrangement = form(option, case.inverter)
    return oracle.order_key(
        str(option.verdict),
        oracle.modules_of(arrangement) * case.module.pmax_w / case.inverter.ac_power_w,
        option.clipping_loss_pct,
        len({n for group in arrangement for _, n in group}),
        oracle.cold_margin(case.module, case.inverter, case.site, arrangement),
        case.inverter.maker,
        case.inverter.model,
    )


def with_sandia(inverter: Inverter) -> Inverter:
    """The inverter with Sandia parameters of the usual size, invented."""
    volts, watts = (inverter.mppt_low_v + inverter.mppt_high_v) / 2, inverter.ac_power_w
    sandia = {"C0": -0.02 / watts, "C1": 3e-5, "C2": 1e-3, "C3": -5e-4}
    return replace(inverter, Pso=0.006 * watts, Paco=watts, Pdco=1.04 * watts, Vdco=volts, Pnt=0.5, **sandia)


@pytest.mark.parametrize("sandia", [False, True], ids=["weighted efficiency", "sandia"])
def test_same_clipping_and_order(sandia):
    import oracle_year

    options = 0
    for seed, case in cases(range(3000, 3060)):
        if sandia:
            case = replace(case, inverter=with_sandia(case.inverter))
        year = random_year(case.module, random.Random(seed))
        found = list(fit([case.module], [case.inverter], request_of(case), year).options(full=False))
        keys = [in_order(option, case) for option in found]
        assert keys == sorted(keys), f"seed {seed}"
        for option in found[:6]:
            arrangement = form(option, case.inverter)
            loss, energy = oracle_year.clipping(case.inverter, arrangement, year.power_w, year.vmp_v)
            assert option.clipping_loss_pct == pytest.approx(loss, abs=1e-7), f"seed {seed}: {option.label}"
            assert option.yearly_kwh == pytest.approx(energy, rel=1e-9), f"seed {seed}: {option.label}"
            options += 1
    assert options > 50


# --- properties ---------------------------------------------------------------------------------------


def test_colder_never_adds_and_hotter_never_adds():
    for seed, case in cases(range(4000, 4150)):
        here = by_engine(case)
        low, high = case.site.design_low_c, case.site.design_high_c
        for site in (
            replace(case.site, design_low_c=low - random.Random(seed).uniform(0.1, 12)),
            replace(case.site, design_high_c=high + random.Random(seed).uniform(0.1, 12)),
        ):
            there = by_engine(replace(case, site=site))
            assert there.keys() <= here.keys(), f"seed {seed}"
            assert all(here[a] == "fits" for a in there if there[a] == "fits"), f"seed {seed}"


def test_higher_ratings_never_remove():
    for seed, case in cases(range(5000, 5100)):
        here = by_engine(case)
        for field in ("max_dc_voltage_v", "mppt_high_v", "max_array_power_w"):
            value = getattr(case.inverter, field)
            if value is None:
                continue
            there = by_engine(replace(case, inverter=replace(case.inverter, **{field: value * 1.1})))
            assert here.keys() <= there.keys(), f"seed {seed}: {field}"
            assert all(there[a] == "fits" for a in here if here[a] == "fits"), f"seed {seed}: {field}"


def test_order_of_groups_and_of_trackers_changes_nothing():
    for seed, case in cases(range(6000, 6060)):
        here = by_engine(case)
        turned = replace(case, inverter=replace(case.inverter, inputs=case.inverter.inputs[::-1]))
        assert {a[::-1]: v for a, v in by_engine(turned).items()} == here, f"seed {seed}"
        # Each tracker its own group: swapped trackers now count apart, and are the same once put together.
        single = tuple(replace(g, trackers=1) for g in case.inverter.inputs for _ in range(g.trackers))
        owner = [g for g, group in enumerate(case.inverter.inputs) for _ in range(group.trackers)]
        apart = by_engine(replace(case, inverter=replace(case.inverter, inputs=single)))
        groups = len(case.inverter.inputs)
        merged = {
            oracle.canonical(zip(owner, [t[0] if t else None for t in a], strict=True), groups): v
            for a, v in apart.items()
        }
        assert merged == here, f"seed {seed}"


def test_climate_window_is_tight():
    """0.1 K inside every check of the window is no worse than at the site, 0.1 K outside one is."""
    severity = (oracle.NOT_ASKED, oracle.PASS, oracle.OPEN, oracle.FAIL).index
    bounded = Counter()
    for seed, case in cases(range(7000, 7150)):
        for option in fit([case.module], [case.inverter], request_of(case)).options(limit=2):
            arrangement = form(option, case.inverter)
            here = oracle.checks(case.module, case.inverter, case.site, arrangement)

            def holds(names, case=case, arrangement=arrangement, here=here, **temperature) -> bool:
                site = replace(case.site, **temperature)
                try:
                    there = oracle.checks(case.module, case.inverter, site, arrangement)
                except oracle.CannotMatch:
                    return False
                return all(severity(there[n]) <= severity(here[n]) for n in names)

            cold, hot = oracle.VOLTAGE_MAXIMA, ("mppt-low", "start")
            if option.coldest_c is not None:
                assert holds(cold, design_low_c=option.coldest_c + 0.1), f"seed {seed}: {option}"
                assert not holds(cold, design_low_c=option.coldest_c - 0.1), f"seed {seed}: {option}"
            else:
                assert holds(cold, design_low_c=-200.0), f"seed {seed}: {option}"
            if option.hottest_c is not None:
                assert holds(hot, design_high_c=option.hottest_c - 0.1), f"seed {seed}: {option}"
                assert not holds(hot, design_high_c=option.hottest_c + 0.1), f"seed {seed}: {option}"
            else:
                assert holds(hot, design_high_c=80.0), f"seed {seed}: {option}"
            bounded[option.coldest_c is not None, option.hottest_c is not None] += 1
    assert bounded[True, True] > 50
