"""What the trade says of inverters, measured over the public CEC table.

The Sandia model is pvlib's (King et al. 2007, SAND2007-5036); the shares are what was measured on the table
of 2019-03-05.
"""

from __future__ import annotations

import numpy as np
import pvlib
import pytest

from catalog.cec import read_cec_inverters

LOADS = np.arange(5, 101, 5) / 100  # DC power over Pdco


@pytest.fixture(scope="module")
def efficiency() -> np.ndarray:
    """Efficiency of every inverter of the table at Vdco, by load: shape (inverters, loads)."""
    inverters = read_cec_inverters()
    names = ("Paco", "Pdco", "Vdco", "Pso", "C0", "C1", "C2", "C3")
    parameters = {name: np.repeat([getattr(i, name) for i in inverters], len(LOADS)) for name in names}
    dc = parameters["Pdco"] * np.tile(LOADS, len(inverters))
    # Below Pso the model gives the night tare, which is left out of the efficiency.
    ac = pvlib.inverter.sandia(parameters["Vdco"], dc, {**parameters, "Pnt": 0.0})
    return (ac / dc).reshape(len(inverters), len(LOADS))


def at(efficiency: np.ndarray, load: float) -> np.ndarray:
    return efficiency[:, np.argmin(abs(LOADS - load))]


# Common practice, no source: inverters reach their best efficiency near half load.


def test_best_load_is_near_half(efficiency):
    best = LOADS[efficiency.argmax(axis=1)]
    assert np.median(best) == pytest.approx(0.55)
    assert np.mean((best > 0.29) & (best < 0.71)) == pytest.approx(0.834, abs=0.005)


def test_half_load_is_nearly_as_good_as_the_best(efficiency):
    short_pp = 100 * (efficiency.max(axis=1) - at(efficiency, 0.5))  # percentage points
    assert np.mean(short_pp <= 0.2) == pytest.approx(0.881, abs=0.005)
    assert np.mean(short_pp <= 0.5) == pytest.approx(0.972, abs=0.005)


# Common practice, no source: inverters reach their rated efficiency near half load.


def test_rated_efficiency_is_reached_by_half_load(efficiency):
    assert np.mean(at(efficiency, 0.5) >= at(efficiency, 1.0)) == pytest.approx(0.819, abs=0.005)


# Common practice, no source: an inverter that idles is inefficient.


def test_a_tenth_of_the_load_is_worse_than_half(efficiency):
    assert np.mean(at(efficiency, 0.1) < at(efficiency, 0.5)) > 0.999
    assert np.median(at(efficiency, 0.5) - at(efficiency, 0.1)) == pytest.approx(0.035, abs=0.003)


def test_efficiency_is_below_one(efficiency):
    assert (efficiency > 0).mean() > 0.9999  # a few draw more than a twentieth of Pdco to start
    assert efficiency.max() < 1
