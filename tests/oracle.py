"""A brute-force calculation of what fits, written apart from `matcher`: obvious rather than fast.

Nothing here imports `matcher`. The single-diode model is pvlib's; everything else is spelled out. Tests
compare the engine with this module on many small cases.

An arrangement is a tuple with one entry per group of trackers: the sorted tuple of (strings, modules in
series) of the trackers in use, e.g. ``(((2, 11), (2, 12)), ())``.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Iterable
from dataclasses import replace
from functools import lru_cache
from itertools import combinations_with_replacement, product

import pvlib
from scipy.optimize import brentq

from catalog.records import Inverter, Module, Site
from handbook_values import NEC_690_7_A, NEC_690_8_A1

PASS, OPEN, FAIL, NOT_ASKED = "passes", "open", "fails", "not asked"
FITS, TO_CONFIRM, DOES_NOT_FIT = "fits", "to-confirm", "does-not-fit"
VOLTAGE_MAXIMA = ("max-dc-voltage", "system-voltage", "voltage-cap")
SAFETY = (*VOLTAGE_MAXIMA, "short-circuit")
STOPS = (*SAFETY, "mppt-low", "mppt-high", "start", "string-inputs", "array-power")
NOTES = ("cold-tracking", "input-current", "string-fuse")
MOUNT_K = {"open-rack": 0.0, "gap-roof": 2.0, "near-roof": 11.0, "integrated": 18.0}
TOLERANCE = 1e-9

Arrangement = tuple[tuple[tuple[int, int], ...], ...]


class CannotMatch(Exception):
    """The module record lacks what the model needs; the message says what."""


class TooMany(Exception):
    """More cases than brute force should walk."""


def at_most(value: float, limit: float) -> bool:
    """Whether a maximum holds; a limit met exactly holds."""
    return value <= limit + TOLERANCE * abs(limit)


def at_least(value: float, limit: float) -> bool:
    """Whether a minimum holds; a limit met exactly holds."""
    return value >= limit - TOLERANCE * abs(limit)


# --- module ---------------------------------------------------------------------------------------


def cold_factor(ambient_c: float) -> float | None:
    """Factor of NEC Table 690.7(A); between two bands the colder one; none below the table."""
    if ambient_c >= 25:
        return 1.0
    for _warmest, coldest, factor in NEC_690_7_A:
        if ambient_c >= coldest:
            return factor
    return None


def is_crystalline_silicon(technology: str) -> bool:
    """Whether the NEC table, which is for crystalline silicon, covers a technology."""
    return technology in ("Mono-c-Si", "Multi-c-Si")


def model_mpp(six: dict, irradiance: float, cell_c: float) -> tuple[float, float]:
    """Vmp [V] and Imp [A] of the six-parameter model, by pvlib."""
    curve = pvlib.pvsystem.calcparams_cec(
        irradiance,
        cell_c,
        six["alpha_sc"],
        six["a_ref"],
        six["I_L_ref"],
        six["I_o_ref"],
        six["R_sh_ref"],
        six["R_s"],
        six["Adjust"],
    )
    mpp = pvlib.pvsystem.max_power_point(*curve, method="brentq")
    return float(mpp["v_mp"]), float(mpp["i_mp"])


def six_parameters(module: Module) -> dict | None:
    """The record's own six parameters, else those fitted to its datasheet values, else None."""
    if module.isc_coef_pct is None:
        return None
    names = ("a_ref", "I_L_ref", "I_o_ref", "R_s", "R_sh_ref", "Adjust")
    stated = {name: getattr(module, name) for name in names}
    alpha = module.isc_coef_pct / 100 * module.isc_a
    if all(value is not None for value in stated.values()):
        return {"alpha_sc": alpha, **stated}
    if module.voc_coef_pct is None or module.pmax_coef_pct is None:
        return None
    return fitted(
        module.vmp_v,
        module.imp_a,
        module.voc_v,
        module.isc_a,
        alpha,
        module.voc_coef_pct / 100 * module.voc_v,
        module.pmax_coef_pct,
    )


