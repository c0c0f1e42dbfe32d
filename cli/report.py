"""The result of a search as one self-contained page that opens anywhere, without network, and prints well."""

from __future__ import annotations

import base64
import hashlib
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import date
from importlib.resources import files
from typing import IO, TYPE_CHECKING, Any

from cli import facts
from cli.cautions import CAUTIONS
from cli.console import number
from cli.fit_screen import answer, question, wiring

if TYPE_CHECKING:
    from cli.pictures import Picture
    from cli.years import SiteYear
    from matcher.checks import Check, Confirm
    from matcher.fit import Fit, Option

#: Rows of a table that a browser still sorts at once.
ROWS = 4_000

#: Rows of it that go to paper.
PRINTED = 100

#: Options whose values to confirm are listed ahead of the table.
CONFIRM_LISTED = 10

MARKS = {"fits": "\u25cf", "to-confirm": "\u25d0", "does-not-fit": "\u2715", "note": "\u25cb"}

#: What each check compares, for readers who do not know its name.
CHECK_WORDS = {
    "max-dc-voltage": "open-circuit voltage in the cold, against the inverter",
    "system-voltage": "open-circuit voltage in the cold, against the module",
    "voltage-cap": "open-circuit voltage in the cold, against the cap of the site",
    "mppt-low": "voltage at maximum power in the heat, against the bottom of the MPPT window",
    "mppt-high": "voltage at maximum power at 25 °C, against the top of the MPPT window",
    "start": "open-circuit voltage in the heat, against the start voltage",
    "short-circuit": "design short-circuit current of a tracker",
    "string-inputs": "strings on a tracker, against its inputs",
    "array-power": "array power, against what the inverter takes",
    "cold-tracking": "voltage at maximum power in the cold, against the top of the MPPT window",
    "input-current": "operating current of a tracker",
    "tracker-power": "power on a tracker",
    "string-fuse": "reverse current into a faulty string, against the module's series fuse",
}


@dataclass(frozen=True, slots=True)
class Column:
    """A column of the options' table; its kind is n (number), word (verdict), name or text."""

    header: str
    kind: str = "n"


@dataclass(frozen=True, slots=True)
class Cell:
    """Text of a cell, and the number it sorts by; ``None`` sorts by the text."""

    text: str
    key: float | None = None


