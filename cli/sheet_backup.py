"""``ferrule sheet backup`` and ``ferrule sheet restore``: a copy of the whole catalog, and back."""

from __future__ import annotations

from typing import Annotated

import typer

from cli.console import note
from cli.opening import CatalogOption, location, open_catalog


def backup(
    file: Annotated[str, typer.Argument(metavar="FILE", help="The new file to write the copy to.")],
    catalog: CatalogOption = None,
) -> None:
    """Write a copy of the whole catalog, as of this moment, to a new file.

    Others may go on using the catalog meanwhile. The copy is a catalog of its own.

    Example: ferrule sheet backup shelf-copy.sqlite
    """
    with open_catalog(catalog, readonly=True) as opened:
        path = opened.backup(file)
    print(f"Copy: {path}")


def restore(
    file: Annotated[str, typer.Argument(metavar="FILE", help="A copy that 'sheet backup' wrote.")],
    catalog: CatalogOption = None,
) -> None:
    """Put a copy in the place of the catalog; it is checked first, and the replaced catalog is kept.

    Example: ferrule sheet restore shelf-copy.sqlite
    """
    from pathlib import Path

    from catalog.backup import restore as bring_back

    where = location(catalog)
    replaced = bring_back(where, Path(file))
    print(f"Catalog: {where}")
    if replaced is not None:
        note(f"The catalog that was there is kept as {replaced}.")
