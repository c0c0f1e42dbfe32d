"""The result of a search on the terminal: the question, the answer, the reasons, what to read, the cautions."""

from __future__ import annotations

import sys
from collections.abc import Iterator, Sequence
from dataclasses import replace
from itertools import groupby
from typing import TYPE_CHECKING

from cli.cautions import CAUTIONS, HOURLY_MEANS
from cli.console import Column, number, print_table, say
from cli.facts import assumptions, at_least, confirm_words, field_words, holds_from, holds_to, number_of_options, whole
from cli.quoting import amend_command
from matcher.checks import Check, Confirm, Verdict, face_mark

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.fit import Fit, Option
    from matcher.options import Unit
    from matcher.request import Request


def on_terminal() -> bool:
    """Whether stdout is a terminal."""
    return sys.stdout.isatty()


def show(fit: Fit, year: SiteYear, *, limit: int, checks: bool, why: bool) -> None:
    """Print the answer."""
    options = show_options(fit, year, limit)
    _amend_lines(fit, options)
    if checks or fit.is_pair:
        for option in options if checks else options[:1]:
            say()
            checks_table(fit, option)
    if fit.is_pair and not options:
        (_, reason), *_ = fit.rejections()
        say(f"Stopped by {', '.join(reason.failed)}: {reason.nearest}.")
    elif why:
        _why_table(fit, limit)
    elif not options:
        say("--why says what stops each of them, and what would change that.")
    say()
    show_grounds(fit, year)


def say_lines(lines: Sequence[str]) -> None:
    """Print lines, and an empty one where there are any."""
    for line in lines:
        say(line)
    if lines:
        say()


def show_options(fit: Fit, year: SiteYear, limit: int) -> list[Option]:
    """Print question, answer, the first options and what to confirm of them; return these options."""
    say(question(fit))
    say()
    options = list(fit.options(limit))
    say(answer(fit, options))
    if options:
        say(f"Order: {fit.order}.")
        _options_tables(fit, options, year.year is not None)
        more = number_of_options(fit) - len(options)
        if more > 0:
            say(f"... and {more:,} more (--limit N shows more, --out FILE.csv holds all of them).")
        _confirm_lines(fit, options)
        _notes_line(options)
    return options


def show_grounds(fit: Fit, year: SiteYear) -> None:
    """Print what the answer rests on, and the cautions."""
    for line in year.notes or (f"No clipping figure: {year.why_not}.",):
        say(line)
    if year.year is not None and year.year.shows_clipping:
        say(HOURLY_MEANS)
    for line in assumptions(fit):
        say(line)
    for line in CAUTIONS:
        say(line)


def question(fit: Fit) -> str:
    """What was asked, as a sentence."""
    r = fit.request
    where = f"{r.site.design_low_c:g} to {r.site.design_high_c:g} degC, {r.site.mounting}"
    if r.site.name != "as given":
        where = f"{r.site.name} ({where})"
    if fit.is_pair:
        asked = f"How can {fit.modules[0].name} be wired to {fit.inverters[0].name}"
    elif fit.lists_inverters:
        asked = f"Which inverters take {fit.modules[0].name}"
    else:
        asked = f"Which modules can be wired to {fit.inverters[0].name}"
    low, high = r.ratio
    count = ""
    if r.counts is not None:
        count = f", {_span(r.counts)} modules"
    if r.strings is not None:
        count = ", exactly the strings " + ", ".join(_strings(r))
    if r.several:
        count += f" on {_span(r.units)} units"
    return f"{asked} at {where}? DC/AC {low:.2f} to {high:.2f}{count}, rules {r.rules.name}."


def _strings(request: Request) -> Iterator[str]:
    """The strings of a request, with a letter and azimuth/tilt for each way they face."""
    faces = request.faces or (None,) * len(request.strings or ())
    for (length, count), face in zip(request.strings or (), faces, strict=True):
        where = ""
        if face is not None:
            where = f"{face_mark(request.different_faces.index(face) + 1)} ({face[0]:g}/{face[1]:g} deg)"
        yield f"{count}x{length}{where}"