@lru_cache(maxsize=4096)
def fitted(
    vmp: float, imp: float, voc: float, isc: float, alpha: float, beta: float, gamma: float
) -> dict | None:
    """Six parameters by Batzelis 2016, Adjust by the Pmax coefficient (Dobos 2012)."""

    def with_adjust(adjust: float) -> dict:
        five = pvlib.ivtools.sdm.fit_desoto_batzelis(
            vmp, imp, voc, isc, alpha * (1 - adjust / 100), beta * (1 + adjust / 100)
        )
        return {**five, "alpha_sc": alpha, "Adjust": adjust}

    def excess(adjust: float) -> float:
        six = with_adjust(adjust)

        def power(cell_c: float) -> float:
            v, i = model_mpp(six, 1000, cell_c)
            return v * i

        # Mean coefficient over -10..50 degC, as Dobos 2012 takes it (from memory).
        slopes = [100 * (power(t) / power(25) - 1) / (t - 25) for t in range(-10, 51, 3)]
        return sum(slopes) / len(slopes) - gamma

    edges = [-60, -40, -20, -10, 0, 10, 20, 40, 60]
    for low, high in zip(edges, edges[1:], strict=False):
        if excess(low) * excess(high) <= 0:
            return with_adjust(brentq(excess, low, high, xtol=1e-9))
    return None


def vmp_at(module: Module, cell_c: float) -> float:
    """Vmp [V] at 1000 W/m2: stated coefficient, else the model, else the coefficients of Pmax and Isc."""
    if module.vmp_coef_pct is not None:
        return module.vmp_v * (1 + module.vmp_coef_pct / 100 * (cell_c - 25))
    six = six_parameters(module)
    if six is not None:
        return model_mpp(six, 1000, cell_c)[0]
    if module.pmax_coef_pct is None or module.isc_coef_pct is None:
        raise CannotMatch("no coefficient of Vmp, nor of Pmax and Isc")
    return module.vmp_v * (1 + (module.pmax_coef_pct - module.isc_coef_pct) / 100 * (cell_c - 25))


def points(module: Module, site: Site) -> dict:
    """Design temperatures, voltages and the design current of one module; None where nothing gives the value.

    ``isc_design_least`` leaves the rear side out: ``isc_design`` where the site gives no rear share.
    """
    t_cold = site.design_low_c
    noct = 45.0 if module.noct_c is None else module.noct_c
    t_hot = site.design_high_c + (noct + MOUNT_K[site.mounting] - 20) / 800 * 1000
    if module.voc_coef_pct is not None:
        voc_cold = module.voc_v * (1 + module.voc_coef_pct / 100 * (t_cold - 25))
        voc_hot = module.voc_v * (1 + module.voc_coef_pct / 100 * (t_hot - 25))
    else:
        factor = cold_factor(t_cold) if is_crystalline_silicon(module.technology) else None
        if factor is None:
            raise CannotMatch("no coefficient of Voc, and no table covers it")
        voc_cold, voc_hot = module.voc_v * factor, None
    least = module.isc_a * NEC_690_8_A1
    isc_design = least
    if module.bifacial and site.rear_share:
        known = module.bifaciality is not None
        isc_design = least * (1 + module.bifaciality * site.rear_share) if known else None
    return {
        "t_cold": t_cold,
        "t_hot": t_hot,
        "voc_cold": voc_cold,
        "voc_hot": voc_hot,
        "vmp_hot": vmp_at(module, t_hot),
        "vmp_25": vmp_at(module, 25.0),
        "vmp_cold": vmp_at(module, t_cold),
        "isc_design": isc_design,
        "isc_design_least": least,
    }


# --- checks ---------------------------------------------------------------------------------------


