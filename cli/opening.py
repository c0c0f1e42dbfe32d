"""Where the catalog is, and opening it."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, Annotated

import typer

if TYPE_CHECKING:
    from catalog.store import Catalog

CatalogOption = Annotated[
    str | None,
    typer.Option("--catalog", metavar="FILE", envvar="FERRULE_CATALOG", show_envvar=True,
                 help="Catalog to use instead of the one in your data folder."),
]  # fmt: skip


def location(catalog: str | None) -> str:
    """Path or database URL of the catalog."""
    if catalog:
        return catalog
    from platformdirs import user_data_dir

    return os.path.join(user_data_dir("ferrule", appauthor=False), "catalog.sqlite")


def open_catalog(catalog: str | None, *, create: bool = False, readonly: bool = False) -> Catalog:
    """Open the catalog; a context manager."""
    from catalog.store import Catalog

    return Catalog.open(location(catalog), create=create, readonly=readonly)
