"""A year as sums, from which the year of an option follows without going through its hours.

With ``d`` the DC power above the start power, the Sandia model (King et al. 2007, SAND2007-5036,
doi:10.2172/920449) is

    ac = d * (paco / span + c2 * (d - span))

where start power, span and c2 are linear in the DC voltage. The voltage of a string over the year is its mean
times ``1 + w`` with a small w, so with ``1 / span`` as a power series in w the AC power is a polynomial in DC
power and w, and its sum over any run of hours follows from the sums of ``hours * power**a * w**b``. With the
hours by falling power, the inverter is on in the first of them and at its limit in the first of those; which
these are depends on the voltage too, so the few hours near the two edges are gone through one by one, as are
those in which a current limit may act.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from matcher.clipping import has_model
from matcher.columns import InverterColumns

#: Powers of w that go with each power of the DC power: 0, 1, 2.
_TERMS = (6, 5, 2)

#: What the series of 1 / span may leave out, as a share of the year's energy.
_LEFT_OUT = 1e-10

#: By how much an edge is moved outwards, so that rounding puts no hour on the wrong side.
_ROUNDING = 1e-9

#: Numbers per working array; small enough for the processor's cache.
_OPTIONS = 8_192
#: Years whose sums are held at once.
_YEARS = 64


@dataclass(frozen=True, slots=True, eq=False)
class _Sums:
    """Years of several modules, entries by falling power: shape (years, entries), flat where said.

    ``keys`` ascends: year plus half of the power over the highest of that year. ``above`` (years *
    (entries + 1), terms) are the sums of hours * power**a * w**b over the first entries of a year; ``lowest_w``
    and ``highest_w`` (years, entries + 1) the bounds of w over them. ``fifth`` (years,) is the mean of
    ``abs(w)**5`` by energy.
    """

    power_w: np.ndarray
    w: np.ndarray
    hours: np.ndarray
    vmp_v: np.ndarray
    peak_w: np.ndarray
    keys: np.ndarray
    above: np.ndarray
    lowest_w: np.ndarray
    highest_w: np.ndarray
    fifth: np.ndarray

    @classmethod
    def of(cls, power: np.ndarray, volts: np.ndarray, hours: np.ndarray) -> _Sums:
        order = np.argsort(-power, axis=1, kind="stable")
        power, volts, hours = (np.take_along_axis(a, order, axis=1) for a in (power, volts, hours))
        energy = hours * power
        with np.errstate(invalid="ignore", divide="ignore"):
            mean = (energy * volts).sum(axis=1) / energy.sum(axis=1)
            w = np.where(power > 0, volts / mean[:, None] - 1.0, 0.0)
        sums = np.zeros((power.shape[0], power.shape[1] + 1, sum(_TERMS)))
        weights, starts = (hours, energy, energy * power), np.cumsum((0, *_TERMS))
        risen = np.ones_like(w)  # w**b
        for b in range(max(_TERMS)):
            for weight, start, count in zip(weights, starts, _TERMS, strict=False):
                if b < count:
                    np.cumsum(weight * risen, axis=1, out=sums[:, 1:, start + b])
            risen = risen * w
        with np.errstate(invalid="ignore", divide="ignore"):
            fifth = (energy * np.abs(w * w * w * w * w)).sum(axis=1) / energy.sum(axis=1)
        peak = power[:, 0]
        share = power[:, ::-1] / np.where(peak > 0, peak, 1.0)[:, None]
        keys = (np.arange(len(power))[:, None] + share / 2.0).ravel()
        return cls(
            power.ravel(), w.ravel(), hours.ravel(), mean, peak, keys, sums.reshape(-1, sums.shape[2]),
            _first(np.minimum.accumulate(w, axis=1)), _first(np.maximum.accumulate(w, axis=1)), fifth,
        )  # fmt: skip

    @property
    def entries(self) -> int:
        """Entries of each year."""
        return len(self.power_w) // len(self.peak_w)

    def from_(self, year: np.ndarray, power: np.ndarray) -> np.ndarray:
        """How many entries of each year have this power [W] or more; arrays (n,)."""
        with np.errstate(invalid="ignore", divide="ignore"):
            share = np.fmin(power / self.peak_w[year], 1.5)
        return (year + 1) * self.entries - np.searchsorted(self.keys, year + share / 2.0)


@dataclass(frozen=True, slots=True, eq=False)
class _Currents:
    """How far into the entries by falling power a current goes; ``keys`` as in `_Sums`, ``reach`` flat.

    ``peak_a`` is the highest current of each year [A], ``reach`` (years, entries + 1) the entries up to the
    last one of those with the highest currents.
    """

    peak_a: np.ndarray
    keys: np.ndarray
    reach: np.ndarray

    @classmethod
    def of(cls, sums: _Sums) -> _Currents:
        amps = sums.power_w.reshape(len(sums.peak_w), -1) / (1.0 + sums.w.reshape(len(sums.peak_w), -1))
        amps /= sums.vmp_v[:, None]
        order = np.argsort(amps, axis=1)
        peak = amps.max(axis=1)
        share = np.take_along_axis(amps, order, axis=1) / peak[:, None]
        furthest = np.maximum.accumulate(order[:, ::-1] + 1, axis=1)[:, ::-1]
        keys = (np.arange(len(peak))[:, None] + share / 2.0).ravel()
        return cls(peak, keys, np.pad(furthest, ((0, 0), (0, 1))).ravel())

    def above(self, year: np.ndarray, amps: np.ndarray) -> np.ndarray:
        """Entries of each year up to the last one with more than a current [A]; arrays (n,)."""
        share = np.fmin(amps / self.peak_a[year], 1.5)
        return self.reach[np.searchsorted(self.keys, year + share / 2.0, side="right") + year]


def _first(accumulated: np.ndarray) -> np.ndarray:
    """Bounds over the first entries, flat; over none of them 0."""
    return np.pad(accumulated, ((0, 0), (1, 0))).ravel()


@dataclass(frozen=True, slots=True, eq=False)
class _Curves:
    """The AC power of n options: start power, start power plus span [W], and c2 [1/W] as (at w = 0, per w)."""

    start: np.ndarray
    full: np.ndarray
    c2: np.ndarray
    paco: np.ndarray
    begin: np.ndarray

    @classmethod
    def of(cls, inverters: InverterColumns, row: np.ndarray, volts: np.ndarray) -> _Curves:
        """At mean voltages [V]; a constant efficiency is a span of 1 W that gives that share of 1 W."""
        pso, paco, pdco, vdco, k0, k1, k2, k3 = inverters.sandia[row].T
        dv = volts - vdco
        start = np.stack([pso * (1.0 + k2 * dv), pso * k2 * volts])
        full = np.stack([pdco * (1.0 + k1 * dv), pdco * k1 * volts])
        c2 = np.stack([k0 * (1.0 + k3 * dv), k0 * k3 * volts])
        constant = np.isnan(pso)
        if constant.any():
            start[:, constant] = c2[:, constant] = 0.0
            full[:, constant] = [[1.0], [0.0]]
            paco = np.where(constant, inverters.weighted_efficiency_pct[row] / 100.0, paco)
        return cls(start, full, c2, paco, np.where(constant, 0.0, pso))

    def take(self, some: np.ndarray) -> _Curves:
        """Those of some options."""
        return _Curves(self.start[:, some], self.full[:, some], self.c2[:, some], self.paco[some], self.begin[some])

    def ac(self, of: np.ndarray, dc: np.ndarray, w: np.ndarray) -> np.ndarray:
        """AC power [W] of options at DC powers [W] and w, arrays (k,), 0 where the inverter is not on."""
        start, full, c2 = (pair[0][of] + pair[1][of] * w for pair in (self.start, self.full, self.c2))
        above = dc - start
        ac = above * (self.paco[of] / (full - start) + c2 * (dc - full))
        ac[(dc < self.begin[of]) | (above < 0)] = 0.0
        return ac

    def terms(self, modules: np.ndarray) -> np.ndarray:
        """Coefficients of the sums for so many modules, shape (n, terms)."""
        s0, s1 = self.start
        t0, t1 = self.full
        c, c1 = self.c2
        span = t0 - s0
        r = (s1 - t1) / span
        found = np.zeros((len(modules), sum(_TERMS)))
        zeroth, first, second = np.split(found, np.cumsum(_TERMS)[:-1], axis=1)
        # d * paco / span
        series = self.paco / span
        for b in range(_TERMS[1]):
            first[:, b] = series
            zeroth[:, b] -= s0 * series
            zeroth[:, b + 1] -= s1 * series
            series = series * r
        # c2 * (dc - start) * (dc - full)
        second[:, 0], second[:, 1] = c, c1
        for b, value in enumerate((s0 + t0, s1 + t1)):
            first[:, b] -= c * value
            first[:, b + 1] -= c1 * value
        for b, value in enumerate((s0 * t0, s0 * t1 + s1 * t0, s1 * t1)):
            zeroth[:, b] += c * value
            zeroth[:, b + 1] += c1 * value
        first *= modules[:, None]
        second *= (modules**2)[:, None]
        return found


def energies(
    power_w: np.ndarray, vmp_v: np.ndarray, hours: np.ndarray, inverters: InverterColumns, line: np.ndarray,
    inverter: np.ndarray, strings: np.ndarray, in_series: np.ndarray,
) -> tuple[np.ndarray, np.ndarray]:  # fmt: skip
    """AC energy of n options with one tracker each, from sums over the year.

    Parameters
    ----------
    power_w, vmp_v, hours
        Years of modules [W], [V], [h], shape (years, entries).
    line : int array, shape (n,)
        Year of each option, ascending.
    inverter, strings, in_series : int arrays, shape (n,)

    Returns
    -------
    Energies [Wh] of shape (3, n): without limits, with the power limit, with the current limit too; and for
    which options (n,) they could be had in this way: a power limit at the rated AC power of the model (or an
    efficiency that does not bend), and an efficiency that rises with DC power and follows the voltage little.
    NaN for the others.
    """
    found = np.full((3, len(line)), np.nan)
    served = has_model(inverters)[inverter]
    years, of = np.unique(line, return_inverse=True)
    known = np.array([np.isfinite(p).all() and (p > 0).any() for p in power_w[years]], dtype=bool)
    served &= known[of]
    chosen = np.flatnonzero(served)
    years, of = np.unique(line[chosen], return_inverse=True)
    for first in range(0, len(years), _YEARS):
        some = years[first : first + _YEARS]
        begin, end = np.searchsorted(of, (first, first + len(some)))
        sums = _Sums.of(power_w[some], vmp_v[some], hours[some])
        currents = None
        if not np.isnan(inverters.max_current_a[inverter[chosen[begin:end]]]).all():
            currents = _Currents.of(sums)
        for at in range(begin, end, _OPTIONS):
            part = chosen[at : min(at + _OPTIONS, end)]
            year, row = of[at : min(at + _OPTIONS, end)] - first, inverter[part]
            curves = _Curves.of(inverters, row, in_series[part] * sums.vmp_v[year])
            modules, limit = (strings[part] * in_series[part]).astype(float), inverters.ac_power_w[row]
            fit = _served(sums, curves, year, modules, limit)
            served[part[~fit]] = False
            part, year, row, curves, modules, limit = (
                part[fit], year[fit], row[fit], curves.take(fit), modules[fit], limit[fit]
            )  # fmt: skip
            found[:2, part] = _power_limited(sums, curves, year, modules, limit)
            found[2, part] = found[1, part]
            if currents is not None:
                # Each string's share of the current limit; no limit holds nothing.
                amps = np.nan_to_num(inverters.max_current_a[row], nan=np.inf) / strings[part]
                found[2, part] -= _held(sums, currents, curves, year, modules, limit, amps)
    return found, served


def _power_limited(
    sums: _Sums, curves: _Curves, year: np.ndarray, modules: np.ndarray, limit: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Energy [Wh] without limits and with the power limit."""
    terms = curves.terms(modules)
    after = year * (sums.entries + 1)
    low, high = sums.lowest_w[after + sums.entries], sums.highest_w[after + sums.entries]

    # On: dc at least the start power at the voltage, and at least the stated one.
    least, most = (np.maximum(edge, curves.begin) for edge in _between(curves.start, low, high))
    surely, perhaps = _edge(sums, year, modules, least, most)
    unlimited = np.einsum("ij,ij->i", terms, sums.above[after + surely])
    of, entry = _runs(sums, year, surely, perhaps)
    ac = curves.ac(of, modules[of] * sums.power_w[entry], sums.w[entry])
    unlimited += np.bincount(of, ac * sums.hours[entry], minlength=len(year))

    # At the limit: dc above the start power and the span's share that gives it.
    at_limit = curves.start + (curves.full - curves.start) * (limit / curves.paco)
    least, _ = _between(at_limit, low, high)
    coarse = after + sums.from_(year, least / modules * (1.0 - _ROUNDING))
    # Bright hours differ less in voltage.
    least, most = _between(at_limit, sums.lowest_w[coarse], sums.highest_w[coarse])
    surely, perhaps = _edge(sums, year, modules, least, most)
    above = sums.above[after + surely]
    over = np.einsum("ij,ij->i", terms, above) - limit * above[:, 0]
    of, entry = _runs(sums, year, surely, perhaps)
    ac = curves.ac(of, modules[of] * sums.power_w[entry], sums.w[entry])
    over += np.bincount(of, np.maximum(ac - limit[of], 0.0) * sums.hours[entry], minlength=len(year))
    return unlimited, unlimited - np.maximum(over, 0.0)


