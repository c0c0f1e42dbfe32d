"""``fit --by-count``: how energy, clipping and worth of a pair run with the number of modules."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from cli.console import Column, counted, number, page_lines, paragraph, table_lines
from cli.documents import option_entry
from cli.fit_screen import LEAST, answer, grounds_lines, joined, question, wiring

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.fit import Fit
    from matcher.growth import Step, Worth

#: Rows of the steps where they stand ahead of the options; more are thinned out evenly, the document holds all.
_ROWS = 30


def show_growth(fit: Fit, year: SiteYear, worth: Worth | None, before: Sequence[str] = ()) -> None:
    """Print how the pair grows, on a screen: the steps are the answer, the options are listed with ``--limit``.

    ``before`` are paragraphs that stand ahead of it.
    """
    head = [[line for text in before for line in paragraph(text)], paragraph(question(fit)), paragraph(answer(fit, list(fit.options(1))))]
    if not fit.totals.arrangements:
        (_, reason), *_ = fit.rejections()
        head.append(paragraph(f"Stopped by {', '.join(reason.failed)}: {reason.nearest}."))
    grounds = grounds_lines(fit, year)
    rows = _ROWS
    while True:
        lines = joined([*head, growth_lines(fit, worth, rows), grounds])
        if len(lines) <= page_lines() or rows <= LEAST:
            break
        rows = max(LEAST, rows - max(1, (len(lines) - page_lines()) // 2))
    print("\n".join(lines))


def growth_lines(fit: Fit, worth: Worth | None, most: int = _ROWS) -> list[str]:
    """The steps by rising module count, and where one more no longer pays."""
    from matcher.growth import growth, last_that_pays

    steps = growth(fit, worth)
    if not steps:
        return []
    last = last_that_pays(steps)
    verdicts = {s.option.verdict for s in steps}
    columns = [Column("mod.", number=True), Column("wiring", fold=True), Column("DC/AC", number=True),
               Column("clip %", number=True), Column("kWh/year", number=True), Column("added kWh", number=True)]  # fmt: skip
    if worth is not None:
        columns += [Column("worth/year", number=True), Column("added worth", number=True)]
        if worth.module_price is not None:
            columns += [Column(f"net over {worth.years:g} a", number=True)]
    columns += [Column("", fold=True)]
    every = -(-len(steps) // most)
    rows = []
    net: float | None = 0.0
    for k, s in enumerate(steps):
        net = None if net is None or s.net is None else net + s.net
        if k % every and s is not last and k + 1 < len(steps):
            continue
        row = [f"{s.option.modules:,}", wiring(s.option), f"{s.option.dc_ac_ratio:.2f}",
               number(s.option.clipping_loss_pct, 2), number(s.option.yearly_kwh), number(s.added_kwh)]  # fmt: skip
        if worth is not None:
            row += [number(s.worth, 2), number(s.added_worth, 2)]
            if worth.module_price is not None:
                row += [number(net, 2)]
        marks = ["most worth"] * (s is last) + ["to confirm"] * (len(verdicts) > 1 and bool(s.option.confirm))
        rows.append([*row, ", ".join(marks)])
    lines = ["The best wiring of each module count, by rising count:", *table_lines(columns, rows)]
    more = [f"one of every {every} of {len(steps):,} counts; --json holds all"] if every > 1 else []
    lines += paragraph(f"({'; '.join([*more, '--limit 20 lists the arrangements, --checks their checks'])})")
    if worth is not None and worth.module_price is not None:
        lines += paragraph(_conclusion(steps, last))
    if worth is not None:
        lines += paragraph("Worth is the energy times the prices given; no tariff, tax, interest or ageing is assumed.")
    return lines


def _conclusion(steps: list[Step], last: Step | None) -> str:
    """Where one more module no longer pays, or why that is not said."""
    if any(s.net is None for s in steps):
        return "Whether one more module pays cannot be said: the energy of some counts is not known."
    if last is None:
        return "No module count pays at these prices."
    if last is steps[-1]:
        return (
            f"Up to {counted(last.option.modules, 'module')}, the last count within the ratings and the DC/AC window, one more"
            " still pays at these prices."
        )
    return f"Beyond {counted(last.option.modules, 'module')}, one more no longer pays at these prices."


def add_growth(fit: Fit, worth: Worth | None) -> dict[str, Any]:
    """The steps as an entry of the document."""
    from matcher.growth import growth, last_that_pays

    steps = growth(fit, worth)
    last = last_that_pays(steps)
    return {
        "by_count": {
            "steps": [
                {
                    **option_entry(fit, s.option, with_checks=False),
                    "added_modules": s.added_modules,
                    "added_kwh": s.added_kwh,
                    "worth": s.worth,
                    "added_worth": s.added_worth,
                    "net": s.net,
                }
                for s in steps
            ],
            "most_worth_modules": None if last is None else last.option.modules,
        }
    }
