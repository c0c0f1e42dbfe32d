"""Arrays given as strings, and module counts shared by several units, against brute force.

Every failure names its seed: ``random_case(random.Random(seed))`` is the case.
"""

from __future__ import annotations

import random
from collections import Counter, defaultdict
from dataclasses import replace
from functools import cache
from itertools import combinations_with_replacement, product

import numpy as np
import pytest

import oracle
from catalog.records import Inputs, Inverter, Site
from catalog_records import GLASS
from matcher.checks import Verdict
from matcher.errors import MatcherError
from matcher.fit import Fit, Option, Request, fit
from matcher.several import even_split, even_strings
from random_records import Case, random_case
from test_engine_properties import form, random_year, request_of

Strings = tuple[tuple[int, int], ...]


# --- the split itself ----------------------------------------------------------------------------------


def test_even_split_has_the_smallest_spread_of_all():
    rng = random.Random(1)
    none = 0
    for case in range(1500):
        top = rng.choice((12, 30, 60))
        reachable = sorted(rng.sample(range(1, top + 1), rng.randint(1, min(8, top))))
        units = rng.randint(1, 5)
        total = rng.choice((rng.randint(1, top * units), sum(rng.choices(reachable, k=units))))
        split = even_split(reachable, total, units)
        wanted = oracle.smallest_spread(reachable, total, units)
        none += wanted is None
        if split is None:
            assert wanted is None, f"case {case}: {reachable}, {total} on {units}"
            continue
        assert sum(split) == total and len(split) == units and set(split) <= set(reachable)
        assert list(split) == sorted(split, reverse=True)
        assert split[0] - split[-1] == wanted, f"case {case}: {reachable}, {total} on {units}"
    assert 150 < none < 1250


def test_even_split_of_many_units():
    """Sixty micro inverters with one module each; and a hundred units that take 20 or 23."""
    assert even_split([1], 60, 60) == (1,) * 60
    assert even_split([1], 61, 60) is None
    split = even_split([20, 23], 2150, 100)
    assert split is not None and Counter(split) == {20: 50, 23: 50}
    assert even_split([20, 23], 2151, 100) is None


def spread_of_strings(hosted, lengths, wanted, units) -> int | None:
    """Smallest difference in modules between the fullest and the emptiest unit, by trying every split."""
    spreads = []
    for shares in combinations_with_replacement(sorted(hosted), units):
        if tuple(map(sum, zip(*shares, strict=True))) == wanted:
            sizes = [sum(n * s for n, s in zip(lengths, share, strict=True)) for share in shares]
            spreads.append(max(sizes) - min(sizes))
    return min(spreads, default=None)


def test_even_strings_has_the_smallest_spread_of_all():
    rng = random.Random(2)
    none = spread = 0
    for case in range(600):
        lengths = tuple(sorted(rng.sample(range(4, 16), rng.choice((1, 2, 2, 3)))))
        shares = list(product(*(range(rng.randint(1, 3) + 1) for _ in lengths)))
        shares.remove((0,) * len(lengths))
        hosted = frozenset(rng.sample(shares, rng.randint(1, min(7, len(shares)))))
        units = rng.randint(1, 4)
        some = rng.choices(sorted(hosted), k=units)
        wanted = tuple(map(sum, zip(*some, strict=True)))
        if rng.random() < 0.3:
            wanted = tuple(w + rng.choice((0, 1)) for w in wanted)
        split = even_strings(hosted, lengths, wanted, units)
        least = spread_of_strings(hosted, lengths, wanted, units)
        if split is None:
            assert least is None, f"case {case}: {hosted}, {lengths}, {wanted} on {units}"
            none += 1
            continue
        assert set(split) <= hosted and tuple(map(sum, zip(*split, strict=True))) == wanted
        sizes = [sum(n * s for n, s in zip(lengths, share, strict=True)) for share in split]
        assert sizes == sorted(sizes, reverse=True)
        assert sizes[0] - sizes[-1] == least, f"case {case}: {hosted}, {lengths}, {wanted} on {units}"
        spread += least > 0
    assert none > 40
    assert spread > 40


# --- against the oracle ----------------------------------------------------------------------------------


@cache
def one_unit(seed: int, total: int) -> dict[oracle.Arrangement, str] | None:
    """Every arrangement of one unit with up to ``total`` modules, whatever its DC/AC ratio."""
    case = random_case(random.Random(seed))
    high = total * case.module.pmax_w / case.inverter.ac_power_w
    try:
        return oracle.arrangements(
            case.module, case.inverter, case.site, 1e-6, high, None, case.combiner, most=1_500
        )
    except oracle.TooMany:
        return None