def _worst(verdicts: Iterable[str]) -> str:
    return max(verdicts, key=(NOT_ASKED, PASS, OPEN, FAIL).index)


def _maximum(value: float | None, limit: float | None, unstated: str, least: float | None = None) -> str:
    """Verdict on a maximum; `least` is what a value that is not known is at least."""
    if limit is None:
        return unstated
    if value is None:
        return OPEN if at_most(least, limit) else FAIL
    return PASS if at_most(value, limit) else FAIL


def checks(
    module: Module,
    inverter: Inverter,
    site: Site,
    arrangement: Arrangement,
    *,
    combiner: bool = False,
    at: dict | None = None,
) -> dict[str, str]:
    """All twelve checks of one arrangement, each by its worst tracker."""
    p = at or points(module, site)
    groups = zip(inverter.inputs, arrangement, strict=True)
    used = [(group, s, n) for group, in_use in groups for s, n in in_use]
    total = sum(s * n for _, s, n in used)
    found: dict[str, list[str]] = {name: [] for name in (*STOPS, *NOTES)}
    for group, s, n in used:
        if inverter.max_dc_voltage_v is None:
            # The one inference: an unstated maximum is at least the top of the tracking window.
            certain = at_most(n * p["voc_cold"], inverter.mppt_high_v)
            found["max-dc-voltage"].append(PASS if certain else OPEN)
        else:
            found["max-dc-voltage"].append(_maximum(n * p["voc_cold"], inverter.max_dc_voltage_v, OPEN))
        found["system-voltage"].append(_maximum(n * p["voc_cold"], module.max_system_voltage_v, OPEN))
        found["voltage-cap"].append(_maximum(n * p["voc_cold"], site.voltage_cap_v, NOT_ASKED))
        found["mppt-low"].append(PASS if at_least(n * p["vmp_hot"], inverter.mppt_low_v) else FAIL)
        found["mppt-high"].append(PASS if at_most(n * p["vmp_25"], inverter.mppt_high_v) else FAIL)
        if inverter.start_voltage_v is None:
            found["start"].append(NOT_ASKED)
        elif p["voc_hot"] is None:
            # Voc is above Vmp at any temperature: what Vmp reaches, Voc reaches.
            certain = at_least(n * p["vmp_hot"], inverter.start_voltage_v)
            found["start"].append(PASS if certain else OPEN)
        else:
            found["start"].append(PASS if at_least(n * p["voc_hot"], inverter.start_voltage_v) else FAIL)
        design, least = p["isc_design"], p["isc_design_least"]
        found["short-circuit"].append(
            _maximum(None if design is None else s * design, group.max_isc_a, OPEN, s * least)
        )
        allowed = None if combiner else group.strings_per_tracker
        found["string-inputs"].append(NOT_ASKED if allowed is None else PASS if s <= allowed else FAIL)
        found["cold-tracking"].append(PASS if at_most(n * p["vmp_cold"], inverter.mppt_high_v) else FAIL)
        found["input-current"].append(_maximum(s * module.imp_a, group.max_current_a, OPEN))
        if s <= 2:
            found["string-fuse"].append(PASS)
        else:
            back = None if design is None else (s - 1) * design
            found["string-fuse"].append(_maximum(back, module.max_series_fuse_a, OPEN, (s - 1) * least))
    found["array-power"].append(_maximum(total * module.pmax_w, inverter.max_array_power_w, NOT_ASKED))
    return {name: _worst(verdicts) for name, verdicts in found.items()}


def verdict(found: dict[str, str]) -> str:
    """Three-way verdict of a set of checks.

    A start check that cannot be computed (a start voltage is stated, the module's hot Voc is not known)
    counts as to confirm, like a safety check whose limit is unstated.
    """
    if any(found[name] == FAIL for name in STOPS):
        return DOES_NOT_FIT
    if any(found[name] == OPEN for name in (*SAFETY, "start")):
        return TO_CONFIRM
    return FITS


