"""The fit document, `ferrule.fit/1`, as a dict and as a stream."""

from __future__ import annotations

import json
import sys
from collections.abc import Iterator, Mapping
from contextlib import nullcontext
from typing import IO, TYPE_CHECKING, Any

import numpy as np

from cli.console import on_terminal
from cli.facts import number_of_options
from matcher.limits import voltage_cap

if TYPE_CHECKING:
    from matcher.checks import Tracker
    from matcher.fit import Fit, Option
    from matcher.options import Options

FIT_SCHEMA = "ferrule.fit/1"


def head(fit: Fit, weather: str | None) -> dict[str, Any]:
    """Everything of the document that stands before the options, except the records."""
    r = fit.request
    cap = voltage_cap(r.site, r.rules)
    return {
        "schema": FIT_SCHEMA,
        "site": {
            "name": r.site.name,
            "design_low_c": r.site.design_low_c,
            "design_high_c": r.site.design_high_c,
            "mounting": r.site.mounting,
            "weather": weather,
        },
        "rules": {
            "name": r.rules.name,
            "isc_factor": r.rules.isc_factor,
            "voltage_cap_v": _known(cap),
            "cold_voltage": r.rules.cold_voltage,
        }
        | ({"cold_margin_pct": r.rules.cold_margin_pct} if r.rules.cold_voltage == "hourly" else {}),
        "ratio_window": list(r.ratio),
        "order": fit.order,
    }


def module_entry(fit: Fit, m: int) -> dict[str, Any]:
    """One module of the document."""
    module, p = fit.modules[m], fit.module_points(m)
    return {
        "maker": module.maker,
        "model": module.model,
        "pmax_w": module.pmax_w,
        "cell_cold_c": p.cell_cold_c,
        "cell_hot_c": p.cell_hot_c,
        "voc_cold_v": p.voc_cold_v,
        "vmp_hot_v": p.vmp_hot_v,
        "vmp_25_v": p.vmp_25_v,
        "vmp_cold_v": p.vmp_cold_v,
        "isc_design_a": p.isc_design_a,
        "imp_a": p.imp_a,
    }


def inverter_entry(fit: Fit, i: int) -> dict[str, Any]:
    """One inverter of the document."""
    inverter = fit.inverters[i]
    return {
        "maker": inverter.maker,
        "model": inverter.model,
        "ac_power_w": inverter.ac_power_w,
        "trackers": sum(g.trackers for g in inverter.inputs),
    }


def module_key(fit: Fit, m: int) -> str:
    """Key of a module in the document."""
    return f"m{fit.modules[m].id}"


def inverter_key(fit: Fit, i: int) -> str:
    """Key of an inverter in the document."""
    return f"i{fit.inverters[i].id}"


def option_entry(fit: Fit, option: Option, with_checks: bool) -> dict[str, Any]:
    """One option of the document; ``checks``, ``confirm`` and ``climate`` only where asked for."""
    entry: dict[str, Any] = {
        "rank": option.rank,
        "verdict": str(option.verdict),
        "module": module_key(fit, option.module),
        "inverter": inverter_key(fit, option.inverter),
        "units": option.units,
        "modules": option.modules,
        "arrangement": _arrangement(fit, option.arrangement),
        "label": option.label,
        "dc_ac_ratio": option.dc_ac_ratio,
        "clipping_loss_pct": option.clipping_loss_pct,
        "yearly_kwh": option.yearly_kwh,
    }
    if fit.search.shelf is not None:
        entry |= {"cost": option.cost, "currency": None if option.cost is None else fit.search.shelf.currency}
    if len(option.wired) > 1:
        # Unlike units: `arrangement` is that of the first, `split` holds all.
        entry["split"] = [
            {"units": u.copies, "modules": u.modules, "arrangement": _arrangement(fit, u.trackers), "label": u.label}
            for u in option.wired
        ]
    if with_checks:
        entry["checks"] = [
            {
                "check": c.check,
                "verdict": str(c.verdict),
                "value": c.value,
                "limit": c.limit,
                "unit": c.unit,
                "margin_pct": c.margin_pct,
                "rule": c.rule,
            }
            | ({"remark": c.remark} if c.remark else {})
            for c in option.checks
        ]
        entry["confirm"] = [
            {"record": c.record, "field": c.field, "at_least": c.at_least}
            | ({} if c.inputs is None else {"inputs": c.inputs})
            for c in option.confirm
        ]
        entry["clipping_parts"] = {
            "power_limit_pct": option.power_clipping_pct,
            "current_limit_pct": option.current_clipping_pct,
        }
        entry["climate"] = {"coldest_c": option.coldest_c, "hottest_c": option.hottest_c}
    return entry