def ratio_of(case: Case, total: int, units: int) -> float:
    """DC/AC ratio of the whole."""
    return total * case.module.pmax_w / (units * case.inverter.ac_power_w)


def in_window(case: Case, total: int, units: int) -> bool:
    """Whether the ratio of the whole is asked for."""
    ratio = ratio_of(case, total, units)
    return oracle.at_least(ratio, case.ratio_low) and oracle.at_most(ratio, case.ratio_high)


def ask(case: Case, **change: object) -> Fit | None:
    """The engine's answer; ``None`` where it refuses the module."""
    request = replace(request_of(case), counts=None, **change)
    try:
        return fit([case.module], [case.inverter], request, random_year(case.module, random.Random(1)))
    except MatcherError:
        return None


def unit_forms(option: Option, inverter: Inverter) -> list[tuple[int, oracle.Arrangement]]:
    """How many units are wired like each arrangement, in the oracle's form."""
    groups = range(len(inverter.inputs))
    return [
        (u.copies, tuple(tuple(sorted((t.strings, t.in_series) for t in u.trackers if t.inputs == g)) for g in groups))
        for u in option.wired
    ]


def check_units(option: Option, case: Case, known: dict[oracle.Arrangement, str], where: str) -> None:
    """Units, modules, ratio and verdict of an option follow from its units, and each unit passes alone."""
    forms = unit_forms(option, case.inverter)
    assert sum(copies for copies, _ in forms) == option.units, where
    assert sum(copies * oracle.modules_of(a) for copies, a in forms) == option.modules, where
    assert len({oracle.modules_of(a) for _, a in forms}) == len(forms) or len({a for _, a in forms}) == len(forms)
    assert option.dc_ac_ratio == pytest.approx(ratio_of(case, option.modules, option.units)), where
    verdicts = {known[a] for _, a in forms}  # a KeyError is an arrangement that does not fit
    assert str(option.verdict) == max(verdicts, key=(oracle.FITS, oracle.TO_CONFIRM).index), where


def lengths_of(arrangement) -> set[int]:
    return {length for group in arrangement for _, length in group}


def best_lengths(known, modules: int) -> list[set[int]]:
    """String lengths of the arrangements of a module count that have the best verdict there is."""
    of_count = {a: v for a, v in known.items() if oracle.modules_of(a) == modules}
    best = min(of_count.values(), key=(oracle.FITS, oracle.TO_CONFIRM).index)
    return [lengths_of(a) for a, v in of_count.items() if v == best]


def option_lengths(option) -> set[int]:
    return {t.in_series for unit in option.wired for t in unit.trackers}


def test_counts_on_several_units():
    tried = uneven = unlike = spared = 0
    for seed in range(150):
        case, rng = random_case(random.Random(seed)), random.Random(-seed)
        units = (rng.randint(1, 2), rng.randint(2, 3))
        middle = rng.uniform(case.ratio_low, min(case.ratio_high, 3)) * case.inverter.ac_power_w / case.module.pmax_w
        total = max(1, round(middle * rng.choice(units)))
        known = one_unit(seed, total)
        if known is None:
            continue
        result = ask(case, units=units)  # asks for nothing that is shared
        assert result is None
        request = replace(request_of(case), counts=(total, total), units=units)
        try:
            result = fit([case.module], [case.inverter], request, random_year(case.module, rng))
        except MatcherError:
            continue
        tried += 1
        reachable = {oracle.modules_of(a) for a in known}
        wanted = {}
        for k in range(units[0], units[1] + 1):
            spread = oracle.smallest_spread(reachable, total, k) if in_window(case, total, k) else None
            if spread is not None:
                wanted[k] = spread
        options = list(result.options())
        assert {o.units for o in options} == set(wanted), f"seed {seed}: {total} on {units}"
        assert len(options) == len(wanted)
        used = set()
        for option in options:
            check_units(option, case, known, f"seed {seed}: {option.label}")
            sizes = [u.modules for u in option.wired]
            assert max(sizes) - min(sizes) == wanted[option.units], f"seed {seed}: {option.label}"
            # Of each module count the best verdict that there is.
            for size in sizes:
                best = min((v for a, v in known.items() if oracle.modules_of(a) == size), key=(oracle.FITS, oracle.TO_CONFIRM).index)
                if best == oracle.TO_CONFIRM:
                    assert option.verdict is Verdict.TO_CONFIRM, f"seed {seed}: {option.label}"
            if len(sizes) == 2 and (option.clipping_loss_pct is None or option.clipping_loss_pct <= request.clip_cap_pct):
                # As few lengths over all units as there can be, and then as short a longest string.
                found = option_lengths(option)
                least = min(
                    (len(a | b), max(a | b))
                    for a, b in product(*(best_lengths(known, size) for size in sizes))
                )
                assert (len(found), max(found)) == least, f"seed {seed}: {option.label}"
                spared += 1
            used |= set(sizes)
            uneven += max(sizes) - min(sizes) > 1
            unlike += len(sizes) > 1
        assert result.totals.arrangements == sum(oracle.modules_of(a) in used for a in known), f"seed {seed}"
    assert tried > 90
    assert unlike > 8 and spared > 2
    assert uneven > 1


