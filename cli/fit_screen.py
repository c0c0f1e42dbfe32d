"""The result of a search on the terminal: the question, the answer, the reasons, what to read, the cautions."""

from __future__ import annotations

import math
import sys
from collections.abc import Iterator, Sequence
from itertools import groupby
from typing import TYPE_CHECKING

from cli.cautions import CAUTIONS, HOURLY_MEANS
from cli.console import Column, counted, number, page_lines, paragraph, table_lines
from cli.facts import NO_LIMIT, assumptions, at_least, holds_from, holds_to, is_in_stock, number_of_options, whole
from cli.fit_confirm import amend_commands, confirm_lines, not_on_record
from cli.fit_short import in_short
from matcher.checks import Check, Verdict, face_mark

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.fit import Fit, Option
    from matcher.options import Unit
    from matcher.request import Request


def on_terminal() -> bool:
    """Whether stdout is a terminal."""
    return sys.stdout.isatty()


#: Options on screen where nobody says how many; the height of the screen bounds them further.
MOST = 20

#: Options that a short answer shows in any case, where there are so many.
LEAST = 8

#: A short answer that is too long leaves these away, one after the other.
_WHOLE, _NO_CHECKS, _RANGES, _TIGHT, _BARE = range(5)

#: Options that it shows where even then it is too long: names that take two lines.
_FEWEST = 3


