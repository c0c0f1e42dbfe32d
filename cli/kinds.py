"""Commands that serve both kinds of records: which kind is meant, and all names as one list."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError

if TYPE_CHECKING:
    from catalog.names import Named
    from catalog.records import Inverter, Module
    from catalog.store import Catalog

KINDS = ("module", "inverter")

KindOption = Annotated[
    str | None, typer.Option("--kind", metavar="KIND", help="Only of this kind: module or inverter.")
]


@dataclass(frozen=True, slots=True)
class AllNames:
    """Names of several kinds in one list, so that they are ranked together.

    The id of a name is its place in the list; ``records`` tells kind and id of the record by that place.
    """

    names: list[Named]
    records: list[tuple[str, int]]


def asked_kinds(kind: str | None) -> tuple[str, ...]:
    """The kinds that ``--kind`` leaves.

    Raises
    ------
    CatalogError
        Where there is no such kind.
    """
    if kind is None:
        return KINDS
    if kind.casefold() not in KINDS:
        raise CatalogError(f"--kind {kind}: it is {' or '.join(KINDS)}")
    return (kind.casefold(),)


def all_names(catalog: Catalog, kinds: Sequence[str]) -> AllNames:
    """Names of some kinds of records.

    Raises
    ------
    CatalogError
        Where the catalog holds none.
    """
    from catalog.names import Named

    found = [(kind, named) for kind in kinds for named in catalog.names(kind)]
    if not found:
        raise CatalogError(
            f"the catalog holds no {' and no '.join(kinds)}: load the public tables with 'ferrule sheet load"
            " cec', or your own with 'ferrule sheet load FILE'"
        )
    return AllNames(
        [Named(place, named.maker, named.model) for place, (_, named) in enumerate(found)],
        [(kind, named.id) for kind, named in found],
    )


def of_kind(catalog: Catalog, kind: str, ids: Iterable[int]) -> list[Module] | list[Inverter]:
    """Records of a kind by their ids."""
    return catalog.modules(ids) if kind == "module" else catalog.inverters(ids)