def _span(counts: tuple[int, int]) -> str:
    return str(counts[0]) if counts[0] == counts[1] else f"{counts[0]} to {counts[1]}"


def answer(fit: Fit, options: Sequence[Option]) -> str:
    """What came out, as a sentence; ``options`` are the first ones."""
    t = fit.totals
    if not t.arrangements:
        return "Nothing fits."
    ways = f"{t.arrangements:,} arrangement{'s' if t.arrangements != 1 else ''}"
    if fit.request.several:
        ways += " of one unit"
    if fit.is_pair:
        words = f"In {ways}."
    else:
        side = "inverters" if fit.lists_inverters else "modules"
        words = f"{t.records_with_option:,} of {t.records_considered:,} {side}, in {ways}."
    if options and options[0].verdict is Verdict.TO_CONFIRM:
        words += " None is proven by the ratings on record: each waits for values to confirm."
    return words


def _options_tables(fit: Fit, options: Sequence[Option], has_year: bool) -> None:
    """One table per verdict, which is why the verdict needs no column."""
    for _, alike in groupby(options, key=lambda o: o.verdict):
        some = list(alike)
        say()
        say(_HEADINGS[some[0].verdict])
        _options_table(fit, some, has_year)


_HEADINGS = {
    Verdict.FITS: "fits: every check that can stop it holds by the ratings on record",
    Verdict.TO_CONFIRM: "to-confirm: nothing on record speaks against it, but a safety rating is not on record",
}


def _options_table(fit: Fit, options: Sequence[Option], has_year: bool) -> None:
    shelf = fit.search.shelf
    columns = [Column("#", number=True)]
    if not fit.is_pair:
        name_width = 30 if shelf is None else 22  # a column of costs needs the room
        columns += [Column("inverter" if fit.lists_inverters else "module", fold=True, min_width=name_width)]
        columns += [Column("AC kW" if fit.lists_inverters else "W", number=True)]
    columns += [Column("wiring", fold=True), Column("mod.", number=True), Column("DC/AC", number=True)]
    if has_year:
        columns += [Column("clip %", number=True), Column("kWh/year", number=True)]
    if shelf is not None and shelf.currency is not None:
        columns += [Column(f"cost {shelf.currency}", number=True)]
    columns += [Column("holds at degC", number=True)]
    rows = []
    for o in options:
        row = [str(o.rank)]
        if not fit.is_pair:
            row += _listed(fit, o)
        row += [wiring(o), str(o.modules), f"{o.dc_ac_ratio:.2f}"]
        if has_year:
            row += [number(o.clipping_loss_pct, 2), number(o.yearly_kwh)]
        if shelf is not None and shelf.currency is not None:
            row += [number(o.cost)]
        rows.append([*row, climate_window(o)])
    print_table(columns, rows)


def _listed(fit: Fit, option: Option) -> list[str]:
    if fit.lists_inverters:
        inverter = fit.inverters[option.inverter]
        return [inverter.name, f"{inverter.ac_power_w / 1000:.2f}"]
    module = fit.modules[option.module]
    return [module.name, f"{module.pmax_w:.0f}"]


def wiring(option: Option) -> str:
    """Arrangement with like trackers taken together (``8 of 2x21 | 1x20``), units ahead where there are several."""
    kinds = [_unit_wiring(u) for u in option.wired]
    if option.units == 1:
        return kinds[0]
    return " + ".join(f"{u.copies} unit{'s' if u.copies > 1 else ''}: {w}" for u, w in zip(option.wired, kinds, strict=True))


def _unit_wiring(unit: Unit) -> str:
    if len(unit.trackers) <= 3:
        return unit.label
    labels = [t.label for t in unit.trackers]
    alike = [(label, len(list(some))) for label, some in groupby(labels)]
    return " | ".join(label if n == 1 else f"{n} of {label}" for label, n in alike)


def climate_window(option: Option) -> str:
    """Coldest to hottest air temperature at which the option holds.

    ``any`` where nothing bounds it; ``?`` where a value that is to be confirmed would; whole degrees on the
    safe side.
    """
    low, high = holds_from(option), holds_to(option)
    return f"{'?' if low is None else whole(low, cold=True)} to {'?' if high is None else whole(high, cold=False)}"


