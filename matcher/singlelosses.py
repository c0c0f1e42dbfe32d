"""What an inverter with one tracker takes from the year of an array: many options at once.

The Sandia model (King et al. 2007, SAND2007-5036, doi:10.2172/920449) is written with ``d`` for the DC power
above the start power at the voltage and ``span`` for that at rated AC power, so that options that differ in
the number of strings only share all that depends on voltage:

    ac = d * (paco / span + c2 * (d - span))

See `matcher.clipping` for what counts as loss.
"""

from __future__ import annotations

import numpy as np

from matcher.clipping import CHUNK, Losses, has_model, to_losses
from matcher.columns import InverterColumns
from matcher.moduleyear import ModuleYear

#: With more string lengths than this on one module's year, modules are gone through one by one.
_WORTH_A_LINE = 48

#: With more options than this for each string length, sums over the year are made once for a string length.
_WORTH_MOMENTS = 3


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
    n = len(inverter)
    power, volts = np.atleast_2d(year.power_w), np.atleast_2d(year.vmp_v)
    hours = np.broadcast_to(np.atleast_2d(year.hours), power.shape)
    line = np.zeros(n, dtype=np.int64) if module is None else module
    # Options that differ in the number of strings only are one group, the fewest strings first.
    key = (line * len(inverters.records) + inverter) * (int(in_series.max(initial=0)) + 1) + in_series
    order = np.argsort(key * (int(strings.max(initial=0)) + 1) + strings, kind="stable")
    starts = np.flatnonzero(np.diff(key[order], prepend=-1))
    sizes = np.diff(starts, append=n)
    lines = line[order[starts]]
    sums = np.empty((3, n))
    # Working arrays, made once: at this size new ones cost as much as the sums.
    step = max(1, CHUNK // power.shape[1])
    room = np.empty((6, min(step, max(1, len(starts))), power.shape[1]))
    ends = np.append(np.flatnonzero(np.diff(lines)) + 1, len(lines))
    if len(lines) and len(lines) > _WORTH_A_LINE * len(ends):
        first = 0
        for end in ends.tolist():
            at, part = lines[first], slice(first, end)
            _fill_line(power[at], volts[at], hours[at], inverters, inverter, strings, in_series, order,
                       starts[part], sizes[part], sums, room)  # fmt: skip
            first = end
    elif len(lines):
        for first in range(0, len(lines), step):
            part = slice(first, first + step)
            at = lines[part]
            _fill(power[at], volts[at], hours[at], inverters, inverter, strings, in_series, order,
                  starts[part], sizes[part], sums, room)  # fmt: skip
    losses = to_losses(*sums)
    known = has_model(inverters)[inverter]
    for values in (losses.power_pct, losses.current_pct, losses.yearly_kwh):
        values[~known] = np.nan
    return losses.of(year)


def _fill_line(power, volts, hours, inverters, inverter, strings, in_series, order, starts, sizes, sums, room) -> None:
    """As `_fill`, for groups on one year (classes,)."""
    if len(order) >= _WORTH_MOMENTS * len(starts):
        head = order[starts]
        row, length = inverter[head], in_series[head].astype(float)
        most = length * strings[order[starts + sizes - 1]]
        tame = _bounds(power, volts, length, *_at_voltage(inverters, row), most)[0]
        tame &= np.isnan(inverters.max_current_a[row])
        _fill_by_moments(power, volts, hours, inverters, inverter, strings, in_series, order,
                         starts[tame], sizes[tame], sums, room)  # fmt: skip
        starts, sizes = starts[~tame], sizes[~tame]
    _fill(power, volts, hours, inverters, inverter, strings, in_series, order, starts, sizes, sums, room)


def _fill_by_moments(
    power, volts, hours, inverters, inverter, strings, in_series, order, starts, sizes, sums, room
) -> None:  # fmt: skip
    """As `_fill`, for groups of many options with tame efficiencies, no current limit, on one year (classes,).

    The AC power is a parabola in the number of modules in each class, and so is its sum over the year. Only
    what is above the limit, in the classes of highest power, and the classes of lowest power, where an inverter
    may not start, are gone through for each option.
    """
    falling = np.argsort(-power, kind="stable")
    power, volts, hours = power[falling], volts[falling], hours[falling]
    step = room.shape[1]
    for first in range(0, len(starts), step):
        begins, lengths = starts[first : first + step], sizes[first : first + step]
        head = order[begins]
        row, length = inverter[head], in_series[head].astype(float)
        start, span, bend, rated = _at_voltage(inverters, row)
        fewest, most = length * strings[head], length * strings[order[begins + lengths - 1]]
        _, least, steepest, lowest = _bounds(power, volts, length, start, span, bend, rated, most)
        begin = np.nan_to_num(inverters.sandia[row, 0])  # DC power below which nothing is delivered
        least = np.maximum(least, begin)
        limit = inverters.ac_power_w[row]
        near_limit = (limit / steepest + lowest) * (1.0 - 1e-9)

        c0, c1, c2, work, more, _ = room[:, : len(row)]
        _lines((start, span, bend), length, volts, (work, c1, c2))
        # From d * (rated / span + c2 * (d - span)) with d = dc - start.
        np.divide(rated[:, None], c1, out=c0)
        c1 *= c2
        np.subtract(c0, c1, out=c1)
        np.multiply(c2, work, out=more)
        np.subtract(more, c1, out=c0)
        c0 *= work
        more *= 2.0
        c1 -= more

        of = np.repeat(np.arange(len(row)), lengths)
        which = order[np.arange(len(of)) + np.repeat(begins - np.cumsum(lengths) + lengths, lengths)]
        modules = length[of] * strings[which]
        low = int(np.searchsorted(-power, -(least / fewest).max(), side="left"))
        w = hours[:low]
        a0, a1, a2 = c0[:, :low] @ w, c1[:, :low] @ (w * power[:low]), c2[:, :low] @ (w * power[:low] ** 2)
        total = (a2[of] * modules + a1[of]) * modules + a0[of]
        over = np.zeros(len(of))
        # Those with like numbers of classes above the limit together.
        heads = np.searchsorted(-power, -(near_limit[of] / modules), side="right")
        by_head = np.argsort(-heads, kind="stable")
        for k in range(0, len(of), step):
            some = by_head[k : k + step]
            g, m = of[some], modules[some]
            ac, dc = _parabola(c0, c1, c2, g, slice(low, None), m, power)
            ac[dc < begin[g, None]] = 0.0
            total[some] += np.maximum(ac, 0.0, out=ac) @ hours[low:]
            high = int(heads[some[0]])
            if high:
                ac, _ = _parabola(c0, c1, c2, g, slice(0, high), m, power)
                ac -= limit[g, None]
                over[some] = np.maximum(ac, 0.0, out=ac) @ hours[:high]
        sums[0, which] = total
        sums[1, which] = sums[2, which] = total - over


def _parabola(c0, c1, c2, group, classes, modules, power) -> tuple[np.ndarray, np.ndarray]:
    """AC and DC power [W] of options (n,) of some groups in some classes."""
    dc = modules[:, None] * power[classes]
    ac = c2[:, classes].take(group, axis=0)
    ac *= dc
    ac += c1[:, classes].take(group, axis=0)
    ac *= dc
    ac += c0[:, classes].take(group, axis=0)
    return ac, dc


def _lines(coefficients, length, volts, out) -> None:
    """``at zero + slope * length * volts`` of each pair of coefficients, for groups and classes."""
    for (at_zero, slope), values in zip(coefficients, out, strict=True):
        np.multiply((slope * length)[:, None], volts, out=values)
        values += at_zero[:, None]


def _fill(power, volts, hours, inverters, inverter, strings, in_series, order, starts, sizes, sums, room) -> None:
    """Fill the sums [Wh] of the groups of options given by their starts and sizes in ``order``.

    ``power``, ``volts`` and ``hours`` are one year (classes,), or one for each group (groups, classes).
    ``room`` is six working arrays for a number of groups at a time.
    """
    # Groups with many options first: the j-th options of all groups are then a leading slice.
    by_size = np.argsort(-sizes, kind="stable")
    starts, sizes = starts[by_size], sizes[by_size]
    if power.ndim == 2:
        power, volts, hours = power[by_size], volts[by_size], hours[by_size]
    step = room.shape[1]
    for first in range(0, len(starts), step):
        part = slice(first, first + step)
        p, v, h = (a[part] if a.ndim == 2 else a for a in (power, volts, hours))
        _fill_chunk(p, v, h, inverters, inverter, strings, in_series, order, starts[part], sizes[part], sums, room)


def _fill_chunk(power, volts, hours, inverters, inverter, strings, in_series, order, starts, sizes, sums, room) -> None:
    head = order[starts]
    row, length = inverter[head], in_series[head].astype(float)
    start, span, c2, rated = _at_voltage(inverters, row)
    begin = np.nan_to_num(inverters.sandia[row, 0])  # DC power below which nothing is delivered
    limit = inverters.ac_power_w[row][:, None]
    current = inverters.max_current_a[row]
    limited = bool((~np.isnan(current)).any())
    fewest, most = length * strings[head], length * strings[order[starts + sizes - 1]]
    low = _first_low_class(power, volts, length, start, span, c2, rated, begin, fewest, most)

    at_start, at_span, curve, share, d, work = room[:, : len(row)]
    _lines((start, span, c2), length, volts, (at_start, at_span, curve))
    np.divide(rated[:, None], at_span, out=share)

    def delivered(dc: np.ndarray, which: slice | np.ndarray) -> np.ndarray:
        """AC power without the power limit, in place of the DC power given."""
        off = dc[:, low:] < begin[which, None]
        above = np.subtract(dc, at_start[which], out=dc)
        ac = np.subtract(above, at_span[which], out=work[: len(dc)])
        ac *= curve[which]
        ac += share[which]
        ac *= above
        tail = ac[:, low:]
        tail[off] = 0.0
        np.maximum(tail, 0.0, out=tail)
        return ac

    for j in range(int(sizes[0])):
        live = int(np.searchsorted(-sizes, -j, side="left"))  # groups with more than j options
        which = order[starts[:live] + j]
        modules = length[:live] * strings[which]
        year_hours = hours[:live] if hours.ndim == 2 else hours
        dc = np.multiply(modules[:, None], power[:live] if power.ndim == 2 else power, out=d[:live])
        ac = delivered(dc, slice(live))
        sums[0, which] = _over_year(ac, year_hours)
        free = np.minimum(ac, limit[:live], out=ac)
        sums[1, which] = sums[2, which] = _over_year(free, year_hours)
        if limited:
            # Amperes per module string: what the current limit leaves of the power at the voltage.
            p, v = (a[:live] if a.ndim == 2 else a[None, :] for a in (power, volts))
            dc = modules[:, None] * p
            held = np.fmin(dc, (current * length)[:live, None] * v)
            t = np.flatnonzero((held < dc).any(axis=1))
            if len(t):
                ac = np.minimum(delivered(held[t], t), limit[t])
                sums[2, which[t]] = _over_year(ac, hours[t] if hours.ndim == 2 else hours)


def _at_voltage(inverters: InverterColumns, row: np.ndarray) -> tuple:
    """Start power, span [W] and curvature [1/W] as (at 0 V, per V) pairs, and rated AC power; arrays (n,).

    A constant efficiency is a span of 1 W, without start power or curvature, that gives that share of 1 W.
    """
    pso, paco, pdco, vdco, k0, k1, k2, k3 = inverters.sandia[row].T
    start = np.stack([pso * (1.0 - k2 * vdco), pso * k2])
    span = np.stack([pdco * (1.0 - k1 * vdco), pdco * k1]) - start
    c2 = np.stack([k0 * (1.0 - k3 * vdco), k0 * k3])
    constant = np.isnan(pso)
    if constant.any():
        start[:, constant] = c2[:, constant] = 0.0
        span[:, constant] = [[1.0], [0.0]]
        paco = np.where(constant, inverters.weighted_efficiency_pct[row] / 100.0, paco)
    return start, span, c2, paco


def _bounds(power, volts, length, start, span, c2, rated, most) -> tuple[np.ndarray, ...]:
    """Whether efficiencies are tame, and bounds over all voltages of the year; arrays (n,).

    Tame: AC power is positive above the start power, up to the power of ``most`` modules. The bounds: the
    highest start power [W], the highest AC power per watt above the start power, the lowest start power [W].
    """
    ends = np.stack([volts.min(axis=-1) * length, volts.max(axis=-1) * length])
    starts, spans, curves = (a + b * ends for a, b in (start, span, c2))
    least_span, most_span = spans.min(axis=0), spans.max(axis=0)
    beyond = np.maximum(most * power.max(axis=-1) - starts.min(axis=0) - least_span, 0.0)
    down, up = np.minimum(curves.min(axis=0), 0.0), np.maximum(curves.max(axis=0), 0.0)
    with np.errstate(invalid="ignore", divide="ignore"):
        tame = (least_span > 0) & (rated / most_span + down * beyond - up * most_span >= 0)
        steepest = rated / least_span + up * beyond - down * most_span
    return tame, starts.max(axis=0), steepest, starts.min(axis=0)


def _first_low_class(power, volts, length, start, span, c2, rated, begin, fewest, most) -> int:
    """First class from which on AC power may have to be set to none; 0 where that may be anywhere."""
    tame, least, *_ = _bounds(power, volts, length, start, span, c2, rated, most)
    if not tame.all():
        return 0
    need = np.maximum(least, begin) / fewest
    low = power < (need.max() if power.ndim == 1 else need[:, None])
    low = low if low.ndim == 1 else low.any(axis=0)
    return int(np.argmax(low)) if low.any() else len(low)


def _over_year(power: np.ndarray, hours: np.ndarray) -> np.ndarray:
    """Energy [Wh] of each line."""
    return power @ hours if hours.ndim == 1 else np.einsum("ij,ij->i", power, hours)
