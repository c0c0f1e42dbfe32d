"""Seeded random modules, inverters and sites: plausible numbers that often meet a limit exactly."""

from __future__ import annotations

import csv
import random
from dataclasses import dataclass, replace
from functools import cache
from pathlib import Path

import pvlib

import oracle
from catalog.records import Inputs, Inverter, Module, Site

# Next to a limit: met exactly, by rounding only, just inside, just outside.
NUDGES = (1.0, 1.0, 1.0, 1 + 1e-12, 1 - 1e-12, 1 + 1e-6, 1 - 1e-6)
# Values of the single-diode model are no closer than its solvers agree.
MODEL_NUDGES = (1 + 1e-5, 1 - 1e-5)


@dataclass(frozen=True)
class Case:
    """One question to the engine and to the oracle."""

    module: Module
    inverter: Inverter
    site: Site
    ratio_low: float
    ratio_high: float
    counts: frozenset[int] | None
    combiner: bool


@cache
def cec_rows() -> tuple[dict[str, str], ...]:
    """A spread of rows of the CEC module table that pvlib installs."""
    (path,) = (Path(pvlib.__path__[0]) / "data").glob("sam-library-cec-modules-*.csv")
    with path.open(newline="", encoding="utf-8") as file:
        rows = list(csv.DictReader(file))[2:]
    return tuple(rows[::211])


def cec_module(row: dict[str, str]) -> Module:
    """A record with the six parameters of one row, names left aside."""
    voc, isc = float(row["V_oc_ref"]), float(row["I_sc_ref"])
    six = {name: float(row[name]) for name in ("a_ref", "I_L_ref", "I_o_ref", "R_s", "R_sh_ref", "Adjust")}
    return Module(
        maker="Table",
        model="Row",
        technology=row["Technology"],
        bifacial=row["Bifacial"] == "1",
        bifaciality=0.7 if row["Bifacial"] == "1" else None,
        pmax_w=float(row["STC"]),
        voc_v=voc,
        isc_a=isc,
        vmp_v=float(row["V_mp_ref"]),
        imp_a=float(row["I_mp_ref"]),
        voc_coef_pct=100 * float(row["beta_oc"]) / voc,
        isc_coef_pct=100 * float(row["alpha_sc"]) / isc,
        pmax_coef_pct=float(row["gamma_r"]),
        noct_c=float(row["T_NOCT"]),
        **six,
    )


def random_module(rng: random.Random) -> Module:
    """A module by one of the ways to Vmp(T): a row's own parameters, a stated coefficient, or the formula.

    Rows aside, no module has the values for a fit and no coefficient of Vmp: a fit is compared by tolerance,
    not exactly. See `fit_module`.
    """
    way = rng.choice(("row", "coefficient", "coefficient", "formula", "table factor"))
    ratings = {
        "max_system_voltage_v": rng.choice((None, None, 600.0, 1000.0, 1500.0)),
        "max_series_fuse_a": rng.choice((None, 15.0, 20.0, 25.0)),
    }
    if way == "row":
        return replace(cec_module(rng.choice(cec_rows())), **ratings)
    thin_film = way != "table factor" and rng.random() < 0.2
    vmp = rng.randint(600, 1800) / 10 if thin_film else rng.randint(170, 450) / 10
    imp = rng.randint(10, 30) / 10 if thin_film else rng.randint(50, 180) / 10
    bifacial = rng.random() < 0.3
    module = Module(
        maker="Random",
        model="Plain",
        technology="CdTe" if thin_film else rng.choice(("Mono-c-Si", "Multi-c-Si")),
        bifacial=bifacial,
        bifaciality=rng.choice((0.65, 0.7, 0.8)) if bifacial else None,
        pmax_w=float(round(vmp * imp)),
        vmp_v=vmp,
        imp_a=imp,
        voc_v=round(vmp * rng.uniform(1.18, 1.3), 1),
        isc_a=round(imp * rng.uniform(1.04, 1.12), 2),
        isc_coef_pct=rng.choice((0.03, 0.04, 0.05, 0.06)),
        noct_c=rng.choice((None, 43.0, 45.0, 47.5)),
        **ratings,
    )
    voc, pmax, vmp_coef = -rng.randint(24, 36) / 100, -rng.randint(29, 45) / 100, -rng.randint(33, 48) / 100
    if way == "coefficient":
        # Without one of the others in half the cases: a stated coefficient of Vmp needs none of them.
        return replace(
            module,
            voc_coef_pct=voc,
            vmp_coef_pct=vmp_coef,
            pmax_coef_pct=rng.choice((None, pmax)),
            isc_coef_pct=rng.choice((None, module.isc_coef_pct)),
        )
    # The formula and the table factor: without a coefficient of Voc nothing can be fitted.
    module = replace(module, technology=rng.choice(("Mono-c-Si", "Multi-c-Si")), pmax_coef_pct=pmax)
    return replace(module, vmp_coef_pct=vmp_coef) if way == "table factor" and rng.random() < 0.5 else module


