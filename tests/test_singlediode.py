"""Single-diode model: against pvlib's own solvers and the parameters of the public CEC table."""

from __future__ import annotations

from dataclasses import fields

import numpy as np
import pandas as pd
import pvlib
import pytest

from catalog.records import SIX_PARAMETERS, Module
from matcher.errors import MatcherError
from matcher.singlediode import (
    SixParameters,
    at_conditions,
    max_power_point,
    six_parameters,
    stacked,
)

ORDER = ("alpha_sc", "a_ref", "I_L_ref", "I_o_ref", "R_sh_ref", "R_s", "Adjust")  # of calcparams_cec


@pytest.fixture
def table(cec_modules_csv: pd.DataFrame) -> pd.DataFrame:
    return cec_modules_csv


def parameters(rows: pd.DataFrame) -> SixParameters:
    return SixParameters(*(rows[f.name].to_numpy(float) for f in fields(SixParameters)))


def record(row: pd.Series, **changes: object) -> Module:
    """A record with the datasheet values of a row of the table, without its six parameters."""
    values = dict(
        maker="Invented", model="IM-1", technology=row.Technology, bifacial=False,
        pmax_w=row.STC, voc_v=row.V_oc_ref, isc_a=row.I_sc_ref, vmp_v=row.V_mp_ref, imp_a=row.I_mp_ref,
        voc_coef_pct=row.beta_oc / row.V_oc_ref * 100, isc_coef_pct=row.alpha_sc / row.I_sc_ref * 100,
        pmax_coef_pct=row.gamma_r,
    )  # fmt: skip
    return Module(**{**values, **changes})


@pytest.mark.parametrize(
    ("irradiance", "cell_c"), [(1000, 25), (1000, 75), (1400, -30), (200, 10), (5, 0), (0.05, 20)]
)
def test_max_power_point_agrees_with_pvlib_over_the_table(table, irradiance, cell_c):
    # Source: pvlib.singlediode.bishop88_mpp on pvlib.pvsystem.calcparams_cec.
    rows = table.iloc[::7]
    params = parameters(rows)
    g, t = np.full(len(rows), float(irradiance)), np.full(len(rows), float(cell_c))
    vmp, imp = max_power_point(params, g, t)
    curve = pvlib.pvsystem.calcparams_cec(g, t, *(getattr(params, name) for name in ORDER))
    theirs = pvlib.singlediode.bishop88_mpp(*curve)
    np.testing.assert_allclose(imp, theirs[0], rtol=1e-8)
    np.testing.assert_allclose(vmp, theirs[1], rtol=1e-8)


def test_max_power_point_agrees_with_the_lambert_w_solution(table):
    # Source: pvlib.pvsystem.singlediode(method="lambertw"), a golden-section search, good to some 1e-5.
    params = parameters(table.iloc[[100, 9000, 20000]])
    for k in range(3):
        one = SixParameters(*(float(getattr(params, f.name)[k]) for f in fields(SixParameters)))
        g, t = np.array([80.0, 600.0, 1100.0]), np.array([5.0, 40.0, 65.0])
        vmp, imp = max_power_point(one, g, t)
        curve = pvlib.pvsystem.calcparams_cec(g, t, *(getattr(one, name) for name in ORDER))
        theirs = pvlib.pvsystem.singlediode(*curve, method="lambertw")
        np.testing.assert_allclose(vmp * imp, theirs["p_mp"], rtol=1e-7)
        np.testing.assert_allclose(vmp, theirs["v_mp"], rtol=1e-4)


def test_no_light_no_power_and_nan_stays_alone(table):
    one = SixParameters(*(float(table[f.name].iloc[0]) for f in fields(SixParameters)))
    vmp, imp = max_power_point(one, [0.0, -3.0, np.nan, 800.0], [20.0, 20.0, 20.0, 40.0])
    assert list(vmp[:2]) == [0, 0] and list(imp[:2]) == [0, 0]
    assert np.isnan(vmp[2]) and vmp[3] > 0 and imp[3] > 0


def test_many_modules_broadcast_like_one_at_a_time(table):
    params = parameters(table.iloc[:5])
    g, t = np.array([200.0, 900.0]), np.array([10.0, 50.0])
    vmp, imp = max_power_point(at_conditions(params), g, t)
    assert vmp.shape == imp.shape == (5, 2)
    for k in range(5):
        one = SixParameters(*(getattr(params, f.name)[k] for f in fields(SixParameters)))
        np.testing.assert_allclose(max_power_point(one, g, t)[0], vmp[k], rtol=1e-12)


def test_record_parameters_are_taken_as_they_are(table):
    row = table.iloc[42]
    module = record(row, **{name: float(row[name]) for name in SIX_PARAMETERS})
    found = six_parameters(module)
    assert [getattr(found, name) for name in SIX_PARAMETERS] == [row[name] for name in SIX_PARAMETERS]
    assert found.alpha_sc == pytest.approx(row.alpha_sc, rel=1e-12)


def test_fit_to_datasheet_values_comes_near_the_tables_own_parameters(table):
    # Source: the six parameters of the CEC table; 30 crystalline rows.
    rows = table[table.Technology.str.contains("c-Si")].iloc[::720]
    fitted = stacked([six_parameters(record(row)) for _, row in rows.iterrows()])
    own = parameters(rows)
    at_25, at_25_own = (np.prod(max_power_point(p, 1000.0, 25.0), axis=0) for p in (fitted, own))
    for cell_c in (70.0, -10.0):
        vmp, imp = max_power_point(fitted, 1000.0, cell_c)
        vmp_own, imp_own = max_power_point(own, 1000.0, cell_c)
        assert np.percentile(np.abs(vmp / vmp_own - 1), 95) < 0.015
        change, change_own = vmp * imp / at_25, vmp_own * imp_own / at_25_own
        assert np.percentile(np.abs(change / change_own - 1), 95) < 0.003


def test_pmax_coefficient_of_the_table_is_the_slope_from_minus_10_to_50(table):
    # Source: column gamma_r of the CEC table against its own parameters (Dobos 2012).
    params = parameters(table)
    power = [np.prod(max_power_point(params, 1000.0, t), axis=0) for t in (-10.0, 25.0, 50.0)]
    off = (power[2] - power[0]) / power[1] / 60 * 100 - table.gamma_r
    assert np.percentile(np.abs(off), 99) < 0.0005


@pytest.mark.parametrize("missing", ["voc_coef_pct", "isc_coef_pct", "pmax_coef_pct"])
def test_no_coefficient_no_parameters(table, missing):
    assert six_parameters(record(table.iloc[7], **{missing: None})) is None


def test_values_that_no_module_has_give_one_clear_line(table):
    with pytest.raises(MatcherError, match=r"Invented IM-1: .*vmp_v, imp_a.*pmax_coef_pct -1\.4"):
        six_parameters(record(table.iloc[7], pmax_coef_pct=-1.4))
