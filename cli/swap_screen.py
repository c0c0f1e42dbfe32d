"""What takes the place of a record, on the terminal."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from cli.cautions import CAUTIONS, HOURLY_MEANS
from cli.console import Column, console, number, print_table, say
from cli.facts import confirm_words
from cli.fit_screen import climate_window
from cli.swap_words import PART_WORDS, CURRENT, VOLTAGE, answer, margin, offer_words, order, part_notes, question_words, signed
from cli.vet_words import window_short
from matcher.options import label

if TYPE_CHECKING:
    from collections.abc import Sequence

    from cli.swap import Question
    from matcher.fit import Fit, Option

def show(question: Question, full: list[tuple[Fit, Option]], limit: int) -> None:
    """Print question, answer, candidates, what to confirm, cautions."""
    q = question
    say(question_words(q))
    if q.vetted.verdict == "does-not-fit":
        say(f"Note: this wiring is not sound with {q.module.name} itself: {q.vetted.reason}.")
    say()
    if q.part is not None:
        _show_part(question, limit)
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


def _show_modules(question: Question, full: list[tuple[Fit, Option]]) -> None:
    swaps = question.swaps
    say(answer(question))
    if not full:
        return
    say(f"Order: {order(question)}.")
    say()
    clips = any(o.clipping_loss_pct is not None for _, o in full)
    # A narrow screen has no room for sizes beside names that can be read.
    sizes = console().width >= _ROOM_FOR_SIZES
    columns = [Column("#", number=True), Column("module", fold=True, min_width=20), Column("verdict"), Column("W", number=True),
               Column("power %", number=True), Column("Vmp %", number=True), Column("Imp %", number=True),
               *([Column("mm", number=True)] if sizes else []), Column("DC/AC", number=True)]  # fmt: skip
    if clips:
        columns.append(Column("clip %", number=True))
    columns.append(Column("holds at degC", number=True))
    own = question.vetted.option
    rows = [["old", question.module.name, question.vetted.verdict, f"{question.module.pmax_w:.0f}", "", "", ""]]
    rows[0] += [_size(question.module)] * sizes
    rows[0] += ["" if own is None else f"{own.dc_ac_ratio:.2f}"]
    rows[0] += [] if not clips else ["" if own is None else number(own.clipping_loss_pct, 2)]
    rows[0] += [_own_window(question)]
    for k, (fit, o) in enumerate(full):
        size = swaps.size_mm[k]
        row = [
            str(k + 1), fit.modules[0].name, str(o.verdict), f"{fit.modules[0].pmax_w:.0f}",
            *(signed(swaps.changes[n][k]) for n in ("power", "vmp", "imp")),
            *["x".join(signed(v, 0) for v in size) if size[0] == size[0] else ""] * sizes, _ratio(question, k, o),
        ]  # fmt: skip
        rows.append([*row, *([number(o.clipping_loss_pct, 2)] if clips else []), climate_window(o)])
    print_table(columns, rows)
    _in_stock(question, [question.records[k] for k in swaps.index[: len(full)].tolist()])
    _unclipped(full)
    _more(question, len(full))
    _margins(full)
    _confirm(full)


#: Width of a screen from which on changes of size are shown.
_ROOM_FOR_SIZES = 96


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
               signed(swaps.changes["power"][k]), o.label, _ratio(question, k, o)]  # fmt: skip
        rows.append([*row, *([number(o.clipping_loss_pct, 2)] if clips else []), climate_window(o)])
    print_table(columns, rows)
    _in_stock(question, [question.records[k] for k in swaps.index[: len(full)].tolist()])
    _unclipped(full)
    _more(question, len(full))
    _margins(full)
    _confirm(full)


def _unclipped(full: list[tuple[Fit, Option]]) -> None:
    """Say why a figure is missing where others have one."""
    missing = [f"#{k + 1}" for k, (_, o) in enumerate(full) if o.clipping_loss_pct is None]
    if 0 < len(missing) < len(full):
        say(f"No clipping figure for {', '.join(missing)}: a coefficient that the single-diode model needs is not stated.")


def _ratio(question: Question, k: int, option: Option) -> str:
    """DC/AC ratio of a candidate, marked where it is of another size altogether."""
    return f"{option.dc_ac_ratio:.2f}" + (" !" if question.swaps.odd[k] else "")


def _in_stock(question: Question, records: Sequence[Any]) -> None:
    if question.stock is not None and records:
        words = "; ".join(f"#{k + 1} {offer_words(question, r)}" for k, r in enumerate(records))
        say(f"In stock, pieces and price each: {words}.")


def _more(question: Question, shown: int) -> None:
    left = len(question.swaps) - shown
    if left > 0:
        say(f"... and {left:,} more (--limit N shows more, --out FILE.csv holds all of them).")


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


def _show_part(question: Question, limit: int) -> None:
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
        losses = ["?" if m is None else number(m.loss_pct, 2) for m in (c.stc, c.hot, c.spread_stc)]
        losses[0] += " !" if c.idle else ""
        rows.append([str(k + 1), new.name, c.verdict, f"{new.pmax_w:.0f}", f"{new.vmp_v:.1f}", f"{new.imp_a:.2f}", *losses])
    print_table(columns, rows)
    for line in part_notes(question, limit):
        say(line)
    _in_stock(question, [question.records[c.index] for c in swaps.found[:limit]])
    best = swaps.found[0]
    say(f"Wired, tracker by tracker: {' | '.join(t.label for t in best.trackers)}.")
    if len(swaps) > limit:
        say(f"... and {len(swaps) - limit:,} more (--limit N shows more, --out FILE.csv holds all of them).")
    for k, c in enumerate(swaps.found[: min(limit, 3)]):
        if c.confirm:
            say(f"To confirm for #{k + 1}: " + "; ".join(f"{x.record}: {confirm_words(x)}" for x in c.confirm))