def fit_module(rng: random.Random) -> Module:
    """A module whose six parameters must be fitted to its datasheet values: a table row without its own."""
    blank = dict.fromkeys(("a_ref", "I_L_ref", "I_o_ref", "R_s", "R_sh_ref", "Adjust"))
    return replace(cec_module(rng.choice(cec_rows())), **blank)


def random_site(rng: random.Random) -> Site:
    """A site whose design temperatures often lie on the edge of a band of the NEC table."""
    low = rng.choice((rng.randint(-40, 25), rng.randint(-8, 4) * 5, rng.uniform(-40, 25)))
    return Site(
        name="Random place",
        design_low_c=float(low),
        design_high_c=float(max(low, rng.randint(15, 48))),
        mounting=rng.choice(tuple(oracle.MOUNT_K)),
        voltage_cap_v=rng.choice((None, None, None, 600.0, 1000.0)),
        rear_share=rng.choice((None, None, 0.0, 0.05, 0.1)),
    )


def random_inverter(rng: random.Random, module: Module, site: Site, ratio: float = 1.2) -> Inverter:
    """An inverter of 1 to 6 trackers in 1 to 3 groups that takes 0 to about 10 lengths of `module` at `site`.

    Some number of modules within its reach has the DC/AC ratio `ratio`.
    """
    p = oracle.points(module, site)
    modelled = module.vmp_coef_pct is None and oracle.six_parameters(module) is not None

    def near(value: float, *, model: bool = False) -> float:
        exact = value * rng.choice(MODEL_NUDGES if model and modelled else NUDGES)
        return rng.choice((exact, exact, value * rng.uniform(0.9, 1.1)))

    def maybe(value: float, missing: float = 0.3) -> float | None:
        return None if rng.random() < missing else value

    groups = rng.choice((1, 1, 2, 3))
    trackers = [rng.randint(1, 4 // groups + 1) for _ in range(groups)]
    few = sum(trackers) > 3
    shortest = rng.randint(1, max(1, min(12, int(rng.choice((550, 900)) / p["voc_cold"]))))
    longest = max(1, shortest + rng.choice((-1, 0, 1, 2, 2) if few else (0, 1, 2, 3, 5, 9)))
    strings = rng.choice((1, 1, 2) if few else (1, 2, 3))
    mppt_low = near(shortest * p["vmp_hot"], model=True)
    mppt_high = max(mppt_low + 1, near(longest * p["vmp_25"], model=True))
    limit = longest + rng.choice((0, 1, 3))
    inputs = tuple(
        Inputs(
            trackers=n,
            strings_per_tracker=maybe(rng.randint(1, strings), 0.2),
            max_current_a=maybe(near(rng.randint(1, strings) * module.imp_a)),
            max_isc_a=maybe(near(rng.randint(1, strings) * p["isc_design_least"]), 0.4),
        )
        for n in trackers
    )
    design = p["isc_design"]
    if design is not None and rng.random() < 0.3:
        inputs = tuple(replace(i, max_isc_a=near(rng.randint(1, strings) * design)) for i in inputs)
    modules = rng.randint(1, sum(trackers) * strings) * rng.randint(min(shortest, longest), longest)
    hot_voc = p["voc_hot"] or module.voc_v
    return Inverter(
        maker="Random",
        model="Box",
        ac_power_w=near(modules * module.pmax_w / ratio),
        max_dc_voltage_v=maybe(near(limit * p["voc_cold"])),
        mppt_low_v=mppt_low,
        mppt_high_v=mppt_high,
        start_voltage_v=maybe(near(shortest * hot_voc), 0.5),
        max_array_power_w=maybe(near(rng.randint(max(modules // 2, 1), 2 * modules) * module.pmax_w), 0.5),
        inputs=inputs,
        weighted_efficiency_pct=96.0,
    )


def random_case(rng: random.Random) -> Case:
    """A module, site and inverter that go together, with the ratio window and the counts asked for."""
    module, site = random_module(rng), random_site(rng)
    low, high = rng.choice(((0.8, 1.5), (0.8, 1.5), (0.05, 1.5), (1.0, 1.2), (0.9, 0.9)))
    inverter = random_inverter(rng, module, site, rng.choice((max(low, 0.5), high, (low + high) / 2)))
    counts = None
    if rng.random() < 0.3:
        inside = rng.uniform(low, high) * inverter.ac_power_w / module.pmax_w
        first = max(1, round(inside) - rng.randint(0, 3))
        counts = frozenset(range(first, first + rng.choice((1, 5, 20))))
    return Case(module, inverter, site, low, high, counts, rng.random() < 0.15)
