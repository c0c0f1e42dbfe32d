"""``ferrule sheet amend`` and ``undo``: values of a record given anew, and taken back."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from cli.kinds import KindOption, asked_kinds
from cli.opening import CatalogOption, open_catalog

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from catalog.store import Catalog

NameArgument = Annotated[
    str, typer.Argument(metavar="NAME", help="Name of the module or inverter.", show_default=False)
]


def amend(
    name: NameArgument,
    values: Annotated[
        list[str],
        typer.Argument(
            metavar="FIELD=VALUE...",
            help="Values with their fields; a value may carry its unit, a blank one takes the value away.",
            show_default=False,
        ),
    ],
    source: Annotated[
        str,
        typer.Option(
            metavar="DOCUMENT", help="The document you read them from, and where in it.", show_default=False
        ),
    ],
    note: Annotated[str, typer.Option(metavar="TEXT", help="A remark for the history.")] = "",
    expected: Annotated[
        int | None,
        typer.Option("--expected", metavar="REV", min=1, help="Only if this revision still counts."),
    ] = None,
    kind: KindOption = None,
    catalog: CatalogOption = None,
) -> None:
    """Give values of a record anew, as a new revision. What a table said stays readable in its history.

    Values of trackers are those of a group, the first being 1: inputs[1].max_isc_a=32.

    Example: ferrule sheet amend "old faithful 4.6" max_dc_voltage_v=600 --source "datasheet rev C, page 2"
    """
    from catalog.assignments import changes_of
    from catalog.records import Source

    if not source.strip():
        raise CatalogError("--source is blank: name the document that you read the values from")
    with open_catalog(catalog) as opened:
        found, before = record_of(opened, name, asked_kinds(kind))
        changes = changes_of(before, values)
        # The change was made out from this revision, so it holds for no other.
        after = opened.amend(
            found, before.id, changes, Source(source.strip()), note=note, expected=expected or before.revision
        )
        _tell(opened, found, before, after)


def undo(
    name: NameArgument,
    expected: Annotated[
        int | None,
        typer.Option("--expected", metavar="REV", min=1, help="Only if this revision still counts."),
    ] = None,
    kind: KindOption = None,
    catalog: CatalogOption = None,
) -> None:
    """Make what counted before the last change count again, as a new revision. Repeated, it goes further back.

    Example: ferrule sheet undo "old faithful 4.6"
    """
    with open_catalog(catalog) as opened:
        found, before = record_of(opened, name, asked_kinds(kind))
        after = opened.undo(found, before.id, expected=expected or before.revision)
        _tell(opened, found, before, after)


def record_of(catalog: Catalog, text: str, kinds: tuple[str, ...]) -> tuple[str, Module | Inverter]:
    """Kind and record that a name means.

    Raises
    ------
    CatalogError
        Where it could be several, or none.
    """
    from cli.choosing import choose

    kind, id_ = choose(catalog, text, kinds)
    return kind, catalog.module(id_) if kind == "module" else catalog.inverter(id_)


def _tell(catalog: Catalog, kind: str, before: Module | Inverter, after: Module | Inverter) -> None:
    """Print what the last revision changed, and what is odd about the record now."""
    from catalog.plausibility import findings
    from cli.console import say
    from cli.sheet_history import change_text

    if after.revision == before.revision:
        say(f"{after.name}: nothing changed; it says so already (revision {after.revision}).")
        return
    latest = catalog.history(kind, after.id)[-1]
    say(f"{after.name}: revision {after.revision}, from {latest.source}")
    for change in latest.changes:
        say(change_text(change), indent=2)
    for finding in findings(after):
        say(f"{finding.severity}: {finding.message}")