def _confirm_lines(fit: Fit, options: Sequence[Option]) -> None:
    waiting = [o for o in options if o.confirm]
    if not waiting:
        return
    say()
    say("To confirm on the datasheets before ordering:")
    shared = _shared(fit, waiting)
    for line in shared:
        say(line, indent=2)
    own = "inverter" if fit.lists_inverters else "module"
    for o in waiting[:5]:
        words = [confirm_words(c) for c in o.confirm if c.record == own]
        if words:
            say(f"#{o.rank}  {own}: {'; '.join(words)}", indent=2)
    if len(waiting) > 5:
        say("(the document holds them for every option: --json)", indent=2)


def _notes_line(options: Sequence[Option]) -> None:
    """Say what is not on record of the checks that stop nothing, where the shown options leave any open."""
    fields = dict.fromkeys(
        field_words(replace(c.confirm, inputs=None))
        for o in options
        for c in o.checks
        if not c.stop and c.confirm is not None
    )
    if fields:
        say()
        say(f"Not on record, and no reason to stop: {'; '.join(fields)} (--checks shows what rests on it).")


def _amend_lines(fit: Fit, options: Sequence[Option]) -> None:
    """Print the commands that put the values on record which the first waiting option asks for."""
    waiting = next((o for o in options if o.confirm), None)
    if waiting is None:
        return
    say(f"What you have read goes on record by a command, here for #{waiting.rank}:")
    for command in _amend_commands(fit, waiting):
        # Not wrapped as text: it is there to be copied.
        print(f"  {command}")


def _amend_commands(fit: Fit, option: Option) -> list[str]:
    """Commands that enter what an option waits for, one per record."""
    records = {"module": fit.modules[option.module], "inverter": fit.inverters[option.inverter]}
    asked = {kind: [c for c in option.confirm if c.record == kind] for kind in records}
    return [amend_command(records[kind], *some) for kind, some in asked.items() if some]


def _shared(fit: Fit, waiting: Sequence[Option]) -> list[str]:
    """What the record that all options share is asked for: the largest value of each field."""
    other = "module" if fit.lists_inverters else "inverter"
    need: dict[str, Confirm] = {}
    for o in waiting:
        for c in o.confirm:
            if c.record == other and (c.field not in need or (c.at_least or 0) > (need[c.field].at_least or 0)):
                need[c.field] = c
    name = (fit.modules if other == "module" else fit.inverters)[0].name
    return [f"{name}: {confirm_words(c)} (for all of the above)" for c in need.values()]


def checks_table(fit: Fit, option: Option) -> None:
    """Print every check of one option."""
    say(f"Checks of #{option.rank}: {fit.modules[option.module].name}, {option.label} on"
        f" {fit.inverters[option.inverter].name}")  # fmt: skip
    columns = [Column("check"), Column("value", number=True), Column("limit", number=True), Column("unit"),
               Column("margin %", number=True), Column("verdict"), Column("rule", fold=True)]  # fmt: skip
    print_table(columns, [_check_row(c) for c in option.checks])


def _check_row(c: Check) -> list[str]:
    rule = c.rule + (f"; {c.remark}" if c.remark else "")
    if c.confirm is not None and c.confirm.at_least is not None:
        rule += f"; to confirm: at least {at_least(c.confirm):,.1f} {c.confirm.unit}"
    digits = 0 if c.unit == "W" or c.unit == "1" else 1
    unit = "" if c.unit == "1" else c.unit
    return [c.check, number(c.value, digits), number(c.limit, digits), unit, number(c.margin_pct, 1), str(c.verdict), rule]


def _why_table(fit: Fit, limit: int) -> None:
    missed = fit.rejections()
    if not missed:
        say("Every record considered has an option.")
        return
    records = fit.inverters if fit.lists_inverters else fit.modules
    say(f"Without option: {len(missed):,}; the nearest misses first.")
    columns = [Column("inverter" if fit.lists_inverters else "module", fold=True), Column("stopped by", fold=True),
               Column("nearest", fold=True)]  # fmt: skip
    print_table(columns, [[records[k].name, ", ".join(r.failed), r.nearest] for k, r in missed[:limit]])
