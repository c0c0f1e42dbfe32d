"""What an inverter's limits take from the year of an array, and what is left as AC energy.

Every efficiency model is a parabola in DC power whose coefficients depend on DC voltage, so that the year
of an option is a few sums over the power classes of `matcher.moduleyear`:

* Sandia model (King et al. 2007, SAND2007-5036, doi:10.2172/920449); several trackers by the multi-input
  form (Hansen et al. 2022, doi:10.1109/PVSC48317.2022.9938490): each tracker's share of the DC power
  times the AC power that the whole DC power gives at that tracker's voltage;
* a weighted efficiency, constant, where a record has nothing else.

The loss is ``1 - sum(min(ac, ac_power_w)) / sum(ac_unlimited)`` with negative AC power counted as none:
first what the power limit takes of the unlimited AC power, then what the trackers' current limits take
besides. A tracker at its current limit takes ``max_current_a`` at the unlimited Vmp; DC losses come before
that limit. Hourly means hide short peaks: true clipping is somewhat higher at high DC/AC ratios.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from matcher.columns import InverterColumns
from matcher.moduleyear import ModuleYear

#: Numbers per working array; small enough for the processor's cache.
CHUNK = 32_768


@dataclass(frozen=True, slots=True, eq=False)
class Losses:
    """Clipping loss [%], by the power limit and by the current limits, and AC energy [kWh]; arrays (n,).

    NaN where the inverter has no efficiency model.
    """

    power_pct: np.ndarray
    current_pct: np.ndarray
    yearly_kwh: np.ndarray

    @property
    def total_pct(self) -> np.ndarray:
        """Clipping loss by both limits [%]."""
        return self.power_pct + self.current_pct

    def of(self, year: ModuleYear) -> Losses:
        """As they are, or with the clipping unknown where the year cannot show it."""
        if year.shows_clipping:
            return self
        unknown = np.full(len(self.yearly_kwh), np.nan)
        return Losses(unknown, unknown, self.yearly_kwh)

    @classmethod
    def unknown(cls, n: int) -> Losses:
        """Losses of n options that cannot be known."""
        return cls(np.full(n, np.nan), np.full(n, np.nan), np.full(n, np.nan))


def has_model(inverters: InverterColumns) -> np.ndarray:
    """Whether each inverter has an efficiency model, shape (k,)."""
    return ~np.isnan(inverters.sandia[:, 0]) | ~np.isnan(inverters.weighted_efficiency_pct)


def parabola(inverters: InverterColumns, row: np.ndarray, volts: np.ndarray) -> tuple[np.ndarray, ...]:
    """Coefficients (c2, c1, c0) of AC power over DC power [W] at DC voltages [V] of shape (n, classes).

    ``ac = c2 * dc**2 + c1 * dc + c0`` for inverter ``row[j]`` in line j.
    """
    pso, paco, pdco, vdco, k0, k1, k2, k3 = (c[:, None] for c in inverters.sandia[row].T)
    dv = volts - vdco
    b = pso * (1.0 + k2 * dv)
    c2 = k0 * (1.0 + k3 * dv)
    span = pdco * (1.0 + k1 * dv) - b
    slope = paco / span - c2 * span
    c1 = slope - 2.0 * c2 * b
    c0 = b * (c2 * b - slope)
    constant = np.isnan(inverters.sandia[row, 0])
    if constant.any():
        c2[constant] = 0.0
        c0[constant] = 0.0
        c1[constant] = inverters.weighted_efficiency_pct[row[constant], None] / 100.0
    return c2, c1, c0


def start_power(inverters: InverterColumns, row: np.ndarray) -> np.ndarray:
    """DC power below which the inverter delivers nothing [W]; 0 with a constant efficiency."""
    return np.nan_to_num(inverters.sandia[row, 0], nan=0.0)


def to_losses(ac_sum: np.ndarray, free: np.ndarray, delivered: np.ndarray) -> Losses:
    """Losses from sums over the year [Wh]: unlimited, after the power limit only, after both limits."""
    with np.errstate(invalid="ignore", divide="ignore"):
        power = (1.0 - free / ac_sum) * 100.0
        current = (free - delivered) / ac_sum * 100.0
    nothing = ac_sum <= 0
    power[nothing] = 0.0
    current[nothing] = 0.0
    # Differences of sums leave dust of the order of 1e-13.
    power[np.abs(power) < 1e-9] = 0.0
    current[np.abs(current) < 1e-9] = 0.0
    return Losses(power, current, delivered / 1000.0)


def ac_power(dc: np.ndarray, c2: np.ndarray, c1: np.ndarray, c0: np.ndarray, start: np.ndarray) -> np.ndarray:
    """AC power [W] without the power limit, never below 0."""
    ac = c2 * dc
    ac += c1
    ac *= dc
    ac += c0
    ac[dc < start] = 0.0
    return np.maximum(ac, 0.0, out=ac)


def block_losses(
    year: ModuleYear,
    inverters: InverterColumns,
    row: int,
    max_current_a: np.ndarray,
    block: np.ndarray,
    face: np.ndarray | None = None,
) -> Losses:
    """Losses of k arrangements on one inverter of several trackers.

    Parameters
    ----------
    year : ModuleYear
        Arrays (classes,) of one module type; (faces, hours) where parts of the array face different ways.
    row : int
        Which inverter of ``inverters``.
    max_current_a : float array, shape (trackers,)
        Current limit of each tracker, NaN where not stated.
    block : int array, shape (k, trackers, 2)
        Strings and modules in series on each tracker; 0, 0 where it is empty.
    face : int array, shape (k, trackers), optional
        Line of ``year`` of each tracker, where it has several; of no account where the tracker is empty.
    """
    k = len(block)
    if not has_model(inverters)[row]:
        return Losses.unknown(k)
    # Trackers that carry the same under the same limit are one kind; an arrangement is how many of each.
    limits = np.broadcast_to(np.nan_to_num(max_current_a, nan=np.inf), block.shape[:2])
    faces = np.zeros(limits.size) if face is None else face.ravel().clip(min=0)
    flat = np.column_stack([limits.ravel(), block.reshape(-1, 2), faces])
    kinds, index = np.unique(flat, axis=0, return_inverse=True)
    amounts = np.zeros((k, len(kinds)))
    np.add.at(amounts, (np.repeat(np.arange(k), block.shape[1]), index.ravel()), 1.0)
    used = kinds[:, 1] > 0
    kinds, amounts = kinds[used], amounts[:, used]

    current, strings, length = (c[:, None] for c in kinds.T[:3])
    line = kinds[:, 3].astype(np.int64)
    at = length * np.atleast_2d(year.vmp_v)[line]
    unheld = strings * length * np.atleast_2d(year.power_w)[line]
    with np.errstate(invalid="ignore"):
        held = np.fmin(unheld, current * at)  # no limit in the dark is no number, and holds nothing
    curve = parabola(inverters, np.full(len(kinds), row), at)
    start = start_power(inverters, np.array([row]))[0]
    limit = inverters.ac_power_w[row]
    sums = np.empty((3, k))
    limited = bool((held < unheld).any())
    step = max(1, 8 * CHUNK // len(year.hours))
    for first in range(0, k, step):
        part = slice(first, first + step)
        ac = _multi_ac(amounts[part], unheld, curve, start)
        sums[0, part] = ac @ year.hours
        sums[1, part] = sums[2, part] = np.minimum(ac, limit) @ year.hours
        if limited:
            ac = _multi_ac(amounts[part], held, curve, start)
            sums[2, part] = np.minimum(ac, limit) @ year.hours
    return to_losses(*sums).of(year)


def pair_losses(
    year: ModuleYear, inverters: InverterColumns, line: np.ndarray, row: np.ndarray, max_current_a: np.ndarray,
    strings: np.ndarray, in_series: np.ndarray,
) -> Losses:  # fmt: skip
    """Losses of n arrangements, each of a pair of its own.

    Parameters
    ----------
    year : ModuleYear
        Arrays (classes,) of one module, or (modules, classes).
    line, row : int array, shape (n,)
        Year and inverter of each arrangement.
    max_current_a : float array, shape (n, trackers)
        Current limit of each tracker, NaN where not stated.
    strings, in_series : int arrays, shape (n, trackers)
        What each tracker carries; 0, 0 where it is empty or there is none.
    """
    n, classes = len(line), year.power_w.shape[-1]
    powers, volts = np.atleast_2d(year.power_w), np.atleast_2d(year.vmp_v)
    hours = np.broadcast_to(np.atleast_2d(year.hours), powers.shape)
    limits = np.nan_to_num(max_current_a, nan=np.inf)
    sums = np.empty((3, n))
    step = max(1, CHUNK // classes)
    for first in range(0, n, step):
        part = np.arange(first, min(first + step, n))
        total = np.zeros((2, len(part), classes))  # DC power without and with current limits
        bent = np.zeros((2, 3, len(part), classes))  # and its sums with the coefficients of the AC power
        for t in range(strings.shape[1]):
            used = np.flatnonzero(strings[part, t])
            if not len(used):
                continue
            some = part[used]
            at = in_series[some, t, None] * volts[line[some]]
            curve = parabola(inverters, row[some], at)
            dc = (strings[some, t] * in_series[some, t])[:, None] * powers[line[some]]
            with np.errstate(invalid="ignore"):
                held = np.fmin(dc, limits[some, t, None] * at)
            for k, power in enumerate((dc, held)):
                total[k, used] += power
                for c in range(3):
                    bent[k, c, used] += power * curve[c]
        start = start_power(inverters, row[part])[:, None]
        with np.errstate(invalid="ignore", divide="ignore"):
            ac = total * bent[:, 0] + bent[:, 1] + bent[:, 2] / total
        ac[(total < start) | (total <= 0)] = 0.0
        unlimited, held = np.maximum(ac, 0.0, out=ac)
        limit = inverters.ac_power_w[row[part], None]
        for k, power in enumerate((unlimited, np.minimum(unlimited, limit), np.minimum(held, limit))):
            sums[k, part] = np.einsum("ij,ij->i", power, hours[line[part]])
    losses = to_losses(*sums)
    known = has_model(inverters)[row]
    for values in (losses.power_pct, losses.current_pct, losses.yearly_kwh):
        values[~known] = np.nan
    return losses.of(year)


def _multi_ac(amounts: np.ndarray, dc: np.ndarray, curve: tuple[np.ndarray, ...], start: float) -> np.ndarray:
    """AC power [W] of arrangements (k, kinds) over the classes; dc and curve have shape (kinds, classes).

    The multi-input form, ``sum_i(dc_i / dc * (c2_i * dc**2 + c1_i * dc + c0_i))``, with the sums over
    trackers taken first.
    """
    c2, c1, c0 = curve
    total = amounts @ dc
    with np.errstate(invalid="ignore", divide="ignore"):
        ac = total * (amounts @ (dc * c2)) + amounts @ (dc * c1) + (amounts @ (dc * c0)) / total
    ac[(total < start) | (total <= 0)] = 0.0
    return np.maximum(ac, 0.0, out=ac)


def count_bounds(
    year: ModuleYear | None, inverters: InverterColumns, row: int, counts: np.ndarray, lengths: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Least clipping loss [%] and most energy [kWh] that any arrangement of each module count can have.

    Whatever the shares of the trackers, the AC power lies between the lowest and the highest that the whole
    DC power gives at one of the string lengths; current limits only take more. ``counts`` (c,) and
    ``lengths`` (n,) in, two arrays (c,) out; NaN without a year or an efficiency model.
    """
    if year is None or not has_model(inverters)[row]:
        return np.full(len(counts), np.nan), np.full(len(counts), np.nan)
    curve = parabola(inverters, np.full(len(lengths), row), lengths[:, None] * year.vmp_v)
    start = start_power(inverters, np.array([row]))[0]
    limit = inverters.ac_power_w[row]
    least, most = np.empty(len(counts)), np.empty(len(counts))
    for j, modules in enumerate(counts):
        dc = np.broadcast_to(modules * year.power_w, curve[0].shape)
        ac = ac_power(dc, *curve, np.full((len(lengths), 1), start))
        low, high = ac.min(axis=0), ac.max(axis=0)
        produced = high @ year.hours
        least[j] = np.maximum(low - limit, 0.0) @ year.hours / produced * 100.0 if produced > 0 else 0.0
        most[j] = np.minimum(high, limit) @ year.hours / 1000.0
    if not year.shows_clipping:
        least[:] = np.nan
    return least * (1.0 - 1e-9), most * (1.0 + 1e-9)
