"""What takes the place of a record, on the terminal."""

from __future__ import annotations

from typing import TYPE_CHECKING

from cli.cautions import CAUTIONS, HOURLY_MEANS
from cli.console import Column, counted, number, print_table, say
from cli.facts import confirm_words
from cli.fit_screen import climate_window
from cli.vet_words import window_short
from matcher.options import label

if TYPE_CHECKING:
    from cli.swap import Question
    from matcher.fit import Fit, Option

PART_WORDS = (
    "Unlike modules in one string share the current, which the weaker ones limit; unlike strings on one tracker share"
    " the voltage. What that costs is told for the whole array, at standard test conditions (STC) and in the heat;"
    " 'spread' is what it would cost at STC with the new modules spread over all strings."
)


def show(question: Question, full: list[tuple[Fit, Option]]) -> None:
    """Print question, answer, candidates, what to confirm, cautions."""
    q = question
    say(question_words(q))
    if q.vetted.verdict == "does-not-fit":
        say(f"Note: this wiring is not sound with {q.module.name} itself: {q.vetted.reason}.")
    say()
    if q.part is not None:
        _show_part(question)
    elif q.replaces_inverter:
        _show_inverters(question, full)
    else:
        _show_modules(question, full)
    say()
    year = q.old_year
    if year is not None and q.part is None:
        for line in year.notes or (f"No clipping figure: {year.why_not}.",):
            say(line)
        if year.year is not None:
            say(HOURLY_MEANS)
    for line in CAUTIONS:
        say(line)


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
    what = f"{q.part} of the {total} {q.module.name}" if q.part is not None else q.name
    return f"What takes the place of {what}, wired as {label(q.wired)}, {where}?"


def answer(question: Question) -> str:
    """How many are like it in power, and how many more keep the wiring sound, of how many."""
    swaps = question.swaps
    kind = "inverter" if question.replaces_inverter else "module"
    where = " in stock" if question.stock_only else ""
    if question.part is not None:
        return (
            f"{len(swaps)} of the {swaps.looked_at} {kind}s{where} that are nearest in current and voltage"
            f" (of {swaps.considered:,})."
        )
    of = f"of {counted(swaps.considered, kind)}{where}"
    lacking = f" {swaps.unmatched:,} {'lacks' if swaps.unmatched == 1 else 'lack'} a value to be judged at all." * bool(swaps.unmatched)
    if not len(swaps):
        return f"Nothing: none {of} keeps the wiring sound.{lacking}"
    like, more = question.within, len(swaps) - question.within
    words = f"{like or 'None':,} within {question.within_pct:g} % of its power" if like else f"None within {question.within_pct:g} % of its power"
    others = f"; {more:,} {'more ' if like else ''}of another power {'keeps' if more == 1 else 'keep'} the wiring sound" * bool(more)
    return f"{words}{others} ({of}).{lacking}"


def order(question: Question) -> str:
    """The order in words."""
    from matcher import partswap, swap

    if question.part is not None:
        return partswap.ORDER
    return swap.INVERTER_ORDER if question.replaces_inverter else swap.ORDER


def signed(value: float, digits: int = 1) -> str:
    """A change with its sign; blank where it is not known."""
    return "" if value != value else f"{value + 0.0:+.{digits}f}"


def _show_modules(question: Question, full: list[tuple[Fit, Option]]) -> None:
    swaps = question.swaps
    say(answer(question))
    if not full:
        return
    say(f"Order: {order(question)}.")
    say()
    clips = any(o.clipping_loss_pct is not None for _, o in full)
    columns = [Column("#", number=True), Column("module", fold=True, min_width=26), Column("verdict"), Column("W", number=True),
               Column("power %", number=True), Column("Vmp %", number=True), Column("Imp %", number=True),
               Column("mm", number=True), Column("DC/AC", number=True)]  # fmt: skip
    if clips:
        columns.append(Column("clip %", number=True))
    columns.append(Column("holds at degC", number=True))
    own = question.vetted.option
    rows = [["old", question.module.name, question.vetted.verdict, f"{question.module.pmax_w:.0f}", "", "", "", _size(question.module)]]
    rows[0] += ["" if own is None else f"{own.dc_ac_ratio:.2f}"]
    rows[0] += [] if not clips else ["" if own is None else number(own.clipping_loss_pct, 2)]
    rows[0] += [_own_window(question)]
    for k, (fit, o) in enumerate(full):
        size = swaps.size_mm[k]
        row = [
            str(k + 1), fit.modules[0].name, str(o.verdict), f"{fit.modules[0].pmax_w:.0f}",
            *(signed(swaps.changes[n][k]) for n in ("power", "vmp", "imp")),
            "x".join(signed(v, 0) for v in size) if size[0] == size[0] else "", f"{o.dc_ac_ratio:.2f}",
        ]  # fmt: skip
        rows.append([*row, *([number(o.clipping_loss_pct, 2)] if clips else []), climate_window(o)])
    print_table(columns, rows)
    _more(question, len(full))
    _margins(full)
    _confirm(full)


