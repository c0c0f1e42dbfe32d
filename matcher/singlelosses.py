"""What an inverter with one tracker takes from the year of an array: many options at once.

From sums over the year (`matcher.moments`) where they serve, else class by class. See `matcher.clipping` for
what counts as loss.
"""

from __future__ import annotations

import numpy as np

from matcher.clipping import CHUNK, Losses, ac_power, has_model, parabola, start_power, to_losses
from matcher.columns import InverterColumns
from matcher.moduleyear import ModuleYear
from matcher.moments import energies

#: Options of one year from which on the sums over it are worth making.
_WORTH_SUMS = 8


def single_losses(
    year: ModuleYear,
    inverters: InverterColumns,
    inverter: np.ndarray,
    strings: np.ndarray,
    in_series: np.ndarray,
    module: np.ndarray | None = None,
) -> Losses:
    """Losses of n options with one tracker each; index and count arrays of shape (n,).

    Parameters
    ----------
    year : ModuleYear
        Arrays (classes,) for one module type, or (modules, classes) for several.
    module : int array, shape (n,), optional
        Line of ``year`` of each option, where there are several.
    """
    power, volts = np.atleast_2d(year.power_w), np.atleast_2d(year.vmp_v)
    hours = np.broadcast_to(np.atleast_2d(year.hours), power.shape)
    line = np.zeros(len(inverter), dtype=np.int64) if module is None else module
    order = np.argsort(line, kind="stable")
    options = line[order], inverter[order], strings[order], in_series[order]
    sums, served = np.empty((3, len(order))), np.zeros(len(order), dtype=bool)
    many = np.flatnonzero(np.bincount(line)[options[0]] >= _WORTH_SUMS)
    if len(many):
        sums[:, many], served[many] = energies(power, volts, hours, inverters, *(o[many] for o in options))
    rest = np.flatnonzero(~served)
    step = max(1, CHUNK // power.shape[1])
    for first in range(0, len(rest), step):
        some = rest[first : first + step]
        sums[:, some] = _class_by_class(power, volts, hours, inverters, *(o[some] for o in options))
    in_place = np.empty_like(sums)
    in_place[:, order] = sums
    losses = to_losses(*in_place)
    known = has_model(inverters)[inverter]
    for values in (losses.power_pct, losses.current_pct, losses.yearly_kwh):
        values[~known] = np.nan
    return losses.of(year)


def _class_by_class(
    power: np.ndarray, volts: np.ndarray, hours: np.ndarray, inverters: InverterColumns, line: np.ndarray,
    inverter: np.ndarray, strings: np.ndarray, in_series: np.ndarray,
) -> np.ndarray:  # fmt: skip
    """AC energy [Wh] of a few options (3, n): without limits, with the power limit, with the current limit too."""
    at = in_series[:, None] * volts[line]
    dc = (strings * in_series)[:, None] * power[line]
    curve, start = parabola(inverters, inverter, at), start_power(inverters, inverter)[:, None]
    held = np.fmin(dc, inverters.max_current_a[inverter, None] * at)
    unlimited, limit = ac_power(dc, *curve, start), inverters.ac_power_w[inverter, None]
    after = np.minimum(ac_power(held, *curve, start), limit)
    return np.stack([np.einsum("ij,ij->i", ac, hours[line]) for ac in (unlimited, np.minimum(unlimited, limit), after)])