def some_strings(rng: random.Random, known: dict[oracle.Arrangement, str], units: int) -> Counter[int]:
    """Strings of each length that a few random arrangements hold together, now and then one string off."""
    held: Counter[int] = Counter()
    for arrangement in rng.choices(sorted(known), k=units):
        for group in arrangement:
            for strings, length in group:
                held[length] += strings
    if rng.random() < 0.2:
        held[rng.choice(sorted(held)) + rng.choice((0, 1))] += 1
    return held


def test_strings_are_hosted_exactly():
    """All arrangements of one unit that hold the strings and no others, each with its verdict."""
    tried = several_ways = none = 0
    for seed in range(200):
        case, rng = random_case(random.Random(seed)), random.Random(-seed)
        most = round(2 * case.inverter.ac_power_w / case.module.pmax_w)
        known = one_unit(seed, most)
        if not known:
            continue
        strings = some_strings(rng, known, 1)
        total = sum(n * s for n, s in strings.items())
        inside = in_window(case, total, 1)
        hosts = set(oracle.hosting(known, strings)) if inside else set()
        if total > most:
            continue
        tried += 1
        # In parts and in any order: 2x11,1x11 is 3x11.
        given = [(n, s) for n, s in strings.items()]
        if (first := given[0])[1] > 1:
            given = [*given[1:], (first[0], 1), (first[0], first[1] - 1)]
        result = ask(case, strings=tuple(given))
        assert result is not None, f"seed {seed}"
        options = list(result.options())
        found = {form(o, case.inverter): str(o.verdict) for o in options}
        assert len(found) == len(options) == result.totals.arrangements, f"seed {seed}"
        assert found == {a: known[a] for a in hosts}, f"seed {seed}: {dict(strings)}"
        several_ways += len(hosts) > 1
        none += not hosts
        for option in options:
            check_units(option, case, known, f"seed {seed}: {option.label}")
        best = ask(case, strings=tuple(given), every=False)
        assert best is not None
        assert [o.label for o in best.options()] == [o.label for o in options[:1]], f"seed {seed}"
    assert tried > 45
    assert several_ways > 8
    assert none > 8


def test_strings_on_several_units():
    tried = some = unlike = 0
    for seed in range(200):
        case, rng = random_case(random.Random(seed)), random.Random(-seed)
        known = one_unit(seed, round(1.6 * case.inverter.ac_power_w / case.module.pmax_w))
        if not known or len(known) > 60:
            continue
        units = rng.choice((2, 3))
        strings = some_strings(rng, known, units)
        total = sum(n * s for n, s in strings.items())
        lengths = tuple(sorted(strings))
        by_share = defaultdict(set)
        everything = one_unit(seed, total)
        if everything is None:
            continue
        for arrangement, verdict in everything.items():
            held = Counter()
            for group in arrangement:
                for s, n in group:
                    held[n] += s
            if set(held) <= set(lengths):
                by_share[tuple(held[n] for n in lengths)].add(verdict)
        shares = frozenset(s for s in by_share if all(a <= strings[n] for a, n in zip(s, lengths, strict=True)))
        if len(shares) > 40:
            continue
        tried += 1
        result = ask(case, strings=tuple(strings.items()), units=(1, units))
        assert result is not None
        wanted = {
            k: spread
            for k in range(1, units + 1)
            if in_window(case, total, k)
            and (spread := spread_of_strings(shares, lengths, tuple(strings[n] for n in lengths), k)) is not None
        }
        options = list(result.options())
        assert {o.units for o in options} == set(wanted), f"seed {seed}: {dict(strings)}"
        for option in options:
            check_units(option, case, everything, f"seed {seed}: {option.label}")
            held = Counter()
            for u in option.wired:
                for t in u.trackers:
                    held[t.in_series] += u.copies * t.strings
            assert held == strings, f"seed {seed}: {option.label}"
            if option.units > 1:
                sizes = [u.modules for u in option.wired]
                assert max(sizes) - min(sizes) == wanted[option.units], f"seed {seed}: {option.label}"
                unlike += len(sizes) > 1
        some += bool(options)
    assert tried > 40
    assert some > 20
    assert unlike > 4


