"""``ferrule sheet history``: how a record came to be what it is."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any

import typer

from cli.kinds import KindOption, asked_kinds
from cli.opening import CatalogOption, open_catalog
from cli.sheet_amend import NameArgument, record_of

if TYPE_CHECKING:
    from catalog.history import Change, Revision
    from catalog.records import Inverter, Module

SCHEMA = "ferrule.history/1"


def history(
    name: NameArgument,
    kind: KindOption = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print the history as a document.")] = False,
    catalog: CatalogOption = None,
) -> None:
    """Show all revisions of a record, the latest first: when, how, from which document, and what changed.

    Example: ferrule sheet history "old faithful 4.6"
    """
    with open_catalog(catalog) as opened:
        found, record = record_of(opened, name, asked_kinds(kind))
        revisions = opened.history(found, record.id)
    if as_json:
        from cli.console import print_json

        print_json(document(found, record, revisions))
    else:
        _print(found, record, revisions)


def document(kind: str, record: Module | Inverter, revisions: list[Revision]) -> dict[str, Any]:
    """The history as the document ``ferrule.history/1``, oldest first; values that are not known are null."""
    return {
        "schema": SCHEMA, "kind": kind, "id": record.id, "maker": record.maker, "model": record.model,
        "current_revision": record.revision,
        "revisions": [
            {
                "revision": r.number, "previous": r.previous, "act": r.act, "when": r.created_at.isoformat(),
                "source": {"name": r.source.name, "revision": r.source.revision}, "note": r.note,
                "changes": [
                    {
                        "field": c.field, "old": _plain(c.old), "new": _plain(c.new), "origin": c.origin,
                        "source": None if c.source is None else {"name": c.source.name, "revision": c.source.revision},
                    }
                    for c in r.changes
                ],
            }
            for r in revisions
        ],
    }  # fmt: skip


def _plain(value: Any) -> Any:
    from dataclasses import asdict

    return [asdict(group) for group in value] if isinstance(value, tuple) else value


def _print(kind: str, record: Module | Inverter, revisions: list[Revision]) -> None:
    from cli.console import counted, say

    say(f"{record.name} ({kind}), revision {record.revision} counts")
    for revision in reversed(revisions):
        say()
        when = revision.created_at.astimezone().strftime("%Y-%m-%d %H:%M")
        say(f"revision {revision.number}  {when}  {revision.act}, from {revision.source}")
        if revision.note:
            say(f"note: {revision.note}", indent=2)
        if revision.previous is None and revision.number == 1:
            say(counted(len(revision.changes), "value"), indent=2)
            continue
        for change in revision.changes:
            say(change_text(change), indent=2)


def change_text(change: Change) -> str:
    """A change in words: "max_dc_voltage_v: not stated -> 600 V (entered)"."""
    unit = _unit(change.field)
    old, new = (_value(value, unit) for value in (change.old, change.new))
    origin = f" ({change.origin})" if change.origin is not None else ""
    if change.old == change.new:
        return f"{change.field}: {new} as before, now from {change.source}{origin}"
    return f"{change.field}: {old} -> {new}{origin}"


def _value(value: Any, unit: str) -> str:
    from catalog.inputs_text import format_inputs
    from cli.sheet_show import NOT_STATED, value_text

    if value is None:
        return NOT_STATED
    if isinstance(value, tuple):
        return format_inputs(value)
    return f"{value_text(value)} {unit}".strip()


def _unit(name: str) -> str:
    from catalog.headings import spec_of

    spec = spec_of(name)
    return spec.unit if spec and spec.unit != "1" else ""
