"""From a name as people write it to the one record that is meant."""

from __future__ import annotations

from typing import TYPE_CHECKING

from catalog.errors import CatalogError

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from catalog.store import Catalog


def choose_module(catalog: Catalog, text: str) -> Module:
    """The module that a name means.

    Raises
    ------
    CatalogError
        Where it could be several records, or none; the candidates are listed.
    """
    return catalog.module(_chosen(catalog, "module", text))


def choose_inverter(catalog: Catalog, text: str) -> Inverter:
    """The inverter that a name means; raises as `choose_module` does."""
    return catalog.inverter(_chosen(catalog, "inverter", text))


def _chosen(catalog: Catalog, kind: str, text: str) -> int:
    from catalog.names import look_up

    names = catalog.names(kind)
    if not names:
        raise CatalogError(
            f"the catalog holds no {kind}: load a table with 'ferrule sheet load cec' or your own with"
            " 'ferrule sheet load FILE'"
        )
    found = look_up(text, names)
    if found.match is not None:
        return found.match
    by_id = {n.id: n.name for n in names}
    near = [f"  {by_id[c.id]}" for c in found.candidates[:10]]
    if not near:
        raise CatalogError(f"no {kind} is called {text!r}: search with 'ferrule sheet find'")
    if found.ambiguous:
        head = f"{text!r} could be several {kind}s: write one of these in full"
    else:
        head = f"no {kind} is called {text!r}; the nearest names are"
    return _refuse(head, near)


def _refuse(head: str, lines: list[str]) -> int:
    raise CatalogError("\n".join([head, *lines]))
