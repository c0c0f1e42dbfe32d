"""The six-parameter single-diode model of the CEC, and its maximum power point over whole arrays.

The five parameters at operating conditions follow De Soto 2006 with the adjusted Isc coefficient of
Dobos 2012, in the form and with the defaults of ``pvlib.pvsystem.calcparams_cec`` (band gap 1.121 eV,
-0.0002677 per K; shunt resistance falling with irradiance). pvlib's own maximum power point search is
replaced by a Newton iteration on the logarithm of the optimum condition: the same answer to 1e-8, at a
small part of the time and memory, which is what makes a whole table of modules affordable.

References
----------
De Soto, Klein and Beckman 2006, doi:10.1016/j.solener.2005.06.010
Dobos 2012, doi:10.1115/1.4005759
Batzelis and Papathanassiou 2016, doi:10.1109/TSTE.2015.2503435
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

from catalog.records import SIX_PARAMETERS, Module
from matcher.errors import MatcherError

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import ArrayLike

_T_REF = 298.15  # [K]
_BAND_GAP = 1.121  # [eV] at 25 degC, the default of calcparams_cec
_BAND_GAP_SLOPE = -0.0002677  # [1/K]
_BOLTZMANN = 8.617333262145179e-05  # [eV/K]

#: The two cell temperatures whose difference in power gives the Pmax coefficient [degC]. The coefficient
#: of all 21,535 rows of the CEC table of 2019-03-05 is met to 0.0004 %/K by (P(50) - P(-10)) / 60 K / P(25);
#: the slope at 25 degC misses by 0.0025 %/K in the median.
_COEF_LOW_C, _COEF_HIGH_C = -10.0, 50.0


#: Datasheet values that the fit needs, in the order in which it takes them.
FITTED_FROM = ("vmp_v", "imp_a", "voc_v", "isc_a", "voc_coef_pct", "isc_coef_pct", "pmax_coef_pct")


@dataclass(frozen=True, slots=True)
class SixParameters:
    """Parameters of one module (floats) or of several (arrays of one shape), under their published names.

    alpha_sc [A/K] is the stated Isc coefficient, before Adjust [%]; a_ref [V], I_L_ref [A], I_o_ref [A],
    R_s [ohm] and R_sh_ref [ohm] hold at 1000 W/m2 and 25 degC.
    """

    alpha_sc: float | np.ndarray
    a_ref: float | np.ndarray
    I_L_ref: float | np.ndarray
    I_o_ref: float | np.ndarray
    R_s: float | np.ndarray
    R_sh_ref: float | np.ndarray
    Adjust: float | np.ndarray


def six_parameters(module: Module) -> SixParameters | None:
    """Six parameters of a module: those of its record, else fitted to its datasheet values.

    Parameters
    ----------
    module
        With all six parameters and ``isc_coef_pct`` in the record these are taken as they are. Otherwise
        they are fitted, which needs the three temperature coefficients of Voc, Isc and Pmax.

    Returns
    -------
    SixParameters or None
        ``None`` where a coefficient that the fit needs is not stated.

    Raises
    ------
    MatcherError
        When no set of parameters meets the datasheet values.
    """
    if module.isc_coef_pct is None:
        return None
    alpha_sc = module.isc_coef_pct / 100 * module.isc_a
    stated = [getattr(module, name) for name in SIX_PARAMETERS]
    if None not in stated:
        return SixParameters(alpha_sc, *stated)
    if module.voc_coef_pct is None or module.pmax_coef_pct is None:
        return None
    fitted = fit_six_parameters(*(getattr(module, name) for name in FITTED_FROM))
    values = {f.name: float(getattr(fitted, f.name)[0]) for f in fields(SixParameters)}
    if values["a_ref"] != values["a_ref"]:
        raise MatcherError(
            f"{module.name}: no single-diode parameters meet its datasheet values; check vmp_v, imp_a, voc_v, isc_a "
            f"and the three temperature coefficients (voc_coef_pct {module.voc_coef_pct:g}, isc_coef_pct "
            f"{module.isc_coef_pct:g}, pmax_coef_pct {module.pmax_coef_pct:g} %/K)"
        )
    return SixParameters(**values)


def fit_six_parameters(
    vmp_v: ArrayLike,
    imp_a: ArrayLike,
    voc_v: ArrayLike,
    isc_a: ArrayLike,
    voc_coef_pct: ArrayLike,
    isc_coef_pct: ArrayLike,
    pmax_coef_pct: ArrayLike,
) -> SixParameters:
    """Parameters from the values at STC [V, A] and the three coefficients [%/K] of n datasheets, shape (n,).

    For a given Adjust, the closed form of Batzelis and Papathanassiou (``pvlib.ivtools.sdm.
    fit_desoto_batzelis``) with the Isc coefficient scaled by (1 - Adjust/100) and the Voc coefficient by
    (1 + Adjust/100); Adjust is the root at which the model's Pmax coefficient (see `_COEF_LOW_C`) meets the
    stated one. Against the CEC table's own parameters, from its rated values, Vmp at 70 degC comes out 0.5 %
    high in the median and within -0.2 to 1.6 % (1st to 99th percentile of 400 rows). The closed form can give
    a negative shunt resistance for very square curves; the model is then still smooth around its maximum.

    Returns
    -------
    SixParameters
        Arrays (n,); NaN where no Adjust between -98 and 98 % does it.

    References
    ----------
    Batzelis and Papathanassiou 2016, doi:10.1109/TSTE.2015.2503435; Dobos 2012, doi:10.1115/1.4005759
    """
    import numpy as np
    from pvlib.ivtools.sdm import fit_desoto_batzelis
    from scipy.optimize.elementwise import find_root

    rated = np.broadcast_arrays(
        *(np.atleast_1d(np.asarray(v, dtype=float)) for v in
          (vmp_v, imp_a, voc_v, isc_a, voc_coef_pct, isc_coef_pct, pmax_coef_pct))
    )  # fmt: skip
    temperatures = np.array([_COEF_LOW_C, 25.0, _COEF_HIGH_C])

    def closed_form(adjust: np.ndarray, *rated: np.ndarray) -> SixParameters:
        vmp, imp, voc, isc, voc_coef, isc_coef, _ = rated
        alpha_sc, beta_voc = isc_coef / 100 * isc, voc_coef / 100 * voc
        found = fit_desoto_batzelis(vmp, imp, voc, isc, alpha_sc * (1 - adjust / 100), beta_voc * (1 + adjust / 100))
        return SixParameters(alpha_sc, **{n: found[n] for n in SIX_PARAMETERS[:-1]}, Adjust=adjust)

    def miss(adjust: np.ndarray, *rated: np.ndarray) -> np.ndarray:
        params = closed_form(adjust, *rated)
        at_each = SixParameters(*(np.asarray(getattr(params, f.name))[..., None] for f in fields(SixParameters)))
        vmp, imp = max_power_point(at_each, 1000.0, temperatures)
        low, at_25, high = np.moveaxis(vmp * imp, -1, 0)
        return (high - low) / (_COEF_HIGH_C - _COEF_LOW_C) / at_25 * 100 - rated[-1]

    with np.errstate(all="ignore"):
        grid = np.linspace(-98.0, 98.0, 50)
        misses = miss(grid, *(values[:, None] for values in rated))
        crosses = misses[:, :-1] * misses[:, 1:] <= 0  # NaN crosses nothing
        # The root nearest to no adjustment.
        k = np.where(crosses, np.abs(grid[:-1] + 2.0), np.inf).argmin(axis=1)
        found = closed_form(find_root(miss, (grid[k], grid[k + 1]), args=tuple(rated)).x, *rated)
    none = ~crosses.any(axis=1)
    return SixParameters(*(np.where(none, np.nan, getattr(found, f.name)) for f in fields(SixParameters)))


def stacked(params: Sequence[SixParameters]) -> SixParameters:
    """Parameters of several modules as one set of arrays, shape (modules,)."""
    import numpy as np

    return SixParameters(
        *(np.array([getattr(p, f.name) for p in params], dtype=float) for f in fields(SixParameters))
    )


def max_power_point(
    params: SixParameters, irradiance: ArrayLike, cell_c: ArrayLike
) -> tuple[np.ndarray, np.ndarray]:
    """Voltage and current at the maximum power point.

    Parameters
    ----------
    params
        Floats, or arrays that broadcast with the other two: for every module at every condition give
        arrays of shape (modules, 1) (see `at_conditions`) and conditions of shape (conditions,).
    irradiance
        Plane-of-array irradiance [W/m2].
    cell_c
        Cell temperature [degC].

    Returns
    -------
    vmp, imp
        [V], [A] per module, broadcast shape. Both are 0 where the irradiance is not positive, and NaN
        where irradiance, temperature or a parameter is.
    """
    import numpy as np

    irradiance = np.asarray(irradiance, dtype=float)
    cell_k = np.asarray(cell_c, dtype=float) + 273.15
    with np.errstate(all="ignore"):
        light, log_dark, a, shunt = _operating(params, irradiance / 1000, cell_k)
        vmp, imp = _optimum(light, log_dark, a, params.R_s, shunt)
    dark = irradiance <= 0
    if np.any(dark):
        vmp, imp = np.where(dark, 0.0, vmp), np.where(dark, 0.0, imp)
    return vmp, imp


def open_circuit_voltage(params: SixParameters, irradiance: ArrayLike, cell_c: ArrayLike) -> np.ndarray:
    """Open-circuit voltage of the model [V]; arguments broadcast as in `max_power_point`.

    NaN where the irradiance is not positive.
    """
    import numpy as np

    with np.errstate(all="ignore"):
        suns = np.asarray(irradiance, dtype=float) / 1000
        light, log_dark, a, shunt = _operating(params, suns, np.asarray(cell_c, dtype=float) + 273.15)
        dark = np.exp(log_dark)
        v = a * np.log1p(light / dark)
        for _ in range(20):  # Newton from above on a convex curve: falls to the root without passing it
            diode = np.exp(log_dark + v / a)
            step = (light - diode + dark - shunt * v) / (diode / a + shunt)
            v = v + step
            if not np.any(np.abs(step) > 1e-10 * np.abs(v)):
                break
    return np.where(suns > 0, v, np.nan)


def _operating(
    params: SixParameters, suns: ArrayLike, cell_k: ArrayLike
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Light current [A], logarithm of the dark current [A], a [V], shunt conductance [S] at given conditions."""
    import numpy as np

    gap = _BAND_GAP * (1 + _BAND_GAP_SLOPE * (cell_k - _T_REF))
    growth = 3 * np.log(cell_k / _T_REF) + (_BAND_GAP / _T_REF - gap / cell_k) / _BOLTZMANN
    light = suns * (params.I_L_ref + params.alpha_sc * (1 - params.Adjust / 100) * (cell_k - _T_REF))
    return light, np.log(params.I_o_ref) + growth, params.a_ref * (cell_k / _T_REF), suns / params.R_sh_ref


