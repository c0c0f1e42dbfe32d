"""``ferrule sheet twins``: the same model under several makers' names."""

from __future__ import annotations

from typing import Annotated

import typer

from cli.console import Column, counted, print_table, say
from cli.kinds import KindOption, asked_kinds
from cli.opening import CatalogOption, open_catalog


def twins(
    kind: KindOption = None,
    limit: Annotated[int, typer.Option(metavar="N", min=1, help="Models shown on screen.")] = 20,
    catalog: CatalogOption = None,
) -> None:
    """List models that stand in the catalog under two or more makers' names.

    They may be one product under several brands, or one record entered twice under spellings of a maker: an
    order, or a datasheet, may be meant for either.

    Example: ferrule sheet twins --kind inverter
    """
    from catalog.names import twins as twins_of

    groups: list[tuple[str, str, str]] = []
    with open_catalog(catalog, readonly=True) as opened:
        for one in asked_kinds(kind):
            names = {n.id: n for n in opened.names(one)}
            for ids in twins_of(list(names.values())):
                makers = sorted({names[i].maker for i in ids})
                groups.append((one, names[ids[0]].model, "; ".join(makers)))
    if not groups:
        say("No model stands under two makers' names.")
        return
    say(f"{counted(len(groups), 'model')} under two or more makers' names.")
    print_table([Column("kind"), Column("model", fold=True), Column("makers", fold=True)], groups[:limit])
    if len(groups) > limit:
        say(f"... and {len(groups) - limit:,} more (--limit N shows more).")
