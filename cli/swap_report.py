"""What takes the place of a record as a self-contained page: candidates to sort and filter, with what changes."""

from __future__ import annotations

from typing import IO, TYPE_CHECKING, Any

from cli import facts
from cli.cautions import HOURLY_MEANS
from cli.console import counted, number
from cli.pages import ROWS, Cell, Column, check_row, end_cell, typeset, write_page
from cli.swap_words import PART_WORDS, answer, offer, offer_words, order, part_notes, question_words, signed
from cli.vet_files import rule_words
from matcher.options import label

if TYPE_CHECKING:
    from cli.swap import Full, Question
    from matcher.fit import Option

#: What changes, by its name in the result: header of the column.
_CHANGES = {
    "power": "power %", "vmp": "Vmp %", "voc": "Voc %", "imp": "Imp %", "isc": "Isc %",
    "mppt_low": "MPPT low %", "mppt_high": "MPPT high %",
}  # fmt: skip


def write_page_of(question: Question, full: Full, stream: IO[str]) -> None:
    """Write the page: the first candidates in full, and what changes with each."""
    q, total = question, len(question.swaps)
    columns, rows = _part(q) if q.part is not None else _whole(q, full)
    fit, best = full[0] if full else (None, None)
    shown = f"{counted(total, 'candidate')}."
    if total > len(rows):
        shown = f"The first {len(rows):,} of {total:,} candidates; a .csv or .xlsx file holds all of them."
    key = []
    if q.part is None and total > len(full):
        key.append(f"Clipping, temperatures and values to confirm are told of the first {len(full):,}.")
    if any(facts.holds_from(o) is None or facts.holds_to(o) is None for _, o in full):
        key.append("? in the temperatures: a value to confirm bounds them.")
    kind = "inverter" if q.replaces_inverter else "module"
    write_page("list.html.j2", stream, {
        "question": typeset(question_words(q)),
        "answer": typeset(answer(q)),
        "first": {"heading": "What stays, and what is replaced", "verdict": "", "name": "", "facts": _old(q)},
        "order": f"Order: {order(q)}.",
        "confirm": [] if best is None or fit is None else [
            {"who": f"{(fit.modules if c.record == 'module' else fit.inverters)[0].name} ({c.record})",
             "what": typeset(facts.confirm_words(c)), "where": "candidate 1"} for c in best.confirm
        ],
        "checks": [check_row(c) for c in best.checks] if best is not None else [],
        "checks_of": f"Every check of candidate 1, {fit and getattr(fit, kind + 's')[0].name}, with the distance to its limit",
        "title_of_rows": "Candidates", "things": "candidates", "columns": columns, "rows": rows,
        "shown": shown, "key": " ".join(key),
        "rests_on": [typeset(line) for line in _rests_on(q)],
    })  # fmt: skip


def _old(q: Question) -> list[tuple[str, str]]:
    m, i, o = q.module, q.inverter, q.vetted.option
    shown = [("wiring", label(q.wired)), ("module", f"{m.name}, {m.pmax_w:,.0f} W"),
             ("inverter", f"{i.name}, {i.ac_power_w / 1000:,.2f} kW AC")]  # fmt: skip
    if o is None:
        return shown
    shown.append(("DC/AC ratio", f"{o.dc_ac_ratio:.2f}"))
    if o.clipping_loss_pct is not None:
        shown.append(("clipped", f"{o.clipping_loss_pct:.2f} %"))
    holds = facts.climate_words(o, q.site.design_low_c, q.site.design_high_c)
    return [*shown, ("holds in air of", typeset(holds))]


