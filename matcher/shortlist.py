"""Which options can be the first of their pair, so that the losses of all the others need not be worked out.

In the order of least inverter the first option of a pair is the largest array that clips no more than the cap.
For inverters with one tracker the loss is estimated here from a few sums of the year, exact for an inverter
whose efficiency does not follow the voltage of single hours: with the AC power a parabola of the DC power at
one mean voltage, what lies above the limit is a sum of the first three moments of the hours above it. The loss
grows with the number of strings, so for each string length the numbers near the cap are found by halving.
What the estimate leaves within `MARGIN_PCT` of the decision is worked out by `matcher.clipping`, and each of
those must meet its estimate to half of that, else all options of its pair are worked out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from matcher.clipping import has_model, parabola
from matcher.columns import InverterColumns
from matcher.moduleyear import ModuleYear

#: An estimated loss [percentage points] this near to the cap, or to the least of its pair, decides nothing.
MARGIN_PCT = 0.06

#: The same as a share of the loss, for losses far above the cap.
MARGIN_SHARE = 0.03

#: An inverter whose DC power at the limit changes by more than this share with the voltage of bright hours has
#: no mean voltage that stands for the year (in the CEC table it is less than 0.05).
_WILD = 0.06


@dataclass(frozen=True, slots=True, eq=False)
class Heads:
    """Sums over the hours of highest power of each module's year.

    ``keys`` (modules * classes,) ascends: line plus half of the power over the highest of that line. The
    ``moments`` (3, modules * (classes + 1)) are sums of hours, energy and energy times power from one class
    upwards. ``highest_w``, ``head_vmp_v`` (mean over the hours that are clipped at the cap), ``vmp_v`` (mean
    by energy), ``low_vmp_v`` and ``high_vmp_v`` (over the hours of more than half the highest power) have
    shape (modules,).
    """

    keys: np.ndarray
    moments: np.ndarray
    highest_w: np.ndarray
    head_vmp_v: np.ndarray
    vmp_v: np.ndarray
    low_vmp_v: np.ndarray
    high_vmp_v: np.ndarray

    @classmethod
    def of(cls, year: ModuleYear, clip_cap_pct: float) -> Heads:
        """Sums of a year of arrays (classes,), or (modules, classes); a module without power has none."""
        power = np.nan_to_num(np.atleast_2d(year.power_w))
        order = np.argsort(power, axis=1)
        power = np.take_along_axis(power, order, axis=1)
        vmp = np.take_along_axis(np.nan_to_num(np.atleast_2d(year.vmp_v)), order, axis=1)
        hours = np.take_along_axis(np.broadcast_to(np.atleast_2d(year.hours), power.shape), order, axis=1)

        def upwards(values: np.ndarray) -> np.ndarray:
            sums = np.cumsum(values[:, ::-1], axis=1)[:, ::-1]
            return np.pad(sums, ((0, 0), (0, 1)))

        time, energy, square = (upwards(hours * power**n) for n in range(3))
        clipped = energy[:, :-1] - power * time[:, :-1]
        lines = np.arange(len(power))
        # The class at whose power the cap is clipped; at least the highest one.
        cap = np.minimum((clipped > clip_cap_pct / 100.0 * energy[:, :1]).sum(axis=1), power.shape[1] - 1)
        head = upwards(hours * vmp)[lines, cap] / time[lines, cap]
        with np.errstate(invalid="ignore"):
            mean = np.nan_to_num((hours * power * vmp).sum(axis=1) / energy[:, 0])
        highest = power[:, -1]
        bright = power >= highest[:, None] / 2.0
        scaled = power / np.where(highest > 0, highest, 1.0)[:, None]
        return cls(
            (lines[:, None] + scaled / 2.0).ravel(), np.stack([time.ravel(), energy.ravel(), square.ravel()]),
            highest, head, mean, np.where(bright, vmp, np.inf).min(axis=1), np.where(bright, vmp, -np.inf).max(axis=1),
        )  # fmt: skip

    def above(self, line: np.ndarray, power: np.ndarray) -> np.ndarray:
        """Moments (3, n) of the hours above a power [W] in the years of the lines, both (n,)."""
        with np.errstate(invalid="ignore", divide="ignore"):
            share = np.fmin(power / self.highest_w[line], 1.0)
        return self.moments[:, np.searchsorted(self.keys, line + share / 2.0, side="right") + line]

    def whole(self, line: np.ndarray) -> np.ndarray:
        """Moments (3, n) of the whole years of the lines (n,)."""
        classes = len(self.keys) // len(self.highest_w)
        return self.moments[:, line * (classes + 1)]


@dataclass(frozen=True, slots=True, eq=False)
class Estimates:
    """Clipping losses by the power limit, about, of string lengths (k,) with any number of strings.

    ``line`` is the year of each, ``step`` the modules of a string (or 1, to count by modules), ``clipped`` and ``total`` are the coefficients (3, k) of what lies above the
    limit and of the whole in modules squared, modules and 1; ``enough_w`` is the DC power at the limit.
    ``wild`` marks efficiencies that follow the voltage too much for an estimate.
    """

    heads: Heads
    line: np.ndarray
    step: np.ndarray
    clipped: np.ndarray
    total: np.ndarray
    enough_w: np.ndarray
    wild: np.ndarray

    @classmethod
    def of(
        cls, heads: Heads, inverters: InverterColumns, line: np.ndarray, inverter: np.ndarray, in_series: np.ndarray,
        modules: np.ndarray,
    ) -> Estimates:  # fmt: skip
        """Of string lengths on inverters with up to so many modules, index and count arrays of shape (k,)."""
        limit = inverters.ac_power_w[inverter]
        with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
            (c2, c1, c0), enough = _at_limit(inverters, inverter, in_series * heads.head_vmp_v[line], limit)
            wild = ~(enough > 0) & has_model(inverters)[inverter]
            # Where more DC power gives less AC power, the loss need not grow with the strings.
            wild |= 2.0 * c2 * heads.highest_w[line] * modules + c1 <= 0
            for volts in (heads.low_vmp_v, heads.high_vmp_v):
                shifted = _at_limit(inverters, inverter, in_series * volts[line], limit)[1] / enough
                wild |= np.abs(shifted - 1.0) > _WILD
            whole = parabola(inverters, inverter, (in_series * heads.vmp_v[line])[:, None])
            hours, energy, square = heads.whole(line)
            total = np.stack([c[:, 0] * sums for c, sums in zip(whole, (square, energy, hours), strict=True)])
        return cls(heads, line, in_series, np.stack([c2, c1, c0 - limit]), total, enough, wild)

    def loss_pct(self, of: np.ndarray, strings: np.ndarray) -> np.ndarray:
        """Loss [%] of options (n,): ``strings[j]`` strings of the length number ``of[j]``.

        0 where there is no efficiency model or no year, NaN where it is wild.
        """
        modules = (strings * self.step[of]).astype(float)
        with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
            hours, energy, square = self.heads.above(self.line[of], self.enough_w[of] / modules)
            c2, c1, c0 = self.clipped[:, of]
            t2, t1, t0 = self.total[:, of]
            clipped = (c2 * modules * square + c1 * energy) * modules + c0 * hours
            found = clipped / ((t2 * modules + t1) * modules + t0) * 100.0
        found = np.nan_to_num(found, nan=0.0, posinf=0.0, neginf=0.0)
        found[self.wild[of]] = np.nan
        return found

    def near(self, clip_cap_pct: float, fewest: np.ndarray, most: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """The numbers of strings, first and last of each length (k,), among which the first of a pair can be.

        From the most strings that surely clip no more than the cap to the most that perhaps do; where even
        the fewest do not, to the most that may clip as little. All from ``fewest`` to ``most`` where it is wild.
        """
        lengths = np.arange(len(fewest))
        least = self.loss_pct(lengths, fewest)
        surely = self._last(fewest, most, np.full(len(fewest), (clip_cap_pct - MARGIN_PCT) / (1.0 + MARGIN_SHARE)))
        top = np.maximum(clip_cap_pct, least + margin(least))
        perhaps = self._last(fewest, most, (top + MARGIN_PCT) / (1.0 - MARGIN_SHARE))
        return np.where(self.wild, fewest, surely), np.where(self.wild, most, perhaps)

    def _last(self, fewest: np.ndarray, most: np.ndarray, top: np.ndarray) -> np.ndarray:
        """The most strings of each length (k,) whose loss is not above ``top`` [%]; at least the fewest."""
        low, high = fewest.copy(), most.copy()
        while len(open_ := np.flatnonzero(low < high)):
            middle = (low[open_] + high[open_] + 1) // 2
            below = self.loss_pct(open_, middle) <= top[open_]
            low[open_] = np.where(below, middle, low[open_])
            high[open_] = np.where(below, high[open_], middle - 1)
        return low


def _at_limit(
    inverters: InverterColumns, inverter: np.ndarray, volts: np.ndarray, limit: np.ndarray
) -> tuple[tuple[np.ndarray, ...], np.ndarray]:
    """Coefficients of AC over DC power at DC voltages [V], and the DC power at the limit [W]; arrays (k,)."""
    c2, c1, c0 = (c[:, 0] for c in parabola(inverters, inverter, volts[:, None]))
    short = limit - c0
    root = np.sqrt(c1 * c1 + 4.0 * c2 * short)
    return (c2, c1, c0), np.where(root >= 0, 2.0 * short / (c1 + root), np.inf)


def margin(clipping_pct: np.ndarray) -> np.ndarray:
    """How far an estimate may be off before it decides nothing [percentage points]."""
    return MARGIN_PCT + MARGIN_SHARE * clipping_pct


def candidates(
    pair: np.ndarray, modules: np.ndarray, clipping_pct: np.ndarray, sure: np.ndarray, clip_cap_pct: float
) -> np.ndarray:
    """Positions of the options that can be the first of their pair in the order of least inverter.

    Parameters
    ----------
    pair : int array, shape (n,)
        Ascending.
    modules : int array, shape (n,)
    clipping_pct : float array, shape (n,)
        Estimates; all options of a pair with NaN are candidates.
    sure : bool array, shape (n,)
        Verdict `fits`.
    clip_cap_pct : float
        Loss up to which a higher DC/AC ratio is better [%].
    """
    starts = np.flatnonzero(np.diff(pair, prepend=-1))
    sizes = np.diff(starts, append=len(pair))

    def of_pair(ufunc: np.ufunc, values: np.ndarray) -> np.ndarray:
        return np.repeat(ufunc.reduceat(values, starts), sizes)

    # An option that fits stands before any that is to be confirmed.
    open_ = sure | ~of_pair(np.logical_or, sure)
    unknown = np.isnan(clipping_pct)
    off = margin(clipping_pct)
    within = open_ & (clipping_pct + off <= clip_cap_pct)
    largest = of_pair(np.maximum, np.where(within, modules, 0))
    doubtful = open_ & ~within & (clipping_pct - off <= clip_cap_pct)
    # Where nothing is surely within the cap, the least loss may decide.
    least = of_pair(np.minimum, np.where(open_, clipping_pct + off, np.inf))
    keep = (within & (modules == largest)) | (doubtful & (modules >= largest))
    keep |= open_ & (largest == 0) & (clipping_pct - off <= least)
    return np.flatnonzero(keep | (open_ & unknown))


def can_estimate(inverters: InverterColumns) -> np.ndarray:
    """Inverters (k,) whose losses come from the power limit only, or are unknown."""
    return np.isnan(inverters.max_current_a) | ~has_model(inverters)
