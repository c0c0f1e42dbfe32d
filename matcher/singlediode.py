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
    fitted = fit_six_parameters(
        module.vmp_v, module.imp_a, module.voc_v, module.isc_a,
        module.voc_coef_pct, module.isc_coef_pct, module.pmax_coef_pct,
    )  # fmt: skip
    if fitted is None:
        raise MatcherError(
            f"{module.name}: no single-diode parameters meet its datasheet values; check vmp_v, imp_a, voc_v, isc_a "
            f"and the three temperature coefficients (voc_coef_pct {module.voc_coef_pct:g}, isc_coef_pct "
            f"{module.isc_coef_pct:g}, pmax_coef_pct {module.pmax_coef_pct:g} %/K)"
        )
    return fitted


def fit_six_parameters(
    vmp_v: float,
    imp_a: float,
    voc_v: float,
    isc_a: float,
    voc_coef_pct: float,
    isc_coef_pct: float,
    pmax_coef_pct: float,
) -> SixParameters | None:
    """Parameters that meet the three points at STC [V, A] and the three coefficients [%/K] exactly.

    The six conditions of Dobos 2012: short circuit, open circuit, the maximum power point, zero slope of
    power there; the Voc coefficient scaled by (1 + Adjust/100), over 1 K; and the Pmax coefficient, the
    slope between -10 and 50 degC (see `_COEF_LOW_C`). For given a_ref and R_s the first three are linear
    in the light current, the dark current and the shunt conductance, so three unknowns are left to a
    root finder. It starts from the a_ref of the closed form of Batzelis and Papathanassiou (``pvlib.ivtools.
    sdm.fit_desoto_batzelis``) and the R_s that puts the maximum power point there, for the trial Adjust
    that comes nearest to the Pmax coefficient. (The closed form alone misses the stated maximum power
    point, by up to 6 % of its power for thin film, and gives a negative R_sh_ref for one module in ten.)

    A curve squarer than the equation allows (Imp close to Isc) would need a negative R_sh_ref. Then Isc is
    raised in steps of 1 %, five at most, and all else is still met: the CEC table does the same, in 4,821 of
    its 21,535 rows (the ratio of its model's Isc to the stated one is a power of 1.01).

    Returns
    -------
    SixParameters or None
        ``None`` where no positive parameters with Adjust between -100 and 100 % do it.
    """
    import numpy as np

    for step in range(6):
        points = _Points(
            vmp_v, imp_a, voc_v, isc_a * 1.01**step,
            voc_coef_pct / 100 * voc_v, isc_coef_pct / 100 * isc_a, pmax_coef_pct,
        )  # fmt: skip
        with np.errstate(all="ignore"):
            found = _root(points)
        if found is not None:
            return found
    return None


def _root(points: _Points) -> SixParameters | None:
    """Positive parameters that meet all the points, or ``None``."""
    import numpy as np
    from scipy.optimize import root

    for start in _starts(points):
        try:
            answer = root(lambda u: points.misses(points.params(*u)), start, options={"xtol": 1e-12})
            found = points.params(*answer.x)
        except (ValueError, np.linalg.LinAlgError):
            continue
        if not np.all(np.abs(points.misses(found)) < 1e-7):
            continue
        values = {f.name: float(getattr(found, f.name)) for f in fields(SixParameters)}
        if all(values[n] > 0 for n in SIX_PARAMETERS[:-1]) and abs(values["Adjust"]) <= 100:
            return SixParameters(**values)
        return None  # the one root there is, and it is not physical
    return None