def _held(
    sums: _Sums, currents: _Currents, curves: _Curves, year: np.ndarray, modules: np.ndarray, limit: np.ndarray,
    amps: np.ndarray,
) -> np.ndarray:  # fmt: skip
    """Energy [Wh] that a current limit [A per string] takes besides the power limit."""
    found = np.zeros(len(year))
    reach = currents.above(year, amps)
    acts = np.flatnonzero(reach)
    for some in np.split(acts, np.flatnonzero(np.diff(np.cumsum(reach[acts]) // _OPTIONS)) + 1):
        of, entry = _runs(sums, year[some], np.zeros(len(some), dtype=np.int64), reach[some])
        chosen, w = some[of], sums.w[entry]
        dc = modules[chosen] * sums.power_w[entry]
        held = np.minimum(dc, (modules * amps * sums.vmp_v[year])[chosen] * (1.0 + w))
        lost = np.minimum(curves.ac(chosen, dc, w), limit[chosen]) - np.minimum(curves.ac(chosen, held, w), limit[chosen])
        found[some] = np.bincount(of, lost * sums.hours[entry], minlength=len(some))
    return found


def _served(sums: _Sums, curves: _Curves, year: np.ndarray, modules: np.ndarray, limit: np.ndarray) -> np.ndarray:
    """Options whose AC power rises with DC power and is a short series in w, and whose limit is where it should be."""
    last = (year + 1) * (sums.entries + 1) - 1
    low, high = sums.lowest_w[last], sums.highest_w[last]
    least_start, _ = _between(curves.start, low, high)
    least_span, most_span = _between(curves.full - curves.start, low, high)
    least_c2, most_c2 = _between(curves.c2, low, high)
    down, up = np.minimum(least_c2, 0.0), np.maximum(most_c2, 0.0)
    most = modules * sums.peak_w[year] - least_start
    r = (curves.full[1] - curves.start[1]) / (curves.full[0] - curves.start[0])
    straight = (curves.c2 == 0.0).all(axis=0)
    with np.errstate(invalid="ignore", divide="ignore"):
        tame = (least_start >= 0) & (least_span > 0)
        tame &= curves.paco / most_span + down * np.maximum(most - least_span, 0.0) - up * most_span >= 0
        # The AC power meets its limit once only.
        tame &= -down * most * most_span < curves.paco
        tame &= np.abs(r) ** 5 * sums.fifth[year] <= _LEFT_OUT
        tame &= straight | (limit == curves.paco)
    return tame


def _edge(
    sums: _Sums, year: np.ndarray, modules: np.ndarray, least: np.ndarray, most: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """Entries of each option surely above an edge that lies between two DC powers [W], and those perhaps above."""
    surely = sums.from_(year, most / modules * (1.0 + _ROUNDING))
    return surely, np.maximum(surely, sums.from_(year, least / modules * (1.0 - _ROUNDING)))


def _runs(sums: _Sums, year: np.ndarray, first: np.ndarray, end: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """The entries from ``first`` to ``end`` of each option's year, all in a row: option, entry."""
    lengths = end - first
    of = np.repeat(np.arange(len(first)), lengths)
    start = year * sums.entries + first - (np.cumsum(lengths) - lengths)
    return of, np.arange(len(of)) + np.repeat(start, lengths)


def _between(line: np.ndarray, low: np.ndarray, high: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Least and greatest value of ``line[0] + line[1] * w`` with w from low to high, arrays (n,)."""
    one, other = line[0] + line[1] * low, line[0] + line[1] * high
    return np.minimum(one, other), np.maximum(one, other)
