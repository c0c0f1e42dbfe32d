"""What is said of candidates that take the place of a record, on screen and in files alike."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from cli.console import counted, number
from matcher.options import label

if TYPE_CHECKING:
    from cli.swap import Question
    from matcher.fit import Option

PART_WORDS = (
    "Unlike modules in one string share the current, which the weaker ones limit; unlike strings on one tracker share"
    " the voltage. What that costs is told for the whole array, at standard test conditions (STC) and in the heat;"
    " 'spread' is what it would cost at STC with the new modules spread over all strings."
)


def question_words(question: Question) -> str:
    """The question in a sentence."""
    q = question
    temperatures = f"{q.site.design_low_c:g} to {q.site.design_high_c:g} degC, {q.site.mounting}"
    where = f"at {temperatures}"
    if q.vetted.solved:
        where = f"wherever it holds itself ({temperatures})"
    elif q.site.name != "as given":
        where = f"at {q.site.name} ({temperatures})"
    total = sum(u.copies * u.modules for u in q.wired)
    units = sum(u.copies for u in q.wired)
    what = f"{q.part} of the {total:,} {q.module.name}" if q.part is not None else q.name
    wired = f"wired as {label(q.wired)}"
    if units > 1 and q.replaces_inverter:
        what = f"{units:,} {what}"
    elif units > 1:
        wired += f" on {'each of ' * (len(q.wired) == 1)}{units:,} {q.inverter.name}"
    return f"What takes the place of {what}, {wired}, {where}?"


def answer(question: Question) -> str:
    """How many are like it in power, and how many more keep the wiring sound, of how many."""
    swaps = question.swaps
    kind = "inverter" if question.replaces_inverter else "module"
    where = " in stock" if question.stock is not None else ""
    if question.part is not None:
        return (
            f"{len(swaps):,} of the {swaps.looked_at} {kind}s{where} that are nearest in current and voltage"
            f" (of {swaps.considered:,})."
        )
    of = f"of {counted(swaps.considered, kind)}{where}"
    lacking = lacking_words(question)
    if not len(swaps):
        return f"Nothing: none {of} keeps the wiring sound.{lacking}"
    like, more = question.within, len(swaps) - question.within
    words = f"{like:,} within {question.within_pct:g} % of its power" if like else f"None within {question.within_pct:g} % of its power"
    others = f"; {more:,} {'more ' if like else ''}of another power {'keeps' if more == 1 else 'keep'} the wiring sound" * bool(more)
    return f"{words}{others} ({of}).{_size_words(question)}{lacking}"


#: Records that are named with what they lack.
_NAMED = 3


def lacking_words(question: Question) -> str:
    """Which records lack a value to be judged at all, and which value; blank where none does."""
    swaps = question.swaps
    if not swaps.unmatched or swaps.points is None:
        return ""
    own = question.module.name
    lacking = [
        f"{record.name}: {reason}" for record, reason in zip(question.records, swaps.points.reasons, strict=True)
        if reason is not None and record.name != own
    ]  # fmt: skip
    shown = "; ".join(lacking[:_NAMED])
    if len(lacking) == 1:
        return f" 1 lacks a value to be judged at all ({shown})."
    such = "such as " * (len(lacking) > _NAMED)
    return f" {len(lacking):,} lack a value to be judged at all ({such}{shown})."


def _size_words(question: Question) -> str:
    """How many are of another size altogether, as their DC/AC ratio tells."""
    odd, (low, high) = int(question.swaps.odd.sum()), question.swaps.common
    if not odd:
        return ""
    return (
        f" {odd:,} of them {'is' if odd == 1 else 'are'} of another size altogether: a DC/AC ratio outside {low:.2f} to"
        f" {high:.2f}, marked ! and listed last."
    )


def part_notes(question: Question, shown: int) -> list[str]:
    """What is to be said of candidates for a part: losses that are not known, modules that add nothing."""
    q = question
    named = {k + 1: c for k, c in enumerate(q.swaps.found[:shown])}
    unknown = [n for n, c in named.items() if c.stc is None or c.hot is None]
    idle = [n for n, c in named.items() if c.idle]
    lines = []
    if unknown:
        lines.append(
            f"Losses not known for {_ranks(unknown)}: the single-diode model needs isc_coef_pct, voc_coef_pct and"
            " pmax_coef_pct, and one of them is not stated."
        )
    if idle:
        lines.append(f"! With {_ranks(idle)} the array gives no more than the old modules that stay would give alone.")
    return lines


def _ranks(ranks: list[int]) -> str:
    return ", ".join(f"#{n}" for n in ranks)


def offer(question: Question, record: Any) -> tuple[int, float | None, str | None] | None:
    """Pieces in stock, the lowest price of one, and its currency; ``None`` where the stock was not asked for."""
    if question.stock is None:
        return None
    lots = [lot for lot in question.stock.get(record.id, ()) if lot.quantity > 0]
    priced = min((lot for lot in lots if lot.unit_price is not None), key=lambda lot: lot.unit_price, default=None)
    pieces = sum(lot.quantity for lot in lots)
    return (pieces, None, None) if priced is None else (pieces, priced.unit_price, priced.currency)


def offer_words(question: Question, record: Any) -> str:
    """Like "480 at 61.40 EUR"; "from" where lots differ in price."""
    pieces, price, currency = offer(question, record) or (0, None, None)
    if price is None:
        return f"{pieces:,}, no price"
    prices = {lot.unit_price for lot in question.stock[record.id] if lot.quantity > 0 and lot.unit_price is not None}
    return f"{pieces:,} {'from' if len(prices) > 1 else 'at'} {number(price, 2)} {currency or ''}".rstrip()


VOLTAGE = ("max-dc-voltage", "system-voltage", "voltage-cap", "mppt-low", "mppt-high", "start")
CURRENT = ("short-circuit",)


def order(question: Question) -> str:
    """The order in words."""
    from matcher import partswap, swap

    if question.part is not None:
        return partswap.ORDER
    return swap.INVERTER_ORDER if question.replaces_inverter else swap.ORDER


def signed(value: float, digits: int = 1) -> str:
    """A change with its sign; blank where it is not known."""
    return "" if value != value else f"{value + 0.0:+.{digits}f}"


def margin(option: Option, checks: tuple[str, ...]) -> float | None:
    """Smallest margin of some checks [%]; ``None`` where none is known."""
    known = [c.margin_pct for c in option.checks if c.check in checks and c.margin_pct is not None]
    return min(known, default=None)
