"""Arrays whose parts face different ways, against an hour-by-hour calculation by pvlib."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pvlib
import pytest

import oracle_year
from catalog.records import Inputs, Inverter, Site
from cli.ranges import array_of
from matcher.fit import fit
from matcher.moduleyear import facing_years, plane_year
from matcher.request import Request
from matcher.singlediode import six_parameters
from matcher.weather import read_weather
from random_records import cec_module, cec_rows

FILE = Path(pvlib.__path__[0]) / "data" / "723170TYA.CSV"
FACES = ((95.0, 35.0), (265.0, 20.0))
SITE = Site(name="Hand", design_low_c=-10.0, design_high_c=38.0)
#: Invented; the first group limits the current of two strings, the second does not.
INVERTER = Inverter(
    maker="Hand", model="Made", ac_power_w=6500.0, mppt_low_v=150.0, mppt_high_v=800.0, max_dc_voltage_v=1000.0,
    inputs=(Inputs(trackers=1, strings_per_tracker=2, max_current_a=13.0), Inputs(trackers=2, strings_per_tracker=2)),
    Pso=30.0, Paco=6500.0, Pdco=6750.0, Vdco=400.0, C0=-4e-6, C1=3e-5, C2=1e-3, C3=-5e-4, Pnt=0.5,
)  # fmt: skip


def hourly(module, face: tuple[float, float]) -> tuple[np.ndarray, np.ndarray]:
    """Power and voltage of one module in all 8,760 hours by pvlib, 0 where it is dark."""
    weather, meta = oracle_year.read_tmy3_mid_interval(str(FILE))
    azimuth, tilt = face
    irradiance, cell = oracle_year.plane(
        weather, meta["latitude"], meta["longitude"], meta["altitude"], tilt, azimuth
    )
    power, volts = np.zeros(irradiance.size), np.zeros(irradiance.size)
    lit = irradiance > 0
    power[lit], volts[lit] = oracle_year.module_year(module, irradiance, cell)
    return power, volts


def by_hand(option, years) -> tuple[float, float]:
    """Clipping loss [%] and energy [kWh], hour by hour, by the definitions of King 2007 and Hansen 2022."""
    wanted = kept = 0.0
    for h in range(8760):
        volts, full, held = [], [], []
        for t in option.arrangement:
            power, voltage = (series[h] for series in years[t.face - 1])
            limit = INVERTER.inputs[t.inputs].max_current_a
            volts.append(t.in_series * voltage)
            full.append(t.strings * t.in_series * power)
            held.append(full[-1] if limit is None else min(full[-1], limit * volts[-1]))
        wanted += oracle_year.ac_power(volts, full, INVERTER)
        kept += min(oracle_year.ac_power(volts, held, INVERTER), INVERTER.ac_power_w)
    return (1 - kept / wanted) * 100, kept / 1000


def test_each_part_has_the_sun_of_its_own_plane():
    module = cec_module(cec_rows()[60])
    weather = read_weather(FILE)
    planes = [plane_year(weather, tilt, azimuth) for azimuth, tilt in FACES]
    year = facing_years(six_parameters(module), planes)
    request = Request(SITE, ratio=(0.1, 9.0), strings=((12, 2), (12, 1), (11, 1)), faces=(*FACES, FACES[1]), every=True)
    options = list(fit([module], [INVERTER], request, year).options())
    years = [hourly(module, face) for face in FACES]
    assert len({o.label for o in options}) == len(options) > 2
    losses = set()
    for option in options:
        # Exactly the strings asked for, each part on trackers of its own.
        strings = {}
        for t in option.arrangement:
            strings[t.face, t.in_series] = strings.get((t.face, t.in_series), 0) + t.strings
        assert strings == {(1, 12): 2, (2, 12): 1, (2, 11): 1}
        loss, energy = by_hand(option, years)
        assert option.clipping_loss_pct == pytest.approx(loss, abs=5e-3)
        assert option.yearly_kwh == pytest.approx(energy, rel=1e-4)
        losses.add(round(loss, 2))
    assert len(losses) > 1, "the current limit must tell options apart"


def test_faces_on_the_command_line():
    assert array_of("2x11@170/30, 1x12@260/30") == (((11, 2), (12, 1)), ((170.0, 30.0), (260.0, 30.0)))
    assert array_of("2x11,1x12") == (((11, 2), (12, 1)), ())


@pytest.mark.parametrize("text", ["2x11@170/30,1x12", "2x11@170", "2x11@400/30", "2x11@a/b", "2x11@170/95"])
def test_half_a_face_is_refused(text, ferrule, demo_catalog):
    ran = ferrule("fit", "-m", "QF-410H", "--site", "Butterfield Barn", "--strings", text)
    assert (ran.status, ran.out) == (2, "")
    assert ran.err.count("\n") == 1 and "--strings" in ran.err


def test_the_document_says_how_each_part_faces(ferrule, demo_catalog):
    ran = ferrule(
        "fit", "-m", "QF-410H", "-i", "Cello 10", "--site", "Butterfield Barn", "--json",
        "--strings", "1x16@100/30,1x17@260/25",
    )  # fmt: skip
    assert ran.status == 0
    found = json.loads(ran.out)["options"][0]["arrangement"]
    assert {(t["in_series"], t["azimuth"], t["tilt"]) for t in found} == {(16, 100.0, 30.0), (17, 260.0, 25.0)}
