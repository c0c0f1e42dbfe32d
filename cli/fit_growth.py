"""``fit --by-count``: how energy, clipping and worth of a pair run with the number of modules."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from cli.console import Column, number, print_table, say
from cli.documents import option_entry
from cli.fit_screen import wiring

if TYPE_CHECKING:
    from matcher.fit import Fit
    from matcher.growth import Step, Worth

#: Rows on screen; more steps are thinned out evenly, the document holds all.
_ROWS = 30


def show_growth(fit: Fit, worth: Worth | None) -> None:
    """Print the steps by rising module count, and where one more no longer pays."""
    from matcher.growth import growth, last_that_pays

    steps = growth(fit, worth)
    if not steps:
        return
    last = last_that_pays(steps)
    say(f"{fit.modules[0].name} on {fit.inverters[0].name}, the best wiring of each module count:")
    columns = [Column("mod.", number=True), Column("wiring", fold=True), Column("DC/AC", number=True),
               Column("clip %", number=True), Column("kWh/year", number=True), Column("added kWh", number=True)]  # fmt: skip
    if worth is not None:
        columns += [Column("worth/year", number=True), Column("added worth", number=True)]
        if worth.module_price is not None:
            columns += [Column(f"net over {worth.years:g} a", number=True), Column("")]
    every = -(-len(steps) // _ROWS)
    rows = []
    for k, s in enumerate(steps):
        if k % every and s is not last and k + 1 < len(steps):
            continue
        row = [str(s.option.modules), wiring(s.option), f"{s.option.dc_ac_ratio:.2f}",
               number(s.option.clipping_loss_pct, 2), number(s.option.yearly_kwh), number(s.added_kwh)]  # fmt: skip
        if worth is not None:
            row += [number(s.worth, 2), number(s.added_worth, 2)]
            if worth.module_price is not None:
                row += [number(s.net, 2), "most worth" if s is last else ""]
        rows.append(row)
    print_table(columns, rows)
    if every > 1:
        say(f"(every {every}. of {len(steps):,} counts; --json holds all)")
    if worth is not None and worth.module_price is not None:
        say(_conclusion(steps, last))
    say("Worth is the energy times the prices given; no tariff, tax, interest or ageing is assumed.")
    say()


def _conclusion(steps: list[Step], last: Step | None) -> str:
    """Where one more module no longer pays, or why that is not said."""
    if any(s.net is None for s in steps):
        return "Whether one more module pays cannot be said: the energy of some counts is not known."
    if last is None:
        return "No module count pays at these prices."
    if last is steps[-1]:
        return (
            f"Up to {last.option.modules} modules, the last count within the ratings and the DC/AC window, one more"
            " still pays at these prices."
        )
    return f"Beyond {last.option.modules} modules, one more no longer pays at these prices."


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