def show(
    fit: Fit, year: SiteYear, *, limit: int | None, checks: bool, why: bool, before: Sequence[str] = (),
    aside: Sequence[str] = (), wanted_kwh: float | None = None,
) -> None:
    """Print the answer: no more than a screen of it, unless a number of options, checks or reasons are asked for.

    ``before`` are paragraphs that stand ahead of it, ``aside`` those of them that a tight screen does without; options are held against ``wanted_kwh`` a year.
    """
    options = list(fit.options(limit or MOST))
    reasons = (limit or MOST) if why else 0
    shown, level = len(options), _WHOLE
    lines = _page(fit, year, options, shown, level, (*before, *aside), checks, reasons, wanted_kwh)
    if limit is None and not checks and not why:
        room = page_lines()
        while len(lines) > room and (shown > _FEWEST or level < _BARE):
            least = LEAST if shown > LEAST or level < _BARE else _FEWEST
            if shown > least:
                shown = max(least, shown - max(1, (len(lines) - room) // 2))
            else:
                shown, level = len(options), level + 1
            ahead = before if level >= _TIGHT else (*before, *aside)
            lines = _page(fit, year, options, shown, level, ahead, checks, reasons, wanted_kwh)
    print("\n".join(lines))


def _page(
    fit: Fit, year: SiteYear, options: Sequence[Option], number: int, level: int, before: Sequence[str],
    checks: bool, reasons: int, wanted_kwh: float | None,
) -> list[str]:  # fmt: skip
    """The lines of the answer with so many of the options, and so many of the records without one."""
    shown = options[:number]
    blocks = [[line for text in before for line in paragraph(text)], paragraph(question(fit))]
    if shown:
        blocks += options_blocks(fit, year, shown, level, wanted_kwh)
        blocks.append(paragraph(in_short(fit, options, brief=level >= _TIGHT)))
    elif fit.is_pair:
        (_, reason), *_ = fit.rejections()
        stopped = f"Stopped by {', '.join(reason.failed)}: {reason.nearest}."
        blocks.append([*paragraph(answer(fit, ())), *paragraph(stopped)])
    else:
        said = [answer(fit, ()), *([] if reasons else nothing_fits(fit))]
        blocks.append([line for text in said for line in paragraph(text)])
    if checks:
        blocks += [checks_lines(fit, o) for o in shown]
    elif fit.is_pair and shown:
        blocks.append(checks_lines(fit, shown[0]) if level < _NO_CHECKS else paragraph(checks_in_short(shown[0])))
    if reasons and not fit.is_pair:
        blocks.append(_why_lines(fit, reasons))
    blocks.append(grounds_lines(fit, year))
    return joined(blocks, blank=level < _TIGHT)


def options_blocks(
    fit: Fit, year: SiteYear, options: Sequence[Option], level: int = 0, wanted_kwh: float | None = None
) -> list[list[str]]:
    """Answer and order, the options as a table for each verdict, and what to confirm of them."""
    order = fit.order.rpartition("; ties")[0] if level >= _TIGHT else fit.order
    tables = list(_options_tables(fit, options, year.year is not None, wanted_kwh))
    if wanted_kwh is not None:
        sky = ", in a year without clouds" if year.clear_sky else ""
        tables[-1] += paragraph(f"reaches %: of the {wanted_kwh:,.0f} kWh wanted{sky}; less than 100 falls short.")
    tables[-1] += _see_more(fit, len(options))
    # What waits for values is said twice more: above the table, and in short.
    head = [*paragraph(answer(fit, () if level >= _TIGHT else options)), *paragraph(f"Order: {order}.")]
    return [head, *tables, *_confirm_blocks(fit, options, level)]


def joined(blocks: Sequence[Sequence[str]], blank: bool = True) -> list[str]:
    """Blocks of lines one below the other, with an empty line between them or without."""
    lines: list[str] = []
    for block in blocks:
        if any(block):
            lines += [""] * (blank and bool(lines)) + list(block)
    return lines


def _see_more(fit: Fit, shown: int) -> list[str]:
    """How to see what is not shown."""
    total = number_of_options(fit)
    more = total - shown
    if more <= 0:
        return []
    ways = [f"--limit {min(total, 50 if shown < 50 else 10 * shown)}", *([] if fit.request.every else ["--every"]), "--checks"]
    return paragraph(f"... and {more:,} more ({', '.join(ways)} show more; --out FILE.csv holds all of them).")


def _confirm_blocks(fit: Fit, options: Sequence[Option], level: int) -> list[list[str]]:
    """What to confirm of the options, what else is not on record, and how to put it there."""
    waiting = next((o for o in options if o.confirm), None)
    confirm: list[str] = []
    if waiting is not None:
        texts = confirm_lines(fit, options, brief=level >= _RANGES)
        each = "" if not any(" to " in text for text in texts) else " (--checks says what each needs)"
        record = f", and the command that puts what #{waiting.rank} needs on record" * (level == _TIGHT)
        confirm = paragraph(f"To confirm on the datasheets before ordering{each}{record}:")
        confirm += [line for text in texts for line in paragraph(text, indent=2)]
    blocks, notes = [confirm], not_on_record(options)
    if notes and level < _NO_CHECKS:
        blocks.append(paragraph(notes))
    if waiting is not None and level < _BARE:
        blocks[-1] += [] if level == _TIGHT else [f"What you have read goes on record by a command, here for #{waiting.rank}:"]
        # Not wrapped as text: it is there to be copied.
        blocks[-1] += [line for command in amend_commands(fit, waiting) for line in f"  {command}".splitlines()]
    return blocks


def grounds_lines(fit: Fit, year: SiteYear) -> list[str]:
    """What the answer rests on, and the cautions."""
    grounds = list(year.notes or (f"No clipping figure: {year.why_not}.",))
    if year.year is not None and year.year.shows_clipping:
        grounds.append(HOURLY_MEANS)
    return paragraph(" ".join([*grounds, *assumptions(fit)])) + paragraph(" ".join(CAUTIONS))


def nothing_fits(fit: Fit) -> list[str]:
    """Why nothing fits, as far as it can be said at once."""
    said = []
    if fit.request.counts is not None:
        said.append(_counts_that_go(fit))
    elif int((~fit.found).sum()) <= _REASONS_AT_ONCE:
        (k, reason), *_ = fit.rejections()
        name = (fit.inverters if fit.lists_inverters else fit.modules)[k].name
        stopped = f", stopped by {', '.join(reason.failed)}" if reason.failed else ""
        said.append(f"The nearest is {name}{stopped}: {reason.nearest}.")
    return [*said, "--why says what stops each of them, and what would change that."]


#: Records whose reasons are gone through without being asked for.
_REASONS_AT_ONCE = 100


def _counts_that_go(fit: Fit) -> str:
    """The module counts next to the asked ones that some record takes."""
    from matcher.nearest_counts import nearest_counts

    low, high = fit.request.ratio
    window = f"inside the DC/AC ratios of {low:.2f} to {high:.2f}"
    smaller, larger = nearest_counts(fit)
    if smaller is None and larger is None:
        return f"No module count at all goes {window}."
    words = []
    for found, what in ((smaller, "the most below"), (larger, "the fewest above")):
        if found is not None:
            name = (fit.inverters if fit.lists_inverters else fit.modules)[
                found.inverter if fit.lists_inverters else found.module
            ].name
            units = f"{found.units:,} x " if found.units > 1 else ""
            words.append(f"{counted(found.modules, 'module')} ({what}; {units}{name})")
    if larger is None:
        words[0] = words[0].replace("the most below", "the most that any takes")
    if smaller is None:
        words[0] = words[0].replace("the fewest above", "the fewest that any takes")
    return f"What goes {window}: {' and '.join(words)}."


def question(fit: Fit) -> str:
    """What was asked, as a sentence."""
    r = fit.request
    where = f"{r.site.design_low_c:g} to {r.site.design_high_c:g} degC, {r.site.mounting}"
    if r.site.name != "as given":
        where = f"{r.site.name} ({where})"
    stocked = " in stock" if is_in_stock(fit) else ""
    if fit.is_pair:
        asked = f"How can {fit.modules[0].name} be wired to {fit.inverters[0].name}"
    elif fit.lists_inverters:
        asked = f"Which inverters{stocked} take {fit.modules[0].name}"
    else:
        asked = f"Which modules{stocked} can be wired to {fit.inverters[0].name}"
    low, high = r.ratio
    count = ""
    if r.counts is not None:
        count = f", {_span(r.counts)} module{'s' if r.counts != (1, 1) else ''}"
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
    return f"{counts[0]:,}" if counts[0] == counts[1] else f"{counts[0]:,} to {counts[1]:,}"


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


def _options_tables(
    fit: Fit, options: Sequence[Option], has_year: bool, wanted_kwh: float | None
) -> Iterator[list[str]]:
    """One table per verdict, which is why the verdict needs no column."""
    for _, alike in groupby(options, key=lambda o: o.verdict):
        some = list(alike)
        yield [*paragraph(_HEADINGS[some[0].verdict]), *_options_table(fit, some, has_year, wanted_kwh)]


_HEADINGS = {
    Verdict.FITS: "fits: every check that can stop it holds by the ratings on record",
    Verdict.TO_CONFIRM: "to-confirm: nothing on record speaks against it, but a safety rating is not on record",
}


def _options_table(fit: Fit, options: Sequence[Option], has_year: bool, wanted_kwh: float | None) -> list[str]:
    shelf = fit.search.shelf
    columns = [Column("#", number=True)]
    if not fit.is_pair:
        name_width = 30 if shelf is None else 22  # a column of costs needs the room
        columns += [Column("inverter" if fit.lists_inverters else "module", fold=True, min_width=name_width)]
        columns += [Column(power_header(fit), number=True)]
    columns += [Column("wiring", fold=True), Column("mod.", number=True), Column("DC/AC", number=True)]
    if has_year:
        columns += [Column("clip %", number=True), Column("kWh/year", number=True)]
    if wanted_kwh is not None:
        columns += [Column("reaches %", number=True)]
    if shelf is not None and shelf.currency is not None:
        columns += [Column(f"cost {shelf.currency}", number=True)]
    columns += [Column("holds at degC", number=True)]
    rows = []
    for o in options:
        row = [str(o.rank)]
        if not fit.is_pair:
            row += _listed(fit, o)
        # A line may end behind a unit's strings, not between a number and its unit.
        row += [wiring(o).replace(" unit", "\u00a0unit"), f"{o.modules:,}", f"{o.dc_ac_ratio:.2f}"]
        if has_year:
            row += [number(o.clipping_loss_pct, 2), number(o.yearly_kwh)]
        if wanted_kwh is not None:
            row += ["" if o.yearly_kwh is None else f"{math.floor(o.yearly_kwh / wanted_kwh * 100.0 + 1e-6):,}"]
        if shelf is not None and shelf.currency is not None:
            row += [number(o.cost)]
        rows.append([*row, climate_window(o)])
    return table_lines(columns, rows)


def power_header(fit: Fit) -> str:
    """Header of the power of the listed records."""
    if not fit.lists_inverters:
        return "W"
    return "AC kW each" if fit.request.several else "AC kW"


def _listed(fit: Fit, option: Option) -> list[str]:
    if fit.lists_inverters:
        inverter = fit.inverters[option.inverter]
        return [inverter.name, f"{inverter.ac_power_w / 1000:,.2f}"]
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

    "no limit" where nothing bounds it; ``?`` where a value that is to be confirmed would; whole degrees on the
    safe side.
    """
    low, high = holds_from(option), holds_to(option)
    if low == high == NO_LIMIT:
        return NO_LIMIT
    return f"{'?' if low is None else whole(low, cold=True)} to {'?' if high is None else whole(high, cold=False)}"


def checks_lines(fit: Fit, option: Option) -> list[str]:
    """Every check of one option as a table, below the option's name and what it costs."""
    cost = "" if option.cost is None or fit.search.shelf is None else f", {option.cost:,.0f} {fit.search.shelf.currency}"
    title = (
        f"Checks of #{option.rank}: {fit.modules[option.module].name}, {wiring(option)} on"
        f" {fit.inverters[option.inverter].name}{cost}"
    )
    columns = [Column("check"), Column("value", number=True), Column("limit", number=True), Column("unit"),
               Column("margin %", number=True), Column("verdict"), Column("rule", fold=True)]  # fmt: skip
    return [*paragraph(title), *table_lines(columns, [_check_row(c) for c in option.checks])]


def checks_in_short(option: Option) -> str:
    """The checks of one option as a sentence: the one that is nearest to its limit."""
    stops = [c for c in option.checks if c.stop and c.margin_pct is not None and c.unit != "1"]
    if not stops:
        return ""
    c = min(stops, key=lambda c: c.margin_pct or 0.0)
    value, limit, unit = _check_row(c)[1:4]
    return f"#{option.rank} is nearest to its limit in {c.check}: {value} of {limit} {unit} ({c.margin_pct:.1f} % left); --checks shows all."


def _check_row(c: Check) -> list[str]:
    rule = c.rule + (f"; {c.remark}" if c.remark else "")
    if c.confirm is not None and c.confirm.at_least is not None:
        rule += f"; to confirm: at least {at_least(c.confirm):,.1f} {c.confirm.unit}"
    digits = 0 if c.unit == "W" or c.unit == "1" else 1
    unit = "" if c.unit == "1" else c.unit
    return [c.check, number(c.value, digits), number(c.limit, digits), unit, number(c.margin_pct, 1), str(c.verdict), rule]


def _why_lines(fit: Fit, limit: int) -> list[str]:
    missed = fit.rejections()
    if not missed:
        return ["Every record considered has an option."]
    records = fit.inverters if fit.lists_inverters else fit.modules
    columns = [Column("inverter" if fit.lists_inverters else "module", fold=True), Column("stopped by", fold=True),
               Column("nearest", fold=True)]  # fmt: skip
    rows = [[records[k].name, ", ".join(r.failed), r.nearest] for k, r in missed[:limit]]
    first = f", {limit:,} of them shown (--limit)" if limit < len(missed) else ""
    return [f"Without option: {len(missed):,}{first}; the nearest misses first.", *table_lines(columns, rows)]