def at_conditions(params: SixParameters) -> SixParameters:
    """Parameters of several modules shaped (modules, 1), to broadcast against conditions of shape (n,)."""
    return SixParameters(*(getattr(params, f.name)[:, None] for f in fields(SixParameters)))


def _optimum(
    light: np.ndarray, log_dark: np.ndarray, a: np.ndarray, series: np.ndarray, shunt: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Solve d(V I)/dx = 0 for the diode voltage x, with I(x) = light - dark (exp(x/a) - 1) - shunt x.

    With V = x - R I and g = -dI/dx the optimum condition is g (x - R I) = I (1 + g R), that is
    g (x - 2 R I) = I. Its logarithm is nearly a straight line in x, so Newton's method from the ideal
    cell's optimum (series and shunt left out: x = a (w - 1) with w exp(w) = e light / dark) takes few steps.
    """
    import numpy as np

    span = np.log(light) - log_dark + 1
    w = span - np.log(span)
    for _ in range(2):  # w + ln(w) = span
        w = w * (1 + span - np.log(w)) / (1 + w)
    x = a * (w - 1)
    dark = np.exp(log_dark)
    for _ in range(12):
        diode = np.exp(log_dark + x / a)
        g = diode / a + shunt
        current = light - diode + dark - shunt * x
        lever = x - 2 * series * current
        miss = np.log(g * lever / current)
        slope = diode / (a * a * g) + (1 + 2 * series * g) / lever + g / current
        step = miss / slope
        x = x - step
        if not np.any(np.abs(step) > 1e-7 * np.abs(x)):  # quadratic: what is left is far below; NaN holds nobody up
            break
    current = light - np.exp(log_dark + x / a) + dark - shunt * x
    return x - series * current, current
