"""Parts of the documents that are made from the code: the list of files, the tables of fields."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from project_layout import listing

from catalog.records import Inputs, Inverter, Module, Site, specs


def fields(record_type: type) -> str:
    """Table of the fields of a record type: name, unit, whether it is needed, possible range, meaning."""
    rows = ["| field | unit | needed | from | to | meaning |", "| --- | --- | --- | --- | --- | --- |"]
    for spec in specs(record_type).values():
        unit = spec.unit
        low, high = ("" if v is None else f"{v:,g}" for v in (spec.low, spec.high))
        if not unit:
            unit = {int: "whole number", bool: "yes or no", str: "text"}.get(spec.type, "")
        needed = "yes" if spec.required else ""
        rows.append(f"| `{spec.name}` | {unit} | {needed} | {low} | {high} | {spec.meaning} |")
    return "\n".join(rows)


PARTS: Mapping[str, Callable[[], str]] = {
    "files": listing,
    "module fields": lambda: fields(Module),
    "inverter fields": lambda: fields(Inverter),
    "inputs fields": lambda: fields(Inputs),
    "site fields": lambda: fields(Site),
}


def with_parts(text: str) -> str:
    """A document with these parts brought up to date; each stands between two marks."""
    for name, made in PARTS.items():
        begin, end = f"<!-- {name}: begin -->", f"<!-- {name}: end -->"
        if begin in text:
            before, _, rest = text.partition(begin)
            text = f"{before}{begin}\n{made()}\n{end}{rest.partition(end)[2]}"
    return text
