"""Vetted bundles on the terminal: one with its reasons, or a list with a line for each."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from cli.cautions import CAUTIONS, HOURLY_MEANS
from cli.console import Column, counted, number, say, table_lines
from cli.facts import confirm_words
from cli.fit_screen import climate_window
from cli.vet_words import assumed, cause, mend_words, place_words, short, window_short, window_words
from matcher.options import label

if TYPE_CHECKING:
    from cli.vet_lists import Line, VettedList
    from cli.years import SiteYear
    from matcher.checks import Check
    from matcher.vet import Vetted

NO_CLIPPING_ANYWHERE = "No clipping figure: no site is given (--site, or --low and --high with --lat and --lon)."

#: Rows of a list, and lines of its table, that fit one screen with what stands around them.
ONE_SCREEN, LINES = 17, 17


def show(vetted: Vetted, year: SiteYear | None, rules: bool = False) -> None:
    """Print one bundle: question, verdict, wiring, climate, reasons, changes, checks (and their ``rules``)."""
    say(question_words(vetted))
    say()
    if vetted.verdict == "no-verdict":
        say(f"no-verdict: {vetted.reason}.")
        return
    if vetted.option is not None:
        _show_sound(vetted)
    else:
        say(f"does-not-fit: {cause(vetted.failed)}. {sentence(vetted.reason)}")
        if vetted.window is not None and not vetted.window.by_hours:
            say(f"Elsewhere: {window_words(vetted.window)}.")
        say("What would mend it, the smallest change first:" if vetted.mends else "No single change mends it.")
        for mend in vetted.mends:
            say(mend_words(mend, vetted), indent=2)
    if vetted.checks:
        say()
        site = vetted.site
        say(f"Checks of {label(vetted.wired)} at {site.design_low_c:g} and {site.design_high_c:g} degC:")
        columns = len(_CHECKS) if rules else len(_CHECKS) - 1
        _print(table_lines(_CHECKS[:columns], [_check_row(c)[:columns] for c in vetted.checks]))
    say()
    if year is not None:
        for line in year_lines(year):
            say(line)
    for line in assumed(vetted):
        say(line)
    for line in CAUTIONS:
        say(line)


def year_lines(year: SiteYear | None) -> list[str]:
    """Where clipping and energy of one bundle come from, or why there are none."""
    if year is None:
        return [NO_CLIPPING_ANYWHERE]
    return [*(year.notes or (f"No clipping figure: {year.why_not}.",)), *[HOURLY_MEANS] * (year.year is not None)]


def question_words(vetted: Vetted) -> str:
    """The question in a sentence."""
    b, site = vetted.bundle, vetted.site
    name = vetted.inverter.name
    where = "in which climates"
    if not vetted.solved:
        where = f"at {site.design_low_c:g} to {site.design_high_c:g} degC, {site.mounting}"
        if site.name != "as given":
            where = f"at {site.name} ({site.design_low_c:g} to {site.design_high_c:g} degC, {site.mounting})"
    else:
        where = f"{where}, {site.mounting}"
    return f"Is it sound: {b.modules} {b.module.name} on {b.units} {name}, {where}?"


def _show_sound(vetted: Vetted) -> None:
    option = vetted.option
    assert option is not None
    words = f"{vetted.verdict}: wired as {option.label}, DC/AC {option.dc_ac_ratio:.2f}"
    if option.clipping_loss_pct is not None:
        words += f", {option.clipping_loss_pct:.2f} % clipped, {number(option.yearly_kwh)} kWh/year"
    say(f"{words}.")
    say(sentence(window_words(vetted.window)))
    if option.confirm:
        say("To confirm on the datasheets before ordering:")
        for c in option.confirm:
            at = f" (at {vetted.site.design_low_c:g} degC)" if vetted.solved and c.unit == "V" else ""
            say(f"{c.record}: {confirm_words(c)}{at}", indent=2)
    for remark in vetted.remarks:
        say(f"Note: {remark}.")


def sentence(text: str) -> str:
    """A sentence with its capital and its point."""
    return f"{text[:1].upper()}{text[1:]}."


_CHECKS = (
    Column("check"), Column("value", number=True), Column("limit", number=True), Column("unit"),
    Column("margin %", number=True), Column("verdict"), Column("rule", fold=True),
)  # fmt: skip


def _check_row(c: Check) -> list[str]:
    digits = 0 if c.unit in ("W", "1") else 1
    rule = c.rule + (f"; {c.remark}" if c.remark else "")
    return [c.check, number(c.value, digits), number(c.limit, digits), "" if c.unit == "1" else c.unit,
            number(c.margin_pct, 1), str(c.verdict), rule]  # fmt: skip


def show_list(vetted: VettedList, everything: bool) -> None:
    """Print a line for each bundle, those that want attention first where not all can be shown."""
    lines = vetted.lines
    say(summary(lines))
    say()
    clips = any(clipping(line) is not None for line in lines)
    columns = [Column("row", number=True), Column("article", fold=True), Column("modules", fold=True, min_width=15), Column("verdict"),
               *([Column("clip %", number=True)] if clips else []),
               Column("holds at degC", number=True), Column("wiring, or what is wrong", fold=True, min_width=24)]  # fmt: skip
    shown = list(lines) if everything else sorted(lines, key=lambda line: ATTENTION[line.verdict])[:ONE_SCREEN]
    if len(shown) == len(lines):
        shown = list(lines)
    table = table_lines(columns, [_line_row(line, clips) for line in shown])
    while not everything and len(table) > LINES:
        # Rows that fold take the room of others.
        shown = sorted(shown, key=lambda line: ATTENTION[line.verdict])[:-1]
        table = table_lines(columns, [_line_row(line, clips) for line in shown])
    _print(table)
    if len(shown) < len(lines):
        say(f"... and {len(lines) - len(shown):,} more (--all shows them, --out FILE.xlsx holds all with their reasons).")
    say()
    for line in (*place_words(lines), *year_words(vetted)):
        say(line)
    for line in CAUTIONS:
        say(line)


def _print(table: Sequence[str]) -> None:
    for line in table:
        print(line)


def clipping(line: Line) -> float | None:
    """Clipping loss of a bundle [%], where it is known."""
    return None if line.vetted is None or line.vetted.option is None else line.vetted.option.clipping_loss_pct


def year_words(vetted: VettedList) -> list[str]:
    """Where clipping and energy of a list come from, site by site; or why there are none."""
    if not vetted.years:
        return [NO_CLIPPING_ANYWHERE]
    if len(vetted.years) == 1:
        (year,) = vetted.years.values()
        lines = list(year.notes or (f"No clipping figure: {year.why_not}.",))
    else:
        # All that is to be said of several sites would bury the list.
        known: dict[str, list[str]] = {}
        for site, year in vetted.years.items():
            what = f"No clipping figure ({year.why_not})" if year.plane is None else f"Weather: {year.weather}"
            known.setdefault(what, []).append(site.name)
        lines = [f"{what}, for {', '.join(sites)}." for what, sites in known.items()]
    return lines + [HOURLY_MEANS] * any(year.plane is not None for year in vetted.years.values())


def summary(lines: Sequence[Line]) -> str:
    """How many of a list came out how."""
    counts = {v: sum(line.verdict == v for line in lines) for v in ATTENTION}
    said = ", ".join(f"{n:,} {v}" for v, n in sorted(counts.items(), key=lambda e: -ATTENTION[e[0]]) if n)
    return f"{counted(len(lines), 'bundle')}: {said}."


#: What wants attention first.
ATTENTION = {"does-not-fit": 0, "no-verdict": 1, "to-confirm": 2, "fits": 3}


def _line_row(line: Line, clips: bool) -> list[str]:
    v = line.vetted
    head = [str(line.row.number), line.row.article]
    if v is None:
        return [*head, f"{line.row.modules} {line.row.module}", line.verdict, *[""] * (2 if clips else 1), line.reason]
    holds = "" if v.verdict == "no-verdict" else window_short(v.window)
    if v.option is not None:
        holds = climate_window(v.option)
    clipped = [number(clipping(line), 2)] if clips else []
    words = "; ".join([short(v), *line.read_as])
    return [*head, f"{v.bundle.modules:,} {v.bundle.module.model}", line.verdict, *clipped, holds, words]
