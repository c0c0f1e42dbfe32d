"""Vetted bundles as a self-contained page: one with its reasons, or a list to sort and filter."""

from __future__ import annotations

import os
from collections.abc import Sequence
from typing import IO, TYPE_CHECKING, Any

from cli import facts
from cli.console import counted, number
from cli.fit_screen import climate_window
from cli.pages import ROWS, Cell, Column, check_row, figure, typeset, write_page
from cli.vet_files import SOUND, rule_words
from cli.vet_screen import ATTENTION, question_words, sentence, summary, year_lines, year_words
from cli.vet_words import assumed, cause, mend_words, place_words, window_short, window_words
from matcher.options import label

if TYPE_CHECKING:
    from cli.vet_lists import Line, VettedList
    from cli.years import SiteYear
    from matcher.fit import Fit
    from matcher.rules import RuleSet
    from matcher.vet import Vetted


def write_bundle(vetted: Vetted, fit: Fit, year: SiteYear | None, stream: IO[str]) -> None:
    """Write one bundle; ``fit`` is the module at the site that it was judged at."""
    v, o = vetted, vetted.option
    wired = label(v.wired) if v.wired else ""
    content: dict[str, Any] = {
        "question": typeset(question_words(v)),
        "answer": typeset(_answer(v)),
        "heading": "Arrangement" if o is not None else "Nearest arrangement" if wired else "Bundle",
        "outcome": v.verdict,
        "label": wired,
        "what": f"of {v.bundle.module.name} on {counted(v.bundle.units, 'unit')} of {v.inverter.name}",
        "named": _facts(v, year),
        "remarks": [f"Note: {r}." for r in v.remarks],
        "mends": None if o is not None or v.verdict == "no-verdict" else [
            {"verdict": m.verdict, "words": mend_words(m, v)} for m in v.mends
        ],
        "confirm": [
            {"who": f"{v.bundle.module.name if c.record == 'module' else v.inverter.name} ({c.record})",
             "what": typeset(facts.confirm_words(c)), "where": ""} for c in (o.confirm if o is not None else ())
        ],
        "checks": [check_row(c) for c in v.checks],
        "checks_of": typeset(
            f"Every check of {wired} at {v.site.design_low_c:g} and {v.site.design_high_c:g} °C, with the distance to its limit"
        ),
        "pictures": _pictures(v, fit),
        "rests_on": _rests_on(v, fit, year),
    }  # fmt: skip
    write_page("vet.html.j2", stream, content)


def _answer(v: Vetted) -> str:
    if v.verdict == "no-verdict":
        return f"No verdict: {v.reason}."
    if v.option is None:
        elsewhere = f" Elsewhere: {window_words(v.window)}." if v.window is not None and not v.window.by_hours else ""
        return f"It does not fit, {cause(v.failed)}: {v.reason}.{elsewhere}"
    fits = "It fits" if v.verdict == "fits" else "Nothing on record speaks against it, and something is to be confirmed"
    return f"{fits}. {sentence(window_words(v.window))}"


def _facts(v: Vetted, year: SiteYear | None) -> list[tuple[str, str]]:
    o = v.option
    if o is None:
        return []
    shown = [("modules", f"{o.modules:,}"), ("DC/AC ratio", f"{o.dc_ac_ratio:.2f}")]
    if o.clipping_loss_pct is not None:
        shown.append(("clipped", f"{o.clipping_loss_pct:.2f} %"))
    if o.yearly_kwh is not None:
        shown.append((facts.year_words(year), f"{o.yearly_kwh:,.0f} kWh"))
    shown.append(("holds in air of", typeset(facts.climate_words(o, v.site.design_low_c, v.site.design_high_c))))
    margins = [c for c in v.checks if c.stop and c.margin_pct is not None and c.unit != "1"]
    if margins:
        tightest = min(margins, key=lambda c: c.margin_pct or 0.0)
        shown.append(("tightest check", f"{tightest.check}, {tightest.margin_pct:.1f} %"))
    return shown


def _pictures(v: Vetted, fit: Fit) -> list[dict[str, str]]:
    if not v.wired:
        return []
    from cli import pictures, series
    from matcher.checks import Verdict
    from matcher.fit import Option

    option = v.option
    if option is None:
        lengths = [t.in_series for unit in v.wired for t in unit.trackers]
        window = fit.window(0)
        option = Option(
            1, Verdict.DOES_NOT_FIT, 0, v.bundle.inverter, v.bundle.modules, v.wired, 0.0, None, None, None, v.checks,
            (), window.coldest(v.inverter, max(lengths)), window.hottest(v.inverter, min(lengths)),
            cold_by_hours=fit.request.rules.cold_voltage == "hourly",
        )  # fmt: skip
    climate = pictures.draw_climate(series.string_in_climate(fit, option))
    return [figure(climate, f"{climate.words} Hatched: air temperatures at which it no longer holds.")]