def write_report(fit: Fit, stream: IO[str], year: SiteYear, *, why: bool) -> None:
    """Write the page."""
    from jinja2 import Environment, PackageLoader, StrictUndefined

    pages = Environment(
        loader=PackageLoader("cli"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    pages.get_template("report.html.j2").stream(_content(fit, year, why)).dump(stream)


def _content(fit: Fit, year: SiteYear, why: bool) -> dict[str, Any]:
    # Options may be gone through only once.
    options = list(fit.options(ROWS))
    total = facts.number_of_options(fit)
    columns = _columns(fit, year)
    script, style = (
        files("cli").joinpath(f"templates/report.{kind}").read_text("utf-8") for kind in ("js", "css")
    )
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    best = options[0] if options else None
    confirm, confirm_more = _confirm(fit, options)
    rejected = _rejected(fit) if why or not options else []
    missed = int((~fit.found).sum())
    return {
        "title": f"Ferrule: {question(fit)}",
        "made": f"{date.today():%d %B %Y}".lstrip("0"),
        "question": question(fit),
        "answer": answer(fit, options),
        "order": f"Order: {fit.order}.",
        "best": best and _best(fit, best),
        "checks": [_check(c) for c in best.checks] if best else [],
        "confirm": confirm,
        "confirm_more": confirm_more,
        "pictures": list(_pictures(fit, best)),
        "no_energy": "" if year.year is not None else f"No picture of energy and clipping: {year.why_not}.",
        "columns": columns,
        "rows": [{"verdict": str(o.verdict), "cells": _cells(fit, o, columns)} for o in options],
        "verdicts": sorted({str(o.verdict) for o in options}),
        "shown": _shown(len(options), total),
        "waits": any(facts.holds_from(o) is None or facts.holds_to(o) is None for o in options),
        "rejected": rejected,
        "rejected_words": f"{missed:,} without option; the nearest misses first"
        + (f", {len(rejected):,} of them listed." if len(rejected) < missed else "."),
        "side": "inverter" if fit.lists_inverters else "module",
        "rests_on": facts.rests_on(fit, year),
        "cautions": CAUTIONS,
        "marks": MARKS,
        "printed": PRINTED,
        "style": style.replace("{{ printed + 1 }}", str(PRINTED + 1)),
        "script": script,
        "script_hash": f"sha256-{digest}",
    }


def _shown(listed: int, total: int) -> str:
    if listed < total:
        return (
            f"The first {listed:,} of {total:,} options; a .csv or .xlsx file holds all of them, and a"
            " narrower DC/AC window or module count makes fewer."
        )
    return f"{total:,} option{'s' if total != 1 else ''}."


def _best(fit: Fit, o: Option) -> dict[str, Any]:
    shown = [("modules", f"{o.modules:,}"), ("DC/AC ratio", f"{o.dc_ac_ratio:.2f}")]
    if o.clipping_loss_pct is not None:
        shown.append(("clipped", f"{o.clipping_loss_pct:.2f} %"))
    if o.yearly_kwh is not None:
        shown.append(("a year", f"{o.yearly_kwh:,.0f} kWh"))
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


def _check(c: Check) -> dict[str, str]:
    digits = 0 if c.unit in ("W", "1") else 1
    unit = "" if c.unit == "1" else f" {c.unit}"
    limit = "not on record" if c.limit is None else number(c.limit, digits) + unit
    remarks = [c.rule, *([c.remark] if c.remark else [])]
    if c.confirm is not None:
        remarks.append(f"settled by a {facts.confirm_words(c.confirm)}")
    return {
        "words": CHECK_WORDS.get(c.check, c.check),
        "name": c.check,
        "verdict": str(c.verdict),
        "value": "" if c.value is None else number(c.value, digits) + unit,
        "limit": limit,
        "margin": "" if c.margin_pct is None else f"{c.margin_pct:.1f} %".replace("-", "\u2212"),
        "rule": "; ".join(remarks),
    }


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

    def shown(picture: Picture, caption: str) -> dict[str, str]:
        return {"svg": picture.svg, "title": picture.title, "caption": typeset(caption)}

    if best is not None:
        climate = pictures.draw_climate(series.string_in_climate(fit, best))
        yield shown(climate, f"{climate.words} Hatched: air temperatures at which it no longer holds.")
    if best is not None or fit.is_pair:
        m, i = (best.module, best.inverter) if best is not None else (0, 0)
        grid = series.wiring_grid(fit, m, i, best)
        framed = " Framed: option 1." if grid.chosen else ""
        on = f"Like strings of {fit.modules[m].name} on one {fit.inverters[i].name}."
        yield shown(pictures.draw_grid(grid), f"{on} {pictures.GRID_KEY}{framed}")
    energy = series.energy_by_count(fit, best) if best is not None else None
    if energy is not None:
        yield shown(pictures.draw_energy(energy), energy.words)


def typeset(text: str) -> str:
    """Numbers kept together with their units, and true minus signs."""
    text = re.sub(r"(?<=\d) (?=(?:%|°C|V|A|W|kWh)(?!\w))", "\u00a0", text)
    return re.sub(r"(?<![\w.])-(?=\d)", "\u2212", text)


def _columns(fit: Fit, year: SiteYear) -> list[Column]:
    columns = [Column("#"), Column("verdict", "word")]
    if not fit.is_pair:
        side = "inverter" if fit.lists_inverters else "module"
        columns += [Column(side, "name title"), Column("AC kW" if fit.lists_inverters else "W")]
    if fit.request.several:
        columns.append(Column("units"))
    columns += [Column("wiring", "text"), Column("modules"), Column("DC/AC")]
    if year.year is not None:
        columns += [Column("clipped %"), Column("kWh a year")]
    return [*columns, Column("holds from °C"), Column("holds to °C"), Column("to confirm", "name")]


def _cells(fit: Fit, o: Option, columns: Sequence[Column]) -> list[Cell]:
    module, inverter = fit.modules[o.module], fit.inverters[o.inverter]
    known = {
        "#": Cell(str(o.rank), o.rank),
        "verdict": Cell(str(o.verdict)),
        "inverter": Cell(inverter.name),
        "module": Cell(module.name),
        "AC kW": Cell(f"{inverter.ac_power_w / 1000:.2f}", inverter.ac_power_w),
        "W": Cell(f"{module.pmax_w:.0f}", module.pmax_w),
        "units": Cell(str(o.units), o.units),
        "wiring": Cell(wiring(o)),
        "modules": Cell(f"{o.modules:,}", o.modules),
        "DC/AC": Cell(f"{o.dc_ac_ratio:.2f}", o.dc_ac_ratio),
        "clipped %": Cell(number(o.clipping_loss_pct, 2), o.clipping_loss_pct),
        "kWh a year": Cell(number(o.yearly_kwh), o.yearly_kwh),
        "holds from °C": _end(facts.holds_from(o), True, -999.0),
        "holds to °C": _end(facts.holds_to(o), False, 999.0),
        "to confirm": Cell(facts.confirm_short(o)),
    }
    return [known[c.header] for c in columns]


def _end(value: float | str | None, cold: bool, beyond: float) -> Cell:
    """One end of the climate window; any temperature sorts beyond every number."""
    if value is None:
        return Cell("?")
    return Cell(value, beyond) if isinstance(value, str) else Cell(typeset(facts.whole(value, cold)), value)


def _rejected(fit: Fit) -> list[dict[str, str]]:
    records = fit.inverters if fit.lists_inverters else fit.modules
    return [
        {"name": records[k].name, "failed": ", ".join(r.failed), "nearest": r.nearest}
        for k, r in fit.rejections()[:ROWS]
    ]
