"""How time grows with options, inverters, trackers, modules and years, and memory with options."""

from __future__ import annotations

import tracemalloc
from dataclasses import replace

from benchmarks.cases import DC_LOSS_PCT, SITE, inverters, module, modules, plane
from benchmarks.measuring import best_of, heading, row
from catalog.records import Inputs, Inverter
from matcher.fit import Fit, Request, fit
from matcher.moduleyear import ModuleYear, condense, condense_plane, module_year
from matcher.singlediode import six_parameters
from matcher.sweep import years_of


def run() -> None:
    """Print a table for each."""
    year = condense(module_year(six_parameters(module()), plane(), DC_LOSS_PCT), current_limits=False)
    _options(year)
    _inverters(year)
    _trackers(year)
    _modules()
    _years()


def _options(year: ModuleYear) -> None:
    heading("Growth with options: one module, all inverters, wider and wider windows of DC/AC ratios")
    row("window", "options", "s", "us/option", "peak MB")
    for high in (0.9, 1.1, 1.5, 2.3):
        request = Request(SITE, ratio=(0.7, high), every=True)

        def search(request: Request = request) -> Fit:
            return fit([module()], inverters(), request, year)

        cost, found = best_of(3, search)
        tracemalloc.start()
        search()
        peak = tracemalloc.get_traced_memory()[1] / 1e6
        tracemalloc.stop()
        n = len(found.table)
        row(f"0.7 to {high}", f"{n:,}", f"{cost.cpu_s:.3f}", f"{cost.cpu_s / n * 1e6:.2f}", f"{peak:.0f}")


def _inverters(year: ModuleYear) -> None:
    heading("Growth with inverters: the best arrangement of one module on each")
    row("", "inverters", "s", "us/inverter")
    for share in (16, 4, 1):
        takers = inverters()[::share]
        cost, _ = best_of(5, lambda takers=takers: fit([module()], takers, Request(SITE), year))
        row(f"every {share}. of the public table", f"{len(takers):,}", f"{cost.cpu_s:.3f}", f"{cost.cpu_s / len(takers) * 1e6:.0f}")


def _trackers(year: ModuleYear) -> None:
    heading("Growth with trackers: one inverter, the best of all its arrangements")
    row("trackers of 2 strings each", "arrangements", "s")
    big = next(i for i in inverters() if i.ac_power_w > 9000 and i.mppt_high_v > 450)
    for trackers in (1, 2, 3, 4, 6, 8, 12):
        inverter = _with_trackers(big, trackers)
        cost, found = best_of(2, lambda inverter=inverter: fit([module()], [inverter], Request(SITE), year))
        row(f"{trackers}", f"{found.totals.arrangements:,}", f"{cost.cpu_s:.3f}")


def _modules() -> None:
    heading("Growth with modules: the best arrangement of each on one inverter of several trackers")
    row("trackers of 2 strings each", "modules", "s", "us/module", "arrangements")
    big = next(i for i in inverters() if i.ac_power_w > 9000 and i.mppt_high_v > 450)
    classes = condense_plane(plane())
    for trackers, counts in ((2, (500, 2_000, 8_000)), (6, (500, 2_000)), (12, (500,))):
        inverter = _with_trackers(big, trackers)
        for count in counts:
            chosen = modules()[:: len(modules()) // count][:count]
            years = years_of(chosen, classes, DC_LOSS_PCT)
            cost, found = best_of(1, lambda c=chosen, i=inverter, y=years: fit(c, [i], Request(SITE), y))
            row(f"{trackers}", f"{count:,}", f"{cost.cpu_s:.2f}", f"{cost.cpu_s / count * 1e6:.0f}", f"{found.totals.arrangements:.3g}")


def _with_trackers(like: Inverter, trackers: int) -> Inverter:
    """An inverter whose power and model grow with its trackers."""
    power = {name: 3000.0 * trackers for name in ("ac_power_w", "Paco")}
    assert like.Pdco is not None and like.Paco is not None and like.Pso is not None and like.C0 is not None
    scale = 3000.0 * trackers / like.Paco
    return replace(
        like, Pdco=like.Pdco * scale, Pso=like.Pso * scale, C0=like.C0 / scale,
        inputs=(Inputs(trackers=trackers, strings_per_tracker=2),), **power,
    )  # fmt: skip


def _years() -> None:
    heading("Growth with years: years of many modules on one roof")
    short, _ = best_of(3, lambda: condense_plane(plane()))
    classes = condense_plane(plane())
    row(f"condensing {len(plane().hours):,} hours to {len(classes.hours)} classes", "", f"{short.cpu_s:.3f} s")
    row("", "modules", "s", "us/module")
    for count in (100, 1000, 10_000):
        chosen = modules()[:: max(1, len(modules()) // count)][:count]
        cost, _ = best_of(2, lambda chosen=chosen: years_of(chosen, classes, DC_LOSS_PCT))
        row("years of modules", f"{count:,}", f"{cost.cpu_s:.3f}", f"{cost.cpu_s / count * 1e6:.0f}")