def _size(module) -> str:
    if module.length_m is None or module.width_m is None:
        return ""
    return f"{module.length_m * 1000:.0f}x{module.width_m * 1000:.0f}"


def _own_window(question: Question) -> str:
    option = question.vetted.option
    return window_short(question.vetted.window) if option is None else climate_window(option)


def _show_inverters(question: Question, full: list[tuple[Fit, Option]]) -> None:
    swaps = question.swaps
    say(answer(question))
    if not full:
        return
    say(f"Order: {order(question)}.")
    say()
    clips = any(o.clipping_loss_pct is not None for _, o in full)
    columns = [Column("#", number=True), Column("inverter", fold=True, min_width=30), Column("verdict"), Column("AC kW", number=True),
               Column("power %", number=True), Column("wiring", fold=True), Column("DC/AC", number=True)]  # fmt: skip
    columns += [Column("clip %", number=True)] if clips else []
    columns.append(Column("holds at degC", number=True))
    own = question.vetted.option
    rows = [["old", question.inverter.name, question.vetted.verdict, f"{question.inverter.ac_power_w / 1000:.2f}", "",
             label(question.wired), "" if own is None else f"{own.dc_ac_ratio:.2f}"]]  # fmt: skip
    rows[0] += ["" if own is None else number(own.clipping_loss_pct, 2)] if clips else []
    rows[0].append(_own_window(question))
    for k, (fit, o) in enumerate(full):
        inverter = fit.inverters[0]
        row = [str(k + 1), inverter.name, str(o.verdict), f"{inverter.ac_power_w / 1000:.2f}",
               signed(swaps.changes["power"][k]), o.label, f"{o.dc_ac_ratio:.2f}"]  # fmt: skip
        rows.append([*row, *([number(o.clipping_loss_pct, 2)] if clips else []), climate_window(o)])
    print_table(columns, rows)
    _more(question, len(full))
    _margins(full)
    _confirm(full)


def _more(question: Question, shown: int) -> None:
    left = len(question.swaps) - shown
    if left > 0:
        say(f"... and {left:,} more (--limit N shows more, --out FILE.csv holds all of them).")


def margin(option: Option, checks: tuple[str, ...]) -> float | None:
    """Smallest margin of some checks [%]; ``None`` where none is known."""
    known = [c.margin_pct for c in option.checks if c.check in checks and c.margin_pct is not None]
    return min(known, default=None)


VOLTAGE = ("max-dc-voltage", "system-voltage", "voltage-cap", "mppt-low", "mppt-high", "start")
CURRENT = ("short-circuit",)


def _margins(full: list[tuple[Fit, Option]]) -> None:
    tight = []
    for k, (_, o) in enumerate(full):
        for words, checks in (("voltage", VOLTAGE), ("current", CURRENT)):
            least = margin(o, checks)
            if least is not None and least < 3.0:
                tight.append(f"#{k + 1} {words} {least:.1f} %")
    if tight:
        say(f"Tight margins: {', '.join(tight)}.")


def _confirm(full: list[tuple[Fit, Option]]) -> None:
    waiting = [(k, o) for k, (_, o) in enumerate(full) if o.confirm]
    if not waiting:
        return
    say("To confirm on the datasheets before ordering:")
    for k, o in waiting[:5]:
        say(f"#{k + 1}  " + "; ".join(f"{c.record}: {confirm_words(c)}" for c in o.confirm), indent=2)
    if len(waiting) > 5:
        say("(the document holds them for all: --json)", indent=2)


def _show_part(question: Question, limit: int = 10) -> None:
    swaps = question.swaps
    say(answer(question))
    if not len(swaps):
        return
    say(PART_WORDS)
    say(f"Order: {order(question)}.")
    say()
    columns = [Column("#", number=True), Column("module", fold=True, min_width=26), Column("verdict"), Column("W", number=True),
               Column("Vmp V", number=True), Column("Imp A", number=True), Column("STC %", number=True),
               Column("hot %", number=True), Column("spread %", number=True)]  # fmt: skip
    old = question.module
    rows = [["old", old.name, "", f"{old.pmax_w:.0f}", f"{old.vmp_v:.1f}", f"{old.imp_a:.2f}", "", "", ""]]
    for k, c in enumerate(swaps.found[:limit]):
        new = question.records[c.index]
        losses = [number(None if m is None else m.loss_pct, 2) for m in (c.stc, c.hot, c.spread_stc)]
        rows.append([str(k + 1), new.name, c.verdict, f"{new.pmax_w:.0f}", f"{new.vmp_v:.1f}", f"{new.imp_a:.2f}", *losses])
    print_table(columns, rows)
    best = swaps.found[0]
    say(f"Wired, tracker by tracker: {' | '.join(t.label for t in best.trackers)}.")
    if len(swaps) > limit:
        say(f"... and {len(swaps) - limit:,} more (--out FILE.csv holds all of them).")
    for k, c in enumerate(swaps.found[:3]):
        if c.confirm:
            say(f"To confirm for #{k + 1}: " + "; ".join(f"{x.record}: {confirm_words(x)}" for x in c.confirm))
