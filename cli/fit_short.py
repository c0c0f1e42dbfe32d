"""What a search comes to, in a sentence or two: what stands first, why, what equals it, what would overtake it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from matcher.checks import Verdict
from matcher.order import Order, leading_keys

if TYPE_CHECKING:
    from matcher.fit import Fit, Option


def in_short(fit: Fit, options: Sequence[Option], brief: bool = False) -> str:
    """The answer as one gives it on the telephone; empty where the options speak for themselves.

    Parameters
    ----------
    options
        The first ones, in order.
    brief
        Leave out what equals the first one.
    """
    if not options:
        return ""
    best = options[0]
    reason = _reason(fit, best) if len(options) > 1 else ""
    if not reason:
        return _mind(fit, options, [best])
    if best.verdict is Verdict.TO_CONFIRM:
        said = f"In short: {_named(fit, best)}, {reason}; do not pay before its datasheet gives the values above."
    else:
        mixed = any(o.verdict is Verdict.TO_CONFIRM for o in options)
        said = f"In short: {_named(fit, best)}, {reason}{', of what fits' if mixed else ''}."
    if fit.request.order is Order.MARGIN:
        return _joined(said, _mind(fit, options, [best]))  # the margins of options are not on the screen
    keys = _keys(fit, options)
    equal = [o for o, key in zip(options[1:], keys[1:], strict=True) if o.verdict is best.verdict and key == keys[0]]
    if equal and not brief:
        said += " " + _equals(fit, best, equal)
    named = [best]
    if best.verdict is Verdict.FITS:
        ahead = [o for o, key in zip(options, keys, strict=True) if o.verdict is Verdict.TO_CONFIRM and key < keys[0]]
        if ahead:
            named.append(ahead[0])
            said += f" {_named(fit, ahead[0])}, would stand before it: do not pay before its datasheet gives the values above."
    return _joined(said, _mind(fit, options, named))


def _joined(*sentences: str) -> str:
    return " ".join(filter(None, sentences))


def _mind(fit: Fit, options: Sequence[Option], named: Sequence[Option]) -> str:
    """What the order that was asked for does not see of some options: clipping over the cap, limited currents."""
    said = [words for o in named if (words := _drawbacks(fit, options, o))]
    return f"Mind: {'; '.join(said)}." if said else ""


def _drawbacks(fit: Fit, options: Sequence[Option], o: Option) -> str:
    cap, words = fit.request.clip_cap_pct, []
    # These orders look at the clipping themselves, and the reason says it.
    seen = fit.request.order in (Order.LEAST_INVERTER, Order.CLIPPING)
    if not seen and o.clipping_loss_pct is not None and o.clipping_loss_pct > cap:
        words.append(f"clips {o.clipping_loss_pct:.2f} % where {cap:g} % is the most wanted")
        better = next((b for b in options if b.clipping_loss_pct is not None and b.clipping_loss_pct <= cap), None)
        if better is not None and (lost := (better.yearly_kwh or 0.0) - (o.yearly_kwh or 0.0)) >= 1.0 and better.modules == o.modules:
            words.append(f"yields {lost:,.0f} kWh a year less than #{better.rank}")
    over = (c for c in o.checks if c.check == "input-current" and c.limit is not None and (c.margin_pct or 0.0) < 0.0)
    words += [f"brings {c.value:,.1f} A to a tracker that takes {c.limit:,g} A and holds it back" for c in over]
    if not words:
        return ""
    return f"#{o.rank} " + (f"{', '.join(words[:-1])} and {words[-1]}" if len(words) > 1 else words[0])


def _named(fit: Fit, o: Option) -> str:
    from cli.fit_screen import wiring

    if fit.is_pair:
        return f"#{o.rank}, {wiring(o)}"
    if not fit.lists_inverters:
        return f"#{o.rank}, {fit.modules[o.module].name}"
    return f"#{o.rank}, {f'{o.units} x ' if o.units > 1 else ''}{fit.inverters[o.inverter].name}"


def _reason(fit: Fit, best: Option) -> str:
    """Why an option stands first, by the order that was asked for; empty where there is no figure to say it by."""
    r = fit.request
    ratio = f"has the highest DC/AC ratio ({best.dc_ac_ratio:.2f})"
    if r.order is Order.COST:
        assert fit.search.shelf is not None
        return "" if best.cost is None else f"costs least, {best.cost:,.0f} {fit.search.shelf.currency}"
    if r.order is Order.ENERGY:
        return "" if best.yearly_kwh is None else f"yields most, {best.yearly_kwh:,.0f} kWh a year"
    if r.order is Order.MARGIN:
        return "has the largest margin to the voltage limit in the cold"
    if r.order is Order.RATIO:
        return ratio
    if r.order is Order.CLIPPING:
        return "" if best.clipping_loss_pct is None else f"clips least, {best.clipping_loss_pct:.2f} %"
    if best.clipping_loss_pct is not None and best.clipping_loss_pct > r.clip_cap_pct:
        return f"clips least, {best.clipping_loss_pct:.2f} %, though more than {r.clip_cap_pct:g} %"
    if fit.lists_inverters and not fit.is_pair and (r.strings is not None or (r.counts and r.counts[0] == r.counts[1])):
        ac_kw = best.units * fit.inverters[best.inverter].ac_power_w / 1000.0
        ratio = f"is the least inverter for them ({ac_kw:,.2f} kW, DC/AC {best.dc_ac_ratio:.2f})"
    return ratio if best.clipping_loss_pct is None else f"{ratio} that clips no more than {r.clip_cap_pct:g} %"


def _keys(fit: Fit, options: Sequence[Option]) -> list[tuple[float, ...]]:
    """What the order asks for decides by these, ties apart."""
    import numpy as np

    def column(name: str) -> np.ndarray:
        return np.array([np.nan if (value := getattr(o, name)) is None else value for o in options], dtype=float)

    r = fit.request
    keys = leading_keys(r.order, r.clip_cap_pct, column("dc_ac_ratio"), column("clipping_loss_pct"),
                        np.full(len(options), np.nan), column("yearly_kwh"), column("cost"))  # fmt: skip
    return list(map(tuple, np.round(np.column_stack(keys), 9).tolist()))


def _equals(fit: Fit, best: Option, equal: Sequence[Option]) -> str:
    """What equals the first option in all that the order asks for, and by what it stands first nevertheless."""
    from cli.fit_confirm import ranks_words

    who, one = ranks_words([o.rank for o in equal]), len(equal) == 1
    if fit.is_pair:
        said = f"{who} {'has' if one else 'have'} the same power in other strings"
    else:
        said = f"{who} {'equals' if one else 'equal'} it in that"
    first, second = _lengths(best), _lengths(equal[0])
    if len(first) < len(second):
        return f"{said}; #{best.rank} has fewer string lengths."
    if fit.is_pair and max(first) < max(second):
        return f"{said}; #{best.rank} has the larger cold-voltage margin."
    return f"{said}."


def _lengths(o: Option) -> set[int]:
    return {t.in_series for unit in o.wired for t in unit.trackers}