def _arrangement(fit: Fit, trackers: tuple[Tracker, ...]) -> list[dict[str, int | float]]:
    """Trackers in use; with the way their strings face where parts of the array face different ways."""
    faces = fit.request.different_faces
    return [
        {"inputs": t.inputs, "strings": t.strings, "in_series": t.in_series}
        | ({"azimuth": faces[t.face - 1][0], "tilt": faces[t.face - 1][1]} if faces else {})
        for t in trackers
    ]


def totals_entry(fit: Fit) -> dict[str, int]:
    """Totals of the document."""
    t = fit.totals
    return {
        "records_considered": t.records_considered,
        "records_with_option": t.records_with_option,
        "arrangements": t.arrangements,
    }


def write_fit(
    fit: Fit,
    stream: IO[str],
    *,
    weather: str | None,
    with_checks: bool,
    rejected: list[dict] | None,
    extra: Mapping[str, Any] | None = None,
) -> None:
    """Write the document as a stream, one option a line, so that no number of options fills the memory.

    ``extra`` are further entries: ``energy`` and ``by_count`` where they were asked for.
    """
    opening = json.dumps(head(fit, weather), allow_nan=False)
    stream.write(opening[:-1])
    seen_modules: set[int] = set()
    seen_inverters: set[int] = set()
    stream.write(', "options": [')
    total = number_of_options(fit)
    # A document that goes to the terminal itself is not to be mixed with words about it.
    silent = nullcontext(lambda done, of: None)
    with silent if stream is sys.stdout else on_terminal("Written", "options") as progress:
        for k, line in enumerate(_option_lines(fit, with_checks, seen_modules, seen_inverters)):
            stream.write(",\n " if k else "\n ")
            stream.write(line)
            progress(k + 1, total)
    stream.write("],\n")
    modules = {module_key(fit, m): module_entry(fit, m) for m in sorted(seen_modules)}
    if not modules and len(fit.modules) == 1:
        modules = {module_key(fit, 0): module_entry(fit, 0)}
    inverters = {inverter_key(fit, i): inverter_entry(fit, i) for i in sorted(seen_inverters)}
    tail: dict[str, Any] = {"modules": modules, "inverters": inverters, "totals": totals_entry(fit)}
    if rejected is not None:
        tail["rejected"] = rejected
    tail |= extra or {}
    stream.write(json.dumps(tail, allow_nan=False)[1:])
    stream.write("\n")


def _option_lines(fit: Fit, with_checks: bool, modules: set[int], inverters: set[int]) -> Iterator[str]:
    """Options as JSON, one text each, and which records they name."""
    if not with_checks:
        rank = 0
        for table in fit.ranked():
            modules.update(np.unique(table.module).tolist())
            inverters.update(np.unique(table.inverter).tolist())
            yield from _lines_of(fit, table, rank)
            rank += len(table)
        return
    encode = json.JSONEncoder(allow_nan=False).encode
    for option in fit.options(full=True):
        modules.add(option.module)
        inverters.add(option.inverter)
        yield encode(option_entry(fit, option, with_checks=True))


def _lines_of(fit: Fit, table: Options, rank: int) -> Iterator[str]:
    """Options of a table as JSON, straight from its columns: `option_entry` for hundreds of thousands."""
    encode = json.JSONEncoder(allow_nan=False).encode
    one_tracker = (table.strings > 0).sum(axis=1) == 1
    columns = (
        table.module, table.inverter, table.modules, table.ratio, table.clipping_pct, table.yearly_kwh,
        table.to_confirm, table.units, one_tracker, table.inputs[:, 0], table.strings[:, 0], table.in_series[:, 0],
    )  # fmt: skip
    rows = zip(*(c.tolist() for c in columns), strict=True)
    for k, (m, i, count, ratio, clipping, kwh, unsure, units, plain, group, s, n) in enumerate(rows):
        if not plain or units != 1 or not s or fit.search.shelf is not None:
            yield encode(option_entry(fit, fit.option(table, k, rank + k + 1, full=False), with_checks=False))
            continue
        verdict = "to-confirm" if unsure else "fits"
        yield (
            f'{{"rank": {rank + k + 1}, "verdict": "{verdict}", "module": "m{fit.modules[m].id}",'
            f' "inverter": "i{fit.inverters[i].id}", "units": 1, "modules": {count},'
            f' "arrangement": [{{"inputs": {group}, "strings": {s}, "in_series": {n}}}], "label": "{s}x{n}",'
            f' "dc_ac_ratio": {ratio!r}, "clipping_loss_pct": {_json(clipping)}, "yearly_kwh": {_json(kwh)}}}'
        )


def _json(value: float) -> str:
    return "null" if value != value else repr(value)


def _known(value: float) -> float | None:
    return None if value != value else value