def _rests_on(v: Vetted, fit: Fit, year: SiteYear | None) -> list[str]:
    rules = fit.request.rules
    lines = [f"Rule set {rule_words(rules)}", SOUND]
    if v.solved:
        lines.insert(0, "No site was given: the climate is solved for, and the checks stand at its edges (-40 to 50 °C at most).")
    if year is not None:
        lines += year_lines(year)
    return [typeset(line) for line in [*lines, *assumed(v)]]


def write_list(vetted: VettedList, rules: RuleSet, name: str, stream: IO[str]) -> None:
    """Write a list, what wants attention first where not all rows can be held by a page."""
    lines, total = list(vetted.lines), len(vetted.lines)
    if total > ROWS:
        kept = sorted(range(total), key=lambda k: ATTENTION[lines[k].verdict])[:ROWS]
        lines = [lines[k] for k in sorted(kept)]
    columns = _columns(vetted.lines)
    shown = f"{counted(total, 'bundle')}."
    if total > ROWS:
        shown = f"{ROWS:,} of {total:,} bundles, those that want attention first; a .csv or .xlsx file holds all of them."
    write_page("list.html.j2", stream, {
        "question": f"Are the bundles of {os.path.basename(name)} sound?",
        "answer": summary(vetted.lines),
        "first": None, "order": "", "confirm": [], "checks": [], "checks_of": "",
        "title_of_rows": "Bundles", "things": "bundles",
        "columns": columns,
        "rows": [{"verdict": line.verdict, "cells": _cells(line, columns)} for line in lines],
        "shown": shown,
        "key": "? in the temperatures: a value to confirm bounds them. For a bundle that does not fit, they tell where it would.",
        "rests_on": [typeset(line) for line in (
            *place_words(vetted.lines), *year_words(vetted), f"Rule set {rule_words(rules)}", SOUND,
        )],
    })  # fmt: skip


def _columns(lines: Sequence[Line]) -> list[Column]:
    columns = [Column("row"), Column("verdict", "word")]
    if any(line.row.article for line in lines):
        columns.append(Column("article", "text title"))
    columns.append(Column("bundle", "name"))
    if any(line.row.site for line in lines):
        columns.append(Column("site", "text"))
    columns += [Column("wiring", "text"), Column("DC/AC")]
    options = [line.vetted.option for line in lines if line.vetted is not None and line.vetted.option is not None]
    if any(o.yearly_kwh is not None for o in options):
        columns += [Column("clipped %"), Column("kWh a year")]
    return [*columns, Column("holds at °C", "text"), Column("reasons, and what to do", "name")]


def _cells(line: Line, columns: Sequence[Column]) -> list[Cell]:
    row, v = line.row, line.vetted
    o = v.option if v is not None else None
    what = f"{row.modules} {row.module} on {row.units or 1} {row.inverter}"
    if v is not None:
        what = f"{v.bundle.modules:,} {v.bundle.module.name} on {v.bundle.units:,} {v.inverter.name}"
    known = {
        "row": Cell(f"{row.number:,}", row.number),
        "verdict": Cell(line.verdict),
        "article": Cell(row.article),
        "bundle": Cell(what),
        "site": Cell(row.site),
        "wiring": Cell(""),
        "DC/AC": Cell(""),
        "clipped %": Cell(""),
        "kWh a year": Cell(""),
        "holds at °C": _holds(v),
        "reasons, and what to do": Cell(typeset(_what_to_do(line))),
    }
    if o is not None:
        known |= {
            "wiring": Cell(o.label),
            "DC/AC": Cell(f"{o.dc_ac_ratio:.2f}", o.dc_ac_ratio),
            "clipped %": Cell(number(o.clipping_loss_pct, 2), o.clipping_loss_pct),
            "kWh a year": Cell(number(o.yearly_kwh), o.yearly_kwh),
        }
    return [known[c.header] for c in columns]


def _holds(v: Vetted | None) -> Cell:
    """The climate window, which sorts by its cold end."""
    if v is None or v.verdict == "no-verdict":
        return Cell("")
    if v.option is not None:
        cold = facts.holds_from(v.option)
        return Cell(typeset(climate_window(v.option)), cold if isinstance(cold, float) else _BEYOND)
    cold = None if v.window is None else v.window.coldest_c
    return Cell(typeset(window_short(v.window)), 999.0 if v.window is None else _BEYOND if cold is None else cold)


#: Sorts before every temperature.
_BEYOND = -999.0


def _what_to_do(line: Line) -> str:
    v = line.vetted
    if v is None:
        return line.reason
    if v.option is not None:
        ask = facts.confirm_short(v.option)
        return "; ".join([f"to confirm: {ask}"] * bool(ask) + list(line.remarks))
    read_as = "".join(f"; {words}" for words in line.read_as)
    if not v.failed:
        return v.reason + read_as
    mends = f"; what would mend it: {mend_words(v.mends[0], v)}" if v.mends else "; no single change mends it"
    return f"{cause(v.failed)}: {v.reason}{mends}{read_as}"