# --- by hand -----------------------------------------------------------------------------------------------

SITE = Site(name="Hand", design_low_c=-10.0, design_high_c=35.0)
MODULE = replace(
    GLASS, bifacial=False, bifaciality=None, voc_coef_pct=-0.27, vmp_coef_pct=-0.36, noct_c=44.0, pmax_w=440.0
)


def micro() -> Inverter:
    """An inverter for one module."""
    return Inverter(
        maker="Quillon", model="QN-400 One", ac_power_w=380.0, max_dc_voltage_v=60.0, mppt_low_v=25.0,
        mppt_high_v=50.0, inputs=(Inputs(trackers=1, strings_per_tracker=1, max_isc_a=20.0),),
    )  # fmt: skip


def duo(**change: object) -> Inverter:
    """Two trackers of one string each of 10 to 14 modules."""
    values = dict(
        maker="Quillon", model="QN-10k", ac_power_w=10_000.0, max_dc_voltage_v=800.0, mppt_low_v=340.0,
        mppt_high_v=700.0, inputs=(Inputs(trackers=2, strings_per_tracker=1, max_isc_a=20.0),),
    )  # fmt: skip
    return Inverter(**(values | change))


def labels(inverter: Inverter, **request: object) -> list[str]:
    """Labels of all options of the pair."""
    return [o.label for o in fit([MODULE], [inverter], Request(SITE, every=True, **request)).options()]


def test_sixty_micro_inverters():
    result = fit([MODULE], [micro()], Request(SITE, counts=(60, 60), units=(1, 60), every=True))
    (option,) = result.options()
    assert (option.units, option.modules, option.label) == (60, 60, "1x1")
    assert option.verdict is Verdict.FITS
    assert option.dc_ac_ratio == pytest.approx(440 / 380)
    assert labels(micro(), counts=(61, 61), units=(1, 60)) == []


def test_a_prime_count_is_shared_where_it_can_be_and_refused_where_it_cannot():
    # By hand: Vmp at 65 degC 41.4 V * 0.856 = 35.4 V, so 10 at least; Voc at -10 degC 54.2 V, so 14 at most.
    one = duo(inputs=(Inputs(trackers=1, strings_per_tracker=2, max_isc_a=40.0),))
    assert labels(one, counts=(23, 23), ratio=(0.1, 2.0)) == []
    assert labels(one, counts=(23, 23), units=(2, 2), ratio=(0.1, 2.0)) == ["1 of (1x12) + 1 of (1x11)"]
    assert labels(duo(), counts=(23, 23), ratio=(0.1, 2.0)) == ["1x11 | 1x12", "1x10 | 1x13"]


def test_unequal_units_are_shown_as_unequal():
    result = fit([MODULE], [duo()], Request(SITE, counts=(47, 47), units=(2, 2), every=True))
    (option,) = result.options()
    assert option.label == "1 of (1x12 | 1x12) + 1 of (1x11 | 1x12)"
    assert [u.modules for u in option.wired] == [24, 23]


def test_a_power_limit_holds_for_each_unit():
    """26 modules are 11.44 kW: two units of 13 hold 6 kW, one of 14 and one of 12 do not."""
    tight = duo(max_array_power_w=13 * 440.0, ac_power_w=5000.0)
    assert labels(tight, counts=(26, 26), units=(1, 2)) == ["1x13"]
    assert labels(tight, strings=((14, 1), (12, 1)), units=(1, 2)) == []
    assert labels(tight, strings=((13, 2),), units=(1, 2)) == ["1x13"]


def test_strings_that_no_split_hosts():
    assert labels(duo(), strings=((12, 3),), ratio=(0.1, 9)) == []  # two trackers of one string
    assert labels(duo(), strings=((12, 3),), units=(1, 2), ratio=(0.1, 9)) == ["1 of (1x12 | 1x12) + 1 of (1x12)"]
    assert labels(duo(), strings=((12, 3),), units=(4, 4), ratio=(0.1, 9)) == []  # a unit would stay empty
    assert labels(duo(), strings=((12, 2), (15, 1)), units=(1, 3), ratio=(0.1, 9)) == []  # 15 are too many in series


