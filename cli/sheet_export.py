"""``ferrule sheet export``: records into a file that people read and edit, and that can be loaded again."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from cli.kinds import KINDS, KindOption, asked_kinds, of_kind
from cli.opening import CatalogOption, open_catalog

if TYPE_CHECKING:
    from catalog.store import Catalog


def export(
    file: Annotated[
        Path,
        typer.Argument(
            metavar="FILE",
            help="File to write; its ending (.csv, .xlsx, .toml, .json) decides the form.",
            show_default=False,
        ),
    ],
    names: Annotated[
        list[str] | None,
        typer.Argument(metavar="[NAMES...]", help="Only these records; else all.", show_default=False),
    ] = None,
    kind: KindOption = None,
    where: Annotated[
        str | None,
        typer.Option(
            metavar="CONDITION",
            help="Only records that meet it; as with 'ferrule sheet find'.",
            show_default=False,
        ),
    ] = None,
    force: Annotated[bool, typer.Option("--force", help="Write over a file that exists.")] = False,
    catalog: CatalogOption = None,
) -> None:
    """Write records to a file, with their origins and sources; 'ferrule sheet load' reads it back without loss.

    The .json is that of the open standard Orange Button.

    Example: ferrule sheet export mine.csv "klassik 270p"
    """
    from catalog.sheetfiles import write_sheets
    from cli.console import counted, say

    if file.exists() and not force:
        raise CatalogError(f"{file} exists: name another file, or write over it with --force")
    kinds = asked_kinds(kind)
    with open_catalog(catalog) as opened:
        chosen = _chosen(opened, names or [], kinds, where)
        modules, inverters = (of_kind(opened, k, chosen[k]) if chosen[k] else [] for k in KINDS)
    if not modules and not inverters:
        raise CatalogError(
            f"there is nothing to write: no {' or '.join(kinds)} is asked for that the catalog holds"
        )
    write_sheets(file, modules, inverters)
    say(f"{counted(len(modules), 'module')} and {counted(len(inverters), 'inverter')}: {file}")


def _chosen(
    catalog: Catalog, names: list[str], kinds: tuple[str, ...], where: str | None
) -> dict[str, list[int]]:
    """Ids by kind of the records that are asked for."""
    from catalog.where import condition, kinds_of
    from cli.choosing import choose

    chosen: dict[str, list[int]] = {kind: [] for kind in KINDS}
    for name in names:
        kind, id_ = choose(catalog, name, kinds)
        chosen[kind].append(id_)
    met = None
    if where is not None:
        met = {kind: catalog.matching(kind, condition(where, kind)) for kind in kinds_of(where, kinds)}
    for kind in kinds:
        if not names:
            chosen[kind] = (
                met.get(kind, []) if met is not None else [named.id for named in catalog.names(kind)]
            )
        elif met is not None:
            chosen[kind] = [id_ for id_ in chosen[kind] if id_ in met.get(kind, [])]
    return chosen