# --- arrangements ---------------------------------------------------------------------------------


def tracker_choices(
    module: Module, inverter: Inverter, site: Site, ratio_high: float, combiner: bool = False
) -> list[list[tuple[int, int]]]:
    """Per group: every (strings, in series) that one tracker can carry when all others are empty."""
    p = points(module, site)
    power_limit = ratio_high * inverter.ac_power_w
    choices = []
    for g in range(len(inverter.inputs)):
        found = []
        n = 1
        while at_most(n * module.pmax_w, power_limit):
            s = 1
            while at_most(s * n * module.pmax_w, power_limit):
                alone = tuple(((s, n),) if i == g else () for i in range(len(inverter.inputs)))
                result = checks(module, inverter, site, alone, combiner=combiner, at=p)
                if verdict(result) != DOES_NOT_FIT:
                    found.append((s, n))
                s += 1
            n += 1
        choices.append(found)
    return choices


def canonical(per_tracker: Iterable[tuple[int, tuple[int, int] | None]], groups: int) -> Arrangement:
    """One form for all arrangements that differ only by swapping like trackers."""
    entries = list(per_tracker)
    return tuple(
        tuple(sorted(choice for g, choice in entries if g == group and choice is not None))
        for group in range(groups)
    )


def _counted(module: Module, inverter: Inverter, total: int, low: float, high: float, counts) -> bool:
    """Whether a total number of modules is asked for: not zero, inside the ratio window, one of `counts`."""
    ratio = total * module.pmax_w / inverter.ac_power_w
    return total > 0 and at_least(ratio, low) and at_most(ratio, high) and (counts is None or total in counts)


def arrangements(
    module: Module,
    inverter: Inverter,
    site: Site,
    ratio_low: float,
    ratio_high: float,
    counts: Collection[int] | None = None,
    combiner: bool = False,
    most: int = 500_000,
) -> dict[Arrangement, str]:
    """Every distinct arrangement that fits or is to confirm, with its verdict.

    Raises
    ------
    TooMany
        If more than `most` choices would have to be walked.
    """
    p = points(module, site)
    choices = tracker_choices(module, inverter, site, ratio_high, combiner)
    trackers = [(g, choices[g]) for g, group in enumerate(inverter.inputs) for _ in range(group.trackers)]
    size = 1
    for _, found in trackers:
        size *= len(found) + 1
    if size > most:
        raise TooMany(f"{size} choices")
    distinct = set()
    for picked in product(*([None, *found] for _, found in trackers)):
        total = sum(c[0] * c[1] for c in picked if c is not None)
        if _counted(module, inverter, total, ratio_low, ratio_high, counts):
            groups = (g for g, _ in trackers)
            distinct.add(canonical(zip(groups, picked, strict=True), len(inverter.inputs)))
    result = {a: verdict(checks(module, inverter, site, a, combiner=combiner, at=p)) for a in distinct}
    return {a: v for a, v in result.items() if v != DOES_NOT_FIT}


def modules_of(arrangement: Arrangement) -> int:
    """Modules of one arrangement."""
    return sum(s * n for group in arrangement for s, n in group)


def count_by_modules(
    module: Module,
    inverter: Inverter,
    site: Site,
    ratio_low: float,
    ratio_high: float,
    counts: Collection[int] | None = None,
    combiner: bool = False,
) -> dict[int, int]:
    """Number of distinct arrangements per module count, without listing them: a second, different way."""
    totals = Counter({0: 1})
    for group, choices in zip(
        inverter.inputs, tracker_choices(module, inverter, site, ratio_high, combiner), strict=True
    ):
        # ways[k][m]: multisets of k trackers with m modules, allowing one more choice at a time.
        ways = [Counter({0: 1})] + [Counter() for _ in range(group.trackers)]
        for s, n in choices:
            for k in range(1, group.trackers + 1):
                for m, number in list(ways[k - 1].items()):
                    if at_most((m + s * n) * module.pmax_w, ratio_high * inverter.ac_power_w):
                        ways[k][m + s * n] += number
        together = Counter()
        for of_group in ways:
            for m, number in of_group.items():
                for before, others in totals.items():
                    together[before + m] += number * others
        totals = together
    limit = inverter.max_array_power_w
    return {
        m: number
        for m, number in sorted(totals.items())
        if _counted(module, inverter, m, ratio_low, ratio_high, counts)
        and (limit is None or at_most(m * module.pmax_w, limit))
    }