def test_the_whole_of_unlike_units_loses_what_its_units_lose():
    """Energy adds up; the loss is that of the sum, and the ratio that of the whole."""
    year = random_year(MODULE, random.Random(4))
    inverter = duo(ac_power_w=7_000.0, weighted_efficiency_pct=96.0)
    request = Request(SITE, every=True, ratio=(0.1, 3.0))
    (whole,) = fit([MODULE], [inverter], replace(request, counts=(47, 47), units=(2, 2)), year).options()
    parts = [
        next(fit([MODULE], [inverter], replace(request, counts=(n, n)), year).options()) for n in (23, 24)
    ]
    assert whole.yearly_kwh == pytest.approx(sum(p.yearly_kwh for p in parts), rel=1e-12)
    free = sum(p.yearly_kwh / (1 - p.clipping_loss_pct / 100) for p in parts)
    assert whole.clipping_loss_pct == pytest.approx(100 * (1 - whole.yearly_kwh / free), rel=1e-9)
    assert whole.clipping_loss_pct > 1
    assert np.isclose(whole.dc_ac_ratio, 47 * 440 / 14_000)


def test_every_option_of_a_range_of_counts_and_units():
    """Each number of units and module count whose ratio is asked for, once."""
    result = fit([MODULE], [duo()], Request(SITE, counts=(22, 60), units=(1, 3), every=True))
    found = [(o.units, o.modules) for o in result.options()]
    assert len(found) == len(set(found))
    reachable = {n + m for n in range(10, 15) for m in (0, *range(10, 15))}
    wanted = {
        (k, total)
        for k in (1, 2, 3)
        for total in range(22, 61)
        if 0.8 <= total * 440 / (k * 10_000) <= 1.5 and oracle.smallest_spread(reachable, total, k) is not None
    }
    assert set(found) == wanted


# --- climate windows -----------------------------------------------------------------------------------------


def test_climate_windows_of_shared_arrays_are_tight():
    """0.1 K inside the checks of every unit are no worse than at the site, 0.1 K outside those of one unit are."""
    severity = (oracle.NOT_ASKED, oracle.PASS, oracle.OPEN, oracle.FAIL).index
    bounded = Counter()
    for seed in range(500):
        case, rng = random_case(random.Random(seed)), random.Random(-seed)
        mean = case.inverter.ac_power_w / case.module.pmax_w * rng.uniform(0.8, 1.4)
        asked: list[dict[str, object]] = [{"counts": (max(2, round(2 * mean)),) * 2, "units": (1, 2)}]
        whole = ask(case)
        if whole is None:
            continue
        first = next(whole.options(full=False), None)
        if first is not None:
            asked.append({"strings": tuple((t.in_series, t.strings) for t in first.arrangement), "units": (1, 2)})
        for change in asked:
            request = replace(request_of(case), **({"counts": None} | change))
            for option in fit([case.module], [case.inverter], request).options(limit=3):
                forms = [a for _, a in unit_forms(option, case.inverter)]
                here = [oracle.checks(case.module, case.inverter, case.site, a) for a in forms]

                def holds(names, case=case, forms=forms, here=here, **temperature) -> bool:
                    site = replace(case.site, **temperature)
                    try:
                        there = [oracle.checks(case.module, case.inverter, site, a) for a in forms]
                    except oracle.CannotMatch:
                        return False
                    return all(
                        severity(t[n]) <= max(severity(h[n]) for h in here) for t in there for n in names
                    )

                where = f"seed {seed}: {option.label}"
                for names, field, edge, inward, beyond in (
                    (oracle.VOLTAGE_MAXIMA, "design_low_c", option.coldest_c, 0.1, -200.0),
                    (("mppt-low", "start"), "design_high_c", option.hottest_c, -0.1, 80.0),
                ):
                    if edge is None:
                        assert holds(names, **{field: beyond}), where
                    else:
                        assert holds(names, **{field: edge + inward}), where
                        assert not holds(names, **{field: edge - inward}), where
                bounded[len(forms), option.coldest_c is not None, option.hottest_c is not None] += 1
        if bounded[1, True, True] > 20 and bounded[2, True, True] > 4:
            break
    assert bounded[1, True, True] > 20
    assert bounded[2, True, True] > 4
