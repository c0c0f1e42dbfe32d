"""Clipping and energy of every option of 200 random pairs in three unlike climates, against hour by hour pvlib."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pvlib
import pytest

from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.records import Inverter, Module, Site
from matcher.fit import Request, fit
from matcher.moduleyear import ModuleYear, PlaneYear, condense, condense_plane, module_year, plane_year
from matcher.singlediode import six_parameters
from matcher.sweep import years_of
from matcher.weather import clear_sky_weather, read_weather

DATA = Path(pvlib.__file__).parent / "data"
SITE = Site(name="Accuracy", design_low_c=-15.0, design_high_c=38.0)
PAIRS = 200
SIX = ("alpha_sc", "a_ref", "I_L_ref", "I_o_ref", "R_sh_ref", "R_s", "Adjust")
SANDIA = ("Pso", "Paco", "Pdco", "Vdco", "C0", "C1", "C2", "C3", "Pnt")


def plane_of(climate: str) -> PlaneYear:
    if climate == "warm and cloudy":
        return plane_year(read_weather(DATA / "723170TYA.CSV"), 30.0, 180.0)
    if climate == "cold and overcast":
        return plane_year(read_weather(DATA / "703165TY.csv"), 40.0, 160.0)
    return plane_year(clear_sky_weather(-23.0, 133.0, -2.0, 44.0), 10.0, 0.0)


def hour_by_hour(module: Module, plane: PlaneYear) -> tuple[np.ndarray, np.ndarray]:
    """Power after 2 % DC losses [W] and voltage [V]: pvlib.pvsystem.calcparams_cec, singlediode.bishop88_mpp."""
    six = six_parameters(module)
    curve = pvlib.pvsystem.calcparams_cec(plane.irradiance, plane.cell_c, *(getattr(six, name) for name in SIX))
    _, volts, power = pvlib.singlediode.bishop88_mpp(*curve, method="newton")
    return 0.98 * power, volts


def losses(
    power: np.ndarray, volts: np.ndarray, hours: np.ndarray, inverter: Inverter
) -> tuple[np.ndarray, np.ndarray]:
    """Clipping loss [%] and yearly energy [kWh] by pvlib.inverter.sandia, with its limit and with none.

    Power [W] and voltage [V] of options, shape (options, hours).
    """
    parameters = {name: getattr(inverter, name) for name in SANDIA}
    kept = np.maximum(pvlib.inverter.sandia(volts, power, parameters), 0.0) @ hours
    # pvlib's own efficiency curve, before it sets the limit.
    free = np.where(power < inverter.Pso, 0.0, np.maximum(pvlib.inverter._sandia_eff(volts, power, parameters), 0.0))
    return 100.0 * (1.0 - kept / (free @ hours)), kept / 1000.0


@pytest.mark.parametrize("climate", ["warm and cloudy", "cold and overcast", "clear and hot"])
def test_every_option_of_200_random_pairs(climate):
    plane = plane_of(climate)
    shared = condense_plane(plane)
    rng = np.random.default_rng(20)
    modules, inverters = read_cec_modules(), read_cec_inverters()
    pairs, options = 0, 0
    worst = {"own classes": [0.0, 0.0], "shared classes": [0.0, 0.0]}
    while pairs < PAIRS:
        module, inverter = modules[rng.integers(len(modules))], inverters[rng.integers(len(inverters))]
        whole = hour_by_hour(module, plane)
        many = years_of([module], shared, 2.0)
        years = {
            "own classes": condense(module_year(six_parameters(module), plane), current_limits=False),
            "shared classes": ModuleYear(many.power_w[0], many.vmp_v[0], many.hours),
        }
        tables = {name: fit([module], [inverter], Request(SITE, every=True), year).table for name, year in years.items()}
        places = {
            name: {(int(s), int(n)): k for k, (s, n) in enumerate(zip(t.strings[:, 0], t.in_series[:, 0], strict=True))}
            for name, t in tables.items()
        }
        wirings = np.array(sorted(places["own classes"]), dtype=int).reshape(-1, 2)
        pairs += len(wirings) > 0
        for first in range(0, len(wirings), 16):
            part = wirings[first : first + 16]
            options += len(part)
            s, n = part.T[:, :, None]
            loss, energy = losses(s * n * whole[0], n * whole[1], plane.hours, inverter)
            for name, t in tables.items():
                k = [places[name][wiring] for wiring in map(tuple, part.tolist())]
                worst[name][0] = max(worst[name][0], np.abs(t.clipping_pct[k] - loss).max())
                worst[name][1] = max(worst[name][1], np.abs(t.yearly_kwh[k] / energy - 1.0).max() * 100.0)
    assert options > 8_000
    for name, (loss, energy) in worst.items():
        assert loss < 0.01, f"{name}: clipping {loss:.4f} percentage points off"
        assert energy < 0.1, f"{name}: energy {energy:.4f} % off"