def _whole(q: Question, full: Full) -> tuple[list[Column], list[dict[str, Any]]]:
    swaps, inverters = q.swaps, q.replaces_inverter
    sizes = not inverters and q.module.length_m is not None and q.module.width_m is not None
    clips = any(o.clipping_loss_pct is not None for _, o in full)
    columns = [
        Column("#"), Column("verdict", "word"), Column("inverter" if inverters else "module", "name title"),
        Column("AC kW" if inverters else "W"), *(Column(_CHANGES[name]) for name in swaps.changes),
        *([Column("size mm")] if sizes else []), *([Column("wiring", "text")] if inverters else []),
        Column("DC/AC"), *([Column("clipped %")] if clips else []), Column("holds from °C"), Column("holds to °C"),
        Column("to confirm", "name"), *_stock_column(q),
    ]  # fmt: skip
    rows = []
    for k in range(min(len(swaps), ROWS)):
        record = q.records[swaps.index[k]]
        outcome = "to-confirm" if swaps.to_confirm[k] else "fits"
        o = full[k][1] if k < len(full) else None
        power = record.ac_power_w if inverters else record.pmax_w
        cells = [Cell(str(k + 1), k + 1), Cell(outcome), Cell(record.name),
                 Cell(f"{power / 1000:.2f}" if inverters else f"{power:.0f}", power)]  # fmt: skip
        cells += [_change(float(v[k]), 1) for v in swaps.changes.values()]
        cells += [_size(swaps.size_mm[k].tolist())] if sizes else []
        cells += [Cell(label(swaps.wired[k]))] if inverters else []
        cells.append(Cell(f"{swaps.ratio[k]:.2f}{' !' * bool(swaps.odd[k])}", float(swaps.ratio[k])))
        cells += [_clipped(o)] if clips else []
        cells += [Cell(""), Cell(""), Cell("")] if o is None else [
            end_cell(facts.holds_from(o), True, -999.0), end_cell(facts.holds_to(o), False, 999.0),
            Cell(facts.confirm_short(o)),
        ]  # fmt: skip
        rows.append({"verdict": outcome, "cells": cells + _stock_cell(q, record)})
    return columns, rows


def _part(q: Question) -> tuple[list[Column], list[dict[str, Any]]]:
    columns = [
        Column("#"), Column("verdict", "word"), Column("module", "name title"), Column("W"), Column("wiring", "text"),
        Column("loss at STC %"), Column("loss in the heat %"), Column("loss if spread %"), Column("to confirm", "name"),
        *_stock_column(q),
    ]  # fmt: skip
    rows = []
    for k, c in enumerate(q.swaps.found[:ROWS]):
        record = q.records[c.index]
        losses = [None if m is None else m.loss_pct for m in (c.stc, c.hot, c.spread_stc)]
        marks = (" !" * c.idle, "", "")
        cells = [
            Cell(str(k + 1), k + 1), Cell(c.verdict), Cell(record.name), Cell(f"{record.pmax_w:.0f}", record.pmax_w),
            Cell(" | ".join(t.label for t in c.trackers)), *(
                Cell("?" if v is None else number(v, 2) + mark, v) for v, mark in zip(losses, marks, strict=True)
            ),
            Cell("; ".join(f"{x.record}: {facts.confirm_words(x)}" for x in c.confirm)),
        ]  # fmt: skip
        rows.append({"verdict": c.verdict, "cells": cells + _stock_cell(q, record)})
    return columns, rows


def _stock_column(q: Question) -> list[Column]:
    return [] if q.stock is None else [Column("in stock, price each", "text")]


def _stock_cell(q: Question, record: Any) -> list[Cell]:
    """Pieces and price; sorts by the pieces."""
    found = offer(q, record)
    return [] if found is None else [Cell(offer_words(q, record), found[0])]


def _change(value: float, digits: int) -> Cell:
    return Cell("") if value != value else Cell(typeset(signed(value, digits)), value)


def _size(changes: list[float]) -> Cell:
    """Changes of length and width; sorts by the larger one."""
    if any(v != v for v in changes):
        return Cell("")
    return Cell(typeset("x".join(signed(v, 0) for v in changes)), max(map(abs, changes)))


def _clipped(o: Option | None) -> Cell:
    return Cell("") if o is None else Cell(number(o.clipping_loss_pct, 2), o.clipping_loss_pct)


def _rests_on(q: Question) -> list[str]:
    year = q.old_year
    lines = [f"Rule set {rule_words(q.rules)}"]
    if q.vetted.solved:
        lines.append(
            "No site was given: a candidate holds wherever the array itself holds, from"
            f" {q.site.design_low_c:g} to {q.site.design_high_c:g} °C (-40 to 50 °C at most)."
        )
    if q.combiner:
        lines.append("Strings are paralleled in a combiner box: the inverter's string inputs are waived.")
    if q.part is not None:
        lines += [PART_WORDS, *part_notes(q, ROWS)]
    elif year is not None:
        lines += year.notes or (f"No clipping figure: {year.why_not}.",)
        lines += [HOURLY_MEANS] * (year.year is not None)
    return lines