def hosting(found: Iterable[Arrangement], strings: Counter[int]) -> list[Arrangement]:
    """Those arrangements that consist of exactly the given strings (length -> how many)."""
    wanted = Counter(strings)
    hosts = []
    for arrangement in found:
        held: Counter[int] = Counter()
        for group in arrangement:
            for s, n in group:
                held[n] += s
        if held == wanted:
            hosts.append(arrangement)
    return hosts


def smallest_spread(reachable: Collection[int], modules: int, units: int) -> int | None:
    """Smallest difference between the fullest and the emptiest of `units` that together take `modules`."""
    spreads = [
        max(split) - min(split)
        for split in combinations_with_replacement(sorted(reachable), units)
        if sum(split) == modules
    ]
    return min(spreads, default=None)


# --- climate and order ----------------------------------------------------------------------------


def climate_window(
    module: Module, inverter: Inverter, site: Site, arrangement: Arrangement
) -> tuple[float | None, float | None]:
    """Coldest and hottest ambient [degC] by bisection; None where nothing stated bounds it.

    Coldest: no voltage maximum gets a worse verdict than it has at the site. Hottest: likewise mppt-low and
    start.
    """
    severity = (NOT_ASKED, PASS, OPEN, FAIL).index
    here = checks(module, inverter, site, arrangement)

    def holds(names: tuple[str, ...], **temperature: float) -> bool:
        try:
            there = checks(module, inverter, replace(site, **temperature), arrangement)
        except CannotMatch:
            return False
        return all(severity(there[name]) <= severity(here[name]) for name in names)

    def edge(names: tuple[str, ...], field: str, inside: float, outside: float) -> float | None:
        if holds(names, **{field: outside}):
            return None
        for _ in range(60):
            middle = (inside + outside) / 2
            if holds(names, **{field: middle}):
                inside = middle
            else:
                outside = middle
        return inside

    return (
        edge(VOLTAGE_MAXIMA, "design_low_c", site.design_low_c, -273.15),
        edge(("mppt-low", "start"), "design_high_c", site.design_high_c, 200.0),
    )


def cold_margin(module: Module, inverter: Inverter, site: Site, arrangement: Arrangement) -> float:
    """Smallest margin [%] of the longest string's cold voltage under the voltage maxima that are known.

    A maximum DC voltage that is not stated is taken as the top of the tracking window.
    """
    longest = max(n for group in arrangement for _, n in group)
    value = longest * points(module, site)["voc_cold"]
    inverter_limit = inverter.mppt_high_v if inverter.max_dc_voltage_v is None else inverter.max_dc_voltage_v
    limits = [inverter_limit, module.max_system_voltage_v, site.voltage_cap_v]
    return min(100 * (limit - value) / limit for limit in limits if limit is not None)


def order_key(
    verdict_: str,
    ratio: float,
    clipping_pct: float | None,
    lengths: int,
    margin_pct: float,
    maker: str,
    model: str,
    cap_pct: float = 2.0,
) -> tuple:
    """Sort key of the default order; an unknown clipping loss counts as none over the cap."""
    over = clipping_pct is not None and clipping_pct > cap_pct
    first = clipping_pct if over else -ratio
    rank = (FITS, TO_CONFIRM).index(verdict_)
    return (rank, over, round(first, 9), lengths, round(-margin_pct, 9), maker, model)
