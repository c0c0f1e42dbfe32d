"""``ferrule sheet show``: one record whole, with the origin and the source of every value."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Annotated, Any

import typer

from cli.kinds import KindOption, asked_kinds
from cli.opening import CatalogOption, open_catalog

if TYPE_CHECKING:
    from catalog.plausibility import Finding
    from catalog.records import FieldSpec, Inverter, Module

SCHEMA = "ferrule.sheet/1"
NOT_STATED = "not stated"


def show(
    name: Annotated[
        str, typer.Argument(metavar="NAME", help="Name of the module or inverter.", show_default=False)
    ],
    kind: KindOption = None,
    at: Annotated[int | None, typer.Option(metavar="REV", min=1, help="As it was at this revision.")] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print the record as a document.")] = False,
    catalog: CatalogOption = None,
) -> None:
    """Show one record whole: every value with its unit, its origin and the document it was read from.

    Example: ferrule sheet show "klassik 270p"
    """
    kinds = asked_kinds(kind)
    with open_catalog(catalog) as opened:
        from cli.choosing import choose

        found, id_ = choose(opened, name, kinds)
        record = opened.module(id_, at) if found == "module" else opened.inverter(id_, at)
        current = (
            (opened.module(id_) if found == "module" else opened.inverter(id_)).revision
            if at
            else record.revision
        )
    from catalog.plausibility import findings

    remarks = findings(record)
    if as_json:
        from cli.console import print_json

        print_json(document(found, record, current, remarks))
    else:
        print_record(found, record, current, remarks)


def document(
    kind: str, record: Module | Inverter, current: int, remarks: Sequence[Finding]
) -> dict[str, Any]:
    """The record as the document ``ferrule.sheet/1``; a value that no source states is null."""
    entry: dict[str, Any] = {
        "schema": SCHEMA,
        "kind": kind,
        "id": record.id,
        "maker": record.maker,
        "model": record.model,
        "revision": record.revision,
        "current_revision": current,
        "source": _source(record, None),
        "values": {
            spec.name: {
                "value": getattr(record, spec.name),
                "unit": spec.unit,
                **_provenance(record, spec.name),
            }
            for spec in _specs(record)
        },
    }
    if kind == "inverter":
        from dataclasses import asdict

        entry["inputs"] = {
            "groups": [asdict(group) for group in record.inputs],
            **_provenance(record, "inputs"),
        }
    entry["remarks"] = [{"field": f.field, "severity": f.severity, "message": f.message} for f in remarks]
    return entry


def _specs(record: Module | Inverter) -> list[FieldSpec]:
    from catalog.records import specs

    return [spec for spec in specs(type(record)).values() if spec.name not in ("maker", "model")]


def _provenance(record: Module | Inverter, name: str) -> dict[str, Any]:
    origin = record.origin(name)
    return (
        {"origin": None, "source": None}
        if origin is None
        else {"origin": origin, "source": _source(record, name)}
    )


def _source(record: Module | Inverter, name: str | None) -> dict[str, str]:
    source = record.source if name is None else record.source_of(name)
    return {"name": source.name, "revision": source.revision}


def print_record(kind: str, record: Module | Inverter, current: int, remarks: Sequence[Finding]) -> None:
    """Print a record whole, with what is odd about it."""
    from cli.console import Column, print_table, say

    revision = f"revision {record.revision}"
    if record.revision != current:
        revision += f", not the one that counts, which is {current}"
    say(f"{record.name} ({kind}, {revision})")
    numbers = _numbered_sources(record)
    say()
    columns = [
        Column("field"),
        Column("value", number=True),
        Column("unit"),
        Column("origin"),
        Column("src", number=True),
        Column("meaning", fold=True),
    ]
    print_table(columns, [_row(record, spec, numbers) for spec in _specs(record)])
    if kind == "inverter":
        say()
        _print_inputs(record, numbers)
    say()
    for source, number in numbers.items():
        say(f"src {number}: {source}")
    for finding in remarks:
        say(f"{finding.severity}: {finding.message}")


def _numbered_sources(record: Module | Inverter) -> dict[str, int]:
    """Documents that values of the record were read from, numbered in the order in which they are met."""
    documents = [str(record.source), *(str(source) for source in record.sources.values())]
    return {name: number for number, name in enumerate(dict.fromkeys(documents), start=1)}


def _row(record: Module | Inverter, spec: FieldSpec, numbers: dict[str, int]) -> list[str]:
    origin = record.origin(spec.name)
    unit = "" if spec.unit == "1" else spec.unit
    if origin is None:
        return [spec.name, "", unit, NOT_STATED, "", spec.meaning]
    source = str(numbers[str(record.source_of(spec.name))])
    return [spec.name, value_text(getattr(record, spec.name)), unit, str(origin), source, spec.meaning]


def _print_inputs(record: Inverter, numbers: dict[str, int]) -> None:
    """Tracker groups, one row each; a cell without a value says so."""
    from cli.console import Column, print_table, say

    source = numbers[str(record.source_of("inputs"))]
    say(f"inputs: tracker groups ({record.origin('inputs')}, src {source})")
    headers = ("group", "trackers", "strings/tracker", "max current A", "max Isc A", "max power W")
    rows = []
    for number, g in enumerate(record.inputs, start=1):
        values = (g.trackers, g.strings_per_tracker, g.max_current_a, g.max_isc_a, g.max_power_w)
        rows.append([str(number), *(value_text(value) or NOT_STATED for value in values)])
    print_table([Column(header, number=True) for header in headers], rows)


def value_text(value: Any) -> str:
    """A value as text, in as many digits as matter; blank where there is none."""
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:,.0f}" if value.is_integer() and abs(value) < 1e12 else f"{value:.6g}"
    return str(value)
