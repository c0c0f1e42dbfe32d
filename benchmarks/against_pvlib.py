"""All arrangements of one module on all inverters, with clipping: beside a plain loop over pvlib."""

from __future__ import annotations

import random

import numpy as np
import pvlib

from benchmarks.cases import DC_LOSS_PCT, SITE, inverters, module, plane
from benchmarks.measuring import best_of, heading, row
from matcher.columns import InverterColumns
from matcher.fit import Fit, Request, fit
from matcher.moduleyear import condense, module_year
from matcher.singlediode import six_parameters

#: Options that the loop is timed on.
_SAMPLE = 1_500
_SANDIA = ("Pso", "Paco", "Pdco", "Vdco", "C0", "C1", "C2", "C3", "Pnt")


def run() -> None:
    """Time both over the same options, and hold the energies of the sample against each other."""
    heading("One module, all inverters, every arrangement with its clipping")
    one, takers = module(), inverters()
    year = module_year(six_parameters(one), plane(), DC_LOSS_PCT)
    hours = np.zeros((2, 8760))
    hours[:, plane().rows] = year.power_w, year.vmp_v

    def ferrule(every: bool) -> Fit:
        short = condense(module_year(six_parameters(one), plane(), DC_LOSS_PCT), current_limits=False)
        return fit([one], takers, Request(SITE, every=every), short)

    every, found = best_of(5, lambda: ferrule(True))
    best, _ = best_of(5, lambda: ferrule(False))
    t = found.table
    sample = random.Random(1).sample(range(len(t)), _SAMPLE)
    parameters = [{name: getattr(i, name) for name in _SANDIA} for i in takers]
    options = [
        (parameters[i], s, n)
        for i, s, n in zip(t.inverter[sample].tolist(), t.strings[sample, 0].tolist(), t.in_series[sample, 0].tolist(), strict=True)
    ]  # fmt: skip

    def loop(power: np.ndarray, volts: np.ndarray) -> list[float]:
        energies = []
        for inverter, strings, in_series in options:
            ac = pvlib.inverter.sandia(in_series * volts, strings * in_series * power, inverter)
            energies.append(np.maximum(ac, 0.0).sum() / 1000)
        return energies

    plain, energies = best_of(3, lambda: loop(*hours))
    daylight, _ = best_of(3, lambda: loop(year.power_w, year.vmp_v))
    each = {"all": plain.cpu_s / _SAMPLE, "daylight": daylight.cpu_s / _SAMPLE, "ferrule": every.cpu_s / len(t)}
    row("", "us/option", "s for all", "ratio")
    for what, name in (("pvlib.inverter.sandia, 8,760 hours", "all"), (f"the same, {len(year.hours):,} sunlit hours only", "daylight")):
        row(what, f"{each[name] * 1e6:.1f}", f"{each[name] * len(t):.1f}", f"{each[name] / each['ferrule']:.0f} x")
    row(f"Ferrule, {len(t):,} options found, worked out, ranked", f"{each['ferrule'] * 1e6:.2f}", f"{every.cpu_s:.3f}", "1 x")
    row("Ferrule, the best of each inverter", "", f"{best.cpu_s:.3f}", f"{each['all'] * len(t) / best.cpu_s:.0f} x")
    off = np.abs(t.yearly_kwh[sample] / np.array(energies) - 1) * 100
    # pvlib clips at Paco, which is the rated AC power in the public table.
    print(f"  Yearly energy of the sample: {off.max():.4f} % apart at most. The loop is timed on {_SAMPLE:,} of the options,"
          "\n  makes one call for each and leaves out finding them, the unlimited power that clipping is counted"
          "\n  against, and the ranking, so the ratio is what it is at least.")  # fmt: skip
    assert off.max() < 0.1
    _where_time_goes(found)


def _where_time_goes(found: Fit) -> None:
    """Parts of the search, to see what a further factor would take."""
    from matcher.singlelosses import single_losses

    t, s = found.table, found.search
    assert found.year is not None
    year = found.year
    losses, _ = best_of(3, lambda: single_losses(year, s.inverters, t.inverter, t.strings[:, 0], t.in_series[:, 0]))
    ranking, _ = best_of(3, lambda: s.rank(t))
    columns, _ = best_of(3, lambda: InverterColumns.of(found.inverters))
    row("  of that: losses", "", f"{losses.cpu_s:.3f}")
    row("  ranking", "", f"{ranking.cpu_s:.3f}")
    row("  records to arrays", "", f"{columns.cpu_s:.3f}")
