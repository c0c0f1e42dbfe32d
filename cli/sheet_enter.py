"""``ferrule sheet enter``: a datasheet typed in, field by field; it can be left and taken up again."""

from __future__ import annotations

from typing import Annotated

import typer

from cli.kinds import asked_kinds
from cli.opening import CatalogOption, open_catalog


def enter(
    kind: Annotated[
        str, typer.Argument(metavar="module|inverter", help="What the datasheet is of.", show_default=False)
    ],
    fresh: Annotated[
        bool, typer.Option("--fresh", help="Forget the draft that was left, and begin anew.")
    ] = False,
    catalog: CatalogOption = None,
) -> int:
    """Type in a datasheet, field by field, each checked at once; the whole record is shown before it is kept.

    Blank: not known. back: the field before. later (or Ctrl-D, Ctrl-C): leave, and go on another time.

    Exit status: 0 kept, 1 left before it was kept, 2 bad input.

    Example: ferrule sheet enter module
    """
    (kind,) = asked_kinds(kind)
    with open_catalog(catalog, create=True) as opened:
        from cli.enter_dialogue import enter_record

        return enter_record(opened, kind, fresh=fresh)
