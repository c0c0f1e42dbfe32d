"""The result of a search as one self-contained page that opens anywhere, without network, and prints well."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import IO, TYPE_CHECKING, Any

from cli import facts
from cli.console import number
from cli.fit_screen import MOST, answer, power_header, question, wiring
from cli.fit_short import in_short
from cli.pages import ROWS, Cell, Column, check_row, end_cell, figure, typeset, write_page

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.checks import Confirm
    from matcher.fit import Fit, Option

#: Options whose values to confirm are listed ahead of the table.
CONFIRM_LISTED = 10

def write_report(fit: Fit, stream: IO[str], year: SiteYear, *, why: bool, said: Sequence[str] = ()) -> None:
    """Write the page; ``said`` are paragraphs that stand ahead of the options."""
    write_page("report.html.j2", stream, _content(fit, year, why, said))


def _content(fit: Fit, year: SiteYear, why: bool, said: Sequence[str]) -> dict[str, Any]:
    # Options may be gone through only once.
    options = list(fit.options(ROWS))
    total = facts.number_of_options(fit)
    columns = _columns(fit, year)
    best = options[0] if options else None
    confirm, confirm_more = _confirm(fit, options)
    rejected = _rejected(fit) if why or not options else []
    missed = int((~fit.found).sum())
    return {
        "question": question(fit),
        "answer": answer(fit, options),
        "order": f"Order: {fit.order}.",
        "said": [*said, *filter(None, [in_short(fit, options[:MOST])])],
        "best": best and _best(fit, best, year),
        "checks": [check_row(c) for c in best.checks] if best else [],
        "confirm": confirm,
        "confirm_more": confirm_more,
        "pictures": list(_pictures(fit, best)),
        "no_energy": "" if year.year is not None else f"No picture of energy and clipping: {year.why_not}.",
        "columns": columns,
        "rows": [{"verdict": str(o.verdict), "cells": _cells(fit, o, columns)} for o in options],
        "shown": _shown(len(options), total),
        "waits": any(facts.holds_from(o) is None or facts.holds_to(o) is None for o in options),
        "rejected": rejected,
        "rejected_words": f"{missed:,} without option; the nearest misses first"
        + (f", {len(rejected):,} of them listed." if len(rejected) < missed else "."),
        "side": "inverter" if fit.lists_inverters else "module",
        "rests_on": facts.rests_on(fit, year),
    }


def _shown(listed: int, total: int) -> str:
    if listed < total:
        return (
            f"The first {listed:,} of {total:,} options; a .csv or .xlsx file holds all of them, and a"
            " narrower DC/AC window or module count makes fewer."
        )
    return f"{total:,} option{'s' if total != 1 else ''}."


def _best(fit: Fit, o: Option, year: SiteYear) -> dict[str, Any]:
    shown = [("modules", f"{o.modules:,}"), ("DC/AC ratio", f"{o.dc_ac_ratio:.2f}")]
    if o.clipping_loss_pct is not None:
        shown.append(("clipped", f"{o.clipping_loss_pct:.2f} %"))
    if o.yearly_kwh is not None:
        shown.append((facts.year_words(year), f"{o.yearly_kwh:,.0f} kWh"))
    if o.cost is not None:
        shown.append(("modules and inverters cost", f"{o.cost:,.2f} {_currency(fit)}"))
    site = fit.request.site
    shown.append(("holds in air of", typeset(facts.climate_words(o, site.design_low_c, site.design_high_c))))
    margins = [c for c in o.checks if c.stop and c.margin_pct is not None and c.unit != "1"]
    if margins:
        tightest = min(margins, key=lambda c: c.margin_pct or 0.0)
        shown.append(("tightest check", f"{tightest.check}, {tightest.margin_pct:.1f} %"))
    return {
        "verdict": str(o.verdict), "label": wiring(o), "module": fit.modules[o.module].name,
        "inverter": fit.inverters[o.inverter].name, "units": o.units, "facts": shown,
    }  # fmt: skip


def _confirm(fit: Fit, options: Sequence[Option]) -> tuple[list[dict[str, str]], str]:
    """What to read on which datasheet, each record once: the largest value that its options ask for."""
    waiting = [o for o in options if o.confirm]
    asked: dict[tuple[str, int], dict[tuple[str, int | None], Confirm]] = {}
    ranks: dict[tuple[str, int], list[int]] = {}
    for o in waiting[:CONFIRM_LISTED]:
        for c in o.confirm:
            record = (c.record, o.module if c.record == "module" else o.inverter)
            values, value = asked.setdefault(record, {}), (c.field, c.inputs)
            if value not in values or (c.at_least or 0.0) > (values[value].at_least or 0.0):
                values[value] = c
            if o.rank not in ranks.setdefault(record, []):
                ranks[record].append(o.rank)
    shared = "module" if fit.lists_inverters else "inverter"
    found = []
    for (kind, k), values in sorted(asked.items(), key=lambda entry: entry[0][0] != shared):
        of = ranks[kind, k]
        found.append(
            {
                "who": f"{(fit.modules if kind == 'module' else fit.inverters)[k].name} ({kind})",
                "what": "; ".join(facts.confirm_words(c) for c in values.values()),
                "where": f"option {of[0]}"
                if len(of) == 1
                else f"the most that options {of[0]} to {of[-1]} need",
            }
        )
    more = len(waiting) - CONFIRM_LISTED
    return found, f"The table names them for {more:,} more options." if more > 0 else ""


def _pictures(fit: Fit, best: Option | None) -> Iterator[dict[str, str]]:
    from cli import pictures, series

    if best is not None:
        climate = pictures.draw_climate(series.string_in_climate(fit, best))
        yield figure(climate, f"{climate.words} Hatched: air temperatures at which it no longer holds.")
    if best is not None or fit.is_pair:
        m, i = (best.module, best.inverter) if best is not None else (0, 0)
        grid = series.wiring_grid(fit, m, i, best)
        framed = " Framed: option 1." if grid.chosen else ""
        on = f"Like strings of {fit.modules[m].name} on one {fit.inverters[i].name}."
        yield figure(pictures.draw_grid(grid), f"{on} {pictures.GRID_KEY}{framed}")
    energy = series.energy_by_count(fit, best) if best is not None else None
    if energy is not None:
        yield figure(pictures.draw_energy(energy), energy.words)


def _columns(fit: Fit, year: SiteYear) -> list[Column]:
    columns = [Column("#"), Column("verdict", "word")]
    if not fit.is_pair:
        side = "inverter" if fit.lists_inverters else "module"
        columns += [Column(side, "name title"), Column(power_header(fit))]
    if fit.request.several:
        columns.append(Column("units"))
    columns += [Column("wiring", "text"), Column("modules"), Column("DC/AC")]
    if year.year is not None:
        columns += [Column("clipped %"), Column("kWh a year")]
    if facts.is_in_stock(fit):
        columns.append(Column("in stock"))
    if _currency(fit):
        columns.append(Column(f"cost {_currency(fit)}"))
    return [*columns, Column("holds from °C"), Column("holds to °C"), Column("to confirm", "name")]


def _cells(fit: Fit, o: Option, columns: Sequence[Column]) -> list[Cell]:
    module, inverter = fit.modules[o.module], fit.inverters[o.inverter]
    known = {
        "#": Cell(str(o.rank), o.rank),
        "verdict": Cell(str(o.verdict)),
        "inverter": Cell(inverter.name),
        "module": Cell(module.name),
        power_header(fit): Cell(f"{inverter.ac_power_w / 1000:,.2f}", inverter.ac_power_w)
        if fit.lists_inverters
        else Cell(f"{module.pmax_w:.0f}", module.pmax_w),
        "units": Cell(str(o.units), o.units),
        "wiring": Cell(wiring(o)),
        "modules": Cell(f"{o.modules:,}", o.modules),
        "DC/AC": Cell(f"{o.dc_ac_ratio:.2f}", o.dc_ac_ratio),
        "clipped %": Cell(number(o.clipping_loss_pct, 2), o.clipping_loss_pct),
        "kWh a year": Cell(number(o.yearly_kwh), o.yearly_kwh),
        "in stock": Cell(number(pieces := facts.pieces_in_stock(fit, o)), pieces),
        f"cost {_currency(fit)}": Cell(number(o.cost, 2), o.cost),
        "holds from °C": end_cell(facts.holds_from(o), True, -999.0),
        "holds to °C": end_cell(facts.holds_to(o), False, 999.0),
        "to confirm": Cell(facts.confirm_short(o)),
    }
    return [known[c.header] for c in columns]


def _rejected(fit: Fit) -> list[dict[str, str]]:
    records = fit.inverters if fit.lists_inverters else fit.modules
    return [
        {"name": records[k].name, "failed": ", ".join(r.failed), "nearest": r.nearest}
        for k, r in fit.rejections()[:ROWS]
    ]


def _currency(fit: Fit) -> str:
    """Currency of the costs; empty where none are known."""
    return (fit.search.shelf.currency if fit.search.shelf else None) or ""