@dataclass(frozen=True, slots=True)
class _Points:
    """Datasheet values that the parameters must meet, and how far given parameters miss them."""

    vmp: float  # [V]
    imp: float  # [A]
    voc: float  # [V]
    isc: float  # [A]
    beta_voc: float  # [V/K]
    alpha_sc: float  # [A/K]
    pmax_coef_pct: float  # [%/K]

    def params(self, a: ArrayLike, series: ArrayLike, adjust: ArrayLike) -> SixParameters:
        """Parameters through the three points, for given a_ref / voc, R_s isc / voc and Adjust / 100.

        Arrays broadcast to one shape. Dark current and resistance can come out negative.
        """
        import numpy as np

        a, series, adjust = np.broadcast_arrays(
            np.multiply(a, self.voc), np.multiply(series, self.voc / self.isc), np.multiply(adjust, 100.0)
        )
        # One row per point: light - dark (exp(x/a) - 1) - shunt x = current, with x the diode voltage.
        x = np.stack([self.isc * series, np.full_like(series, self.voc), self.vmp + self.imp * series], axis=-1)
        diode = np.exp((x - self.voc) / a[..., None]) - np.exp(-self.voc / a)[..., None]
        rows = np.stack([np.ones_like(x), -diode, -x], axis=-1)
        current = np.array([[self.isc], [0.0], [self.imp]])
        solved = np.linalg.solve(rows, np.broadcast_to(current, rows.shape[:-1] + (1,)))[..., 0]
        light, dark, shunt = np.moveaxis(solved, -1, 0)
        return SixParameters(self.alpha_sc, a, light, dark * np.exp(-self.voc / a), series, 1 / shunt, adjust)

    def misses(self, p: SixParameters) -> np.ndarray:
        """Peak, Voc coefficient and Pmax coefficient, each less what it should be, in like scales."""
        import numpy as np

        shunt = 1 / p.R_sh_ref
        light, log_dark, a, _ = _operating(p, 1.0, _T_REF + 1)
        voc = self.voc + self.beta_voc * (1 + p.Adjust / 100)
        dark = np.exp(log_dark)
        warm = (light - dark * np.exp(voc / a) + dark - shunt * voc) * a / self.isc / self.voc
        return np.stack([self.peak(p), warm * 1000, self.slope(p) - self.pmax_coef_pct * 10])

    def peak(self, p: SixParameters) -> np.ndarray:
        """What is missing to a level top of power at the stated maximum power point."""
        import numpy as np

        g = p.I_o_ref / p.a_ref * np.exp((self.vmp + self.imp * p.R_s) / p.a_ref) + 1 / p.R_sh_ref
        return g * (self.vmp - self.imp * p.R_s) / self.imp - 1

    def slope(self, p: SixParameters) -> np.ndarray:
        """Pmax coefficient of the parameters [0.1 %/K]."""
        low, high = (
            vmp * imp for vmp, imp in (max_power_point(p, 1000.0, t) for t in (_COEF_LOW_C, _COEF_HIGH_C))
        )
        return (high - low) / (self.vmp * self.imp) / (_COEF_HIGH_C - _COEF_LOW_C) * 1000


def _starts(points: _Points) -> list[tuple[float, float, float]]:
    """Starting values (a, series, adjust as `_Points.params` takes them), the most promising first."""
    import numpy as np
    from pvlib.ivtools.sdm import fit_desoto_batzelis

    adjust = np.linspace(-0.98, 0.98, 99)
    a = fit_desoto_batzelis(
        points.vmp, points.imp, points.voc, points.isc,
        points.alpha_sc * (1 - adjust), points.beta_voc * (1 + adjust),
    )["a_ref"] / points.voc  # fmt: skip
    most = (points.voc - points.vmp) / points.imp * points.isc / points.voc
    series = np.linspace(0, most, 81)[1:-1]
    trial = points.params(a[:, None], series, adjust[:, None])
    possible = (trial.I_o_ref > 0) & (trial.R_sh_ref > 0)
    peak = np.where(possible, np.abs(points.peak(trial)), np.inf)
    best = np.argmin(peak, axis=1)
    levels = np.isfinite(np.min(peak, axis=1))
    a, series, adjust = a[levels], series[best[levels]], adjust[levels]
    off = np.abs(points.slope(points.params(a, series, adjust)) - points.pmax_coef_pct * 10)
    order = np.argsort(off)[[0, 1, 2, 5, 10]] if off.size > 10 else np.argsort(off)
    return [(float(a[k]), float(series[k]), float(adjust[k])) for k in order]


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
