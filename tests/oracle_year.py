"""The oracle's year: hour by hour, from weather to clipping loss; apart from `matcher`, like `oracle`."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pvlib

from catalog.records import Inverter, Module
from oracle import Arrangement, six_parameters

SANDIA = ("Pso", "Paco", "Pdco", "Vdco", "C0", "C1", "C2", "C3")


def sandia_ac(v_dc: float, p_dc: float, inverter: Inverter) -> float:
    """AC power [W] without any limit: King et al. 2007, SAND2007-5036, doi:10.2172/920449."""
    a = inverter.Pdco * (1 + inverter.C1 * (v_dc - inverter.Vdco))
    b = inverter.Pso * (1 + inverter.C2 * (v_dc - inverter.Vdco))
    c = inverter.C0 * (1 + inverter.C3 * (v_dc - inverter.Vdco))
    return (inverter.Paco / (a - b) - c * (a - b)) * (p_dc - b) + c * (p_dc - b) ** 2


def ac_power(voltages: list[float], powers: list[float], inverter: Inverter) -> float:
    """AC power [W] without the AC limit, never negative; several trackers as Hansen 2022 weighs them.

    C. Hansen et al. 2022, doi:10.1109/PVSC48317.2022.9938490, the method of `pvlib.inverter.sandia_multi`.
    """
    total = sum(powers)
    if total <= 0:
        return 0.0
    if any(getattr(inverter, name) is None for name in SANDIA):
        return max(0.0, total * inverter.weighted_efficiency_pct / 100)
    if total < inverter.Pso:
        return 0.0
    ac = sum(p / total * sandia_ac(v, total, inverter) for v, p in zip(voltages, powers, strict=True))
    return max(0.0, ac)


def clipping(
    inverter: Inverter, arrangement: Arrangement, power_w: list[float], vmp_v: list[float], hours: float = 1.0
) -> tuple[float, float]:
    """Clipping loss [%] and yearly AC energy [kWh] of one unit.

    Parameters
    ----------
    power_w, vmp_v
        Power [W] after DC losses and voltage [V] of one module, one value per interval of `hours`.
    """
    wanted = kept = 0.0
    for p, v in zip(power_w, vmp_v, strict=True):
        voltages, full, limited = [], [], []
        for group, in_use in zip(inverter.inputs, arrangement, strict=True):
            for s, n in in_use:
                voltages.append(n * v)
                full.append(s * n * p)
                most = float("inf") if group.max_current_a is None else group.max_current_a * n * v
                limited.append(min(s * n * p, most))
        wanted += ac_power(voltages, full, inverter) * hours
        kept += min(ac_power(voltages, limited, inverter), inverter.ac_power_w) * hours
    return 100 * (1 - kept / wanted), kept / 1000


def plane(
    weather: pd.DataFrame, lat: float, lon: float, altitude_m: float, tilt: float, azimuth: float
) -> tuple[np.ndarray, np.ndarray]:
    """Irradiance of the plane [W/m2] and cell temperature [degC] per interval.

    `weather` has the columns ghi, dni, dhi, temp_air, wind_speed; its index is the middle of each interval.
    """
    sun = pvlib.solarposition.get_solarposition(weather.index, lat, lon, altitude=altitude_m)
    poa = pvlib.irradiance.get_total_irradiance(
        tilt,
        azimuth,
        sun["apparent_zenith"],
        sun["azimuth"],
        weather["dni"],
        weather["ghi"],
        weather["dhi"],
        dni_extra=pvlib.irradiance.get_extra_radiation(weather.index),
        albedo=0.2,
        model="haydavies",
    )["poa_global"]
    poa = poa.fillna(0).clip(lower=0)
    cell = pvlib.temperature.faiman(poa, weather["temp_air"], weather["wind_speed"], u0=25.0, u1=6.84)
    return poa.to_numpy(), cell.to_numpy()


def module_year(
    module: Module, irradiance: np.ndarray, cell_c: np.ndarray, dc_loss_pct: float = 2.0
) -> tuple[np.ndarray, np.ndarray]:
    """Power after DC losses [W] and Vmp [V] of one module per interval, sunlit intervals only."""
    six = six_parameters(module)
    lit = irradiance > 0
    order = ("alpha_sc", "a_ref", "I_L_ref", "I_o_ref", "R_sh_ref", "R_s", "Adjust")
    curve = pvlib.pvsystem.calcparams_cec(irradiance[lit], cell_c[lit], *(six[name] for name in order))
    mpp = pvlib.pvsystem.singlediode(*curve, method="lambertw")
    return np.asarray(mpp["p_mp"]) * (1 - dc_loss_pct / 100), np.asarray(mpp["v_mp"])


def read_tmy3_mid_interval(path: str) -> tuple[pd.DataFrame, dict]:
    """A TMY3 file with its index moved from the end to the middle of each hour, in one calendar year."""
    data, meta = pvlib.iotools.read_tmy3(path, coerce_year=2001, map_variables=True)
    data.index = data.index - pd.Timedelta(minutes=30)
    return data[["ghi", "dni", "dhi", "temp_air", "wind_speed"]].astype(float), meta
