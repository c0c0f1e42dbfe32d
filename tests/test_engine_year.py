"""Clipping loss and energy from real weather files: the engine's condensed year against an hour-by-hour one."""

from __future__ import annotations

from pathlib import Path

import pvlib
import pytest

import oracle_year
from catalog.records import Inputs, Inverter, Site
from matcher.fit import Request, fit
from matcher.moduleyear import condense, module_year, plane_year
from matcher.singlediode import six_parameters
from matcher.weather import read_weather
from random_records import cec_module, cec_rows

DATA = Path(pvlib.__path__[0]) / "data"

#: Sandia parameters of the usual size, invented; unlike groups, one with a current limit that bites.
INVERTER = Inverter(
    maker="Hand",
    model="Two",
    ac_power_w=6000.0,
    mppt_low_v=120.0,
    mppt_high_v=480.0,
    max_dc_voltage_v=600.0,
    inputs=(Inputs(trackers=1, strings_per_tracker=2, max_current_a=12.0), Inputs(trackers=1, strings_per_tracker=1)),
    Pso=35.0,
    Paco=6000.0,
    Pdco=6240.0,
    Vdco=360.0,
    C0=-3.3e-6,
    C1=2e-5,
    C2=1.5e-3,
    C3=-4e-4,
    Pnt=0.5,
)


@pytest.mark.parametrize("file", ["703165TY.csv", "723170TYA.CSV"])
@pytest.mark.parametrize(("row", "tilt", "azimuth"), [(5, 30.0, 180.0), (60, 10.0, 250.0)])
def test_condensed_year_meets_the_hour_by_hour_year(file, row, tilt, azimuth):
    """TMY3 files that pvlib installs; every step by pvlib, loss within 0.02 percentage points, energy 0.1 %."""
    module = cec_module(cec_rows()[row])
    weather, meta = oracle_year.read_tmy3_mid_interval(str(DATA / file))
    place = (meta["latitude"], meta["longitude"], meta["altitude"])
    power, volts = oracle_year.module_year(module, *oracle_year.plane(weather, *place, tilt, azimuth))

    year = condense(module_year(six_parameters(module), plane_year(read_weather(DATA / file), tilt, azimuth)))
    request = Request(Site(name="Hand", design_low_c=-20.0, design_high_c=35.0), ratio=(1.0, 1.6), every=True)
    options = list(fit([module], [INVERTER], request, year).options(full=False))
    assert len(options) > 12
    losses = []
    for option in options[:: len(options) // 6]:
        arrangement = tuple(
            tuple(sorted((t.strings, t.in_series) for t in option.arrangement if t.inputs == g)) for g in range(2)
        )
        loss, energy = oracle_year.clipping(INVERTER, arrangement, power, volts)
        assert option.clipping_loss_pct == pytest.approx(loss, abs=0.02), option.label
        assert option.yearly_kwh == pytest.approx(energy, rel=1e-3), option.label
        losses.append(loss)
    assert max(losses) > 0.5
