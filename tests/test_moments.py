"""Energies from sums over a year, against pvlib's Sandia model entry by entry."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pvlib
import pytest

from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.records import SANDIA_PARAMETERS, Inputs
from matcher.columns import InverterColumns
from matcher.moduleyear import ModuleYear, condense_plane, plane_year
from matcher.moments import energies
from matcher.singlelosses import single_losses
from matcher.sweep import years_of
from matcher.weather import read_weather

DATA = Path(pvlib.__file__).parent / "data"


@pytest.fixture(scope="module")
def year() -> ModuleYear:
    """Condensed years of modules of all sorts, shape (modules, classes)."""
    plane = condense_plane(plane_year(read_weather(DATA / "723170TYA.CSV"), 30.0, 180.0))
    return years_of(read_cec_modules()[::1100], plane, 2.0)


@pytest.fixture(scope="module")
def cases(year):
    """Inverters of the public table, and random options of them: year, inverter, strings, modules in series."""
    rng = np.random.default_rng(8)
    inverters = read_cec_inverters()[::11]
    columns, n = InverterColumns.of(inverters), 1_500
    line, row = np.sort(rng.integers(0, len(year.power_w), n)), rng.integers(0, len(inverters), n)
    volts = rng.uniform(columns.mppt_low_v[row], columns.mppt_high_v[row])
    in_series = np.maximum(1, (volts / year.vmp_v[line].max(axis=1)).astype(int))
    peak = in_series * year.power_w[line].max(axis=1)
    strings = np.maximum(1, (columns.ac_power_w[row] * rng.uniform(0.3, 2.5, n) / peak).astype(int))
    return inverters, (line, row, strings, in_series)


def entry_by_entry(year, inverters, line, row, strings, in_series, max_current_a=np.inf):
    """AC energy [Wh] without limits, with the power limit, with both: pvlib.inverter.sandia with Paco as the limit.

    pvlib clips inside; without limits is the same function with a Paco far off and the curve left as it is,
    which its formula (King et al. 2007, eq. 1 to 4) does not allow, so that equation is written out here.
    """
    i = inverters[row]
    p = {name: getattr(i, name) for name in SANDIA_PARAMETERS}
    dc, v = strings * in_series * year.power_w[line], in_series * year.vmp_v[line]

    def free(dc):
        a = p["Pdco"] * (1 + p["C1"] * (v - p["Vdco"]))
        b = p["Pso"] * (1 + p["C2"] * (v - p["Vdco"]))
        c = p["C0"] * (1 + p["C3"] * (v - p["Vdco"]))
        ac = (p["Paco"] / (a - b) - c * (a - b)) * (dc - b) + c * (dc - b) ** 2
        return np.maximum(np.where(dc < p["Pso"], 0.0, ac), 0.0)

    held = np.minimum(dc, max_current_a * v)
    by_pvlib = pvlib.inverter.sandia(v, dc, {**p, "Pnt": 0.0})
    return free(dc) @ year.hours, np.maximum(by_pvlib, 0.0) @ year.hours, np.minimum(free(held), i.ac_power_w) @ year.hours


def test_energies_are_those_of_pvlib(year, cases):
    inverters, options = cases
    hours = np.broadcast_to(year.hours, year.power_w.shape)
    found, served = energies(year.power_w, year.vmp_v, hours, InverterColumns.of(inverters), *options)
    assert served.mean() > 0.98  # of the public table; the others go class by class
    for k in range(len(served)):
        unlimited, limited, _ = entry_by_entry(year, inverters, *(o[k] for o in options))
        if served[k]:
            assert found[0, k] == pytest.approx(unlimited, rel=1e-9)
            assert found[1, k] == pytest.approx(limited, rel=1e-9)
            assert found[2, k] == found[1, k]


def test_current_limits(year, cases):
    inverters, options = cases
    line, row, strings, in_series = options
    limits = np.random.default_rng(9).uniform(0.3, 1.5, len(inverters))
    limited = [
        replace(i, inputs=(Inputs(trackers=1, max_current_a=float(share * i.Pdco / i.Vdco)),))
        for i, share in zip(inverters, limits, strict=True)
    ]
    hours = np.broadcast_to(year.hours, year.power_w.shape)
    found, served = energies(year.power_w, year.vmp_v, hours, InverterColumns.of(limited), *options)
    acting = 0
    for k in np.flatnonzero(served)[::3]:
        wanted = entry_by_entry(year, limited, *(o[k] for o in options), limited[row[k]].inputs[0].max_current_a)
        np.testing.assert_allclose(found[:, k], wanted, rtol=1e-9)
        acting += wanted[2] < wanted[1] * 0.999
    assert acting > 100


def test_constant_efficiency_and_a_limit_below_the_rated_power(year, cases):
    inverters, (line, row, strings, in_series) = cases
    constant = [replace(i, Pso=None, weighted_efficiency_pct=96.0, ac_power_w=0.7 * i.ac_power_w) for i in inverters]
    hours = np.broadcast_to(year.hours, year.power_w.shape)
    found, served = energies(year.power_w, year.vmp_v, hours, InverterColumns.of(constant), line, row, strings, in_series)
    assert served.all()
    ac = 0.96 * (strings * in_series)[:, None] * year.power_w[line]
    limit = np.array([i.ac_power_w for i in constant])[row]
    np.testing.assert_allclose(found[0], ac @ year.hours, rtol=1e-9)
    np.testing.assert_allclose(found[1], np.minimum(ac, limit[:, None]) @ year.hours, rtol=1e-9)


def test_efficiencies_that_the_sums_do_not_serve_go_class_by_class(year, cases):
    inverters, options = cases
    line, row, strings, in_series = options
    odd = [
        replace(i, **change)
        for i, change in zip(
            inverters,
            ({"C1": 0.01}, {"C0": -5e-4}, {"ac_power_w": 0.9 * inverters[2].ac_power_w}, {"C2": 0.05}) * 100,
            strict=False,
        )
    ]
    columns = InverterColumns.of(odd)
    hours = np.broadcast_to(year.hours, year.power_w.shape)
    _, served = energies(year.power_w, year.vmp_v, hours, columns, *options)
    losses = single_losses(year, columns, row, strings, in_series, line)
    assert 0 < served.mean() < 0.6
    for k in np.flatnonzero(~served)[::20]:
        one = entry_by_entry(year, odd, *(o[k] for o in options))
        assert losses.yearly_kwh[k] == pytest.approx(one[2] / 1000, rel=1e-9)
