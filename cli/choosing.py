"""From a name as people write it to the one record that is meant."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from catalog.errors import CatalogError
from cli.kinds import KINDS, all_names
from cli.quoting import quoted

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from catalog.store import Catalog

#: Candidates that are listed.
_LISTED = 10


def choose_module(catalog: Catalog, text: str) -> Module:
    """The module that a name means.

    Raises
    ------
    CatalogError
        Where it could be several records, or none; the candidates are listed.
    """
    return catalog.module(choose(catalog, text, ("module",))[1])


def choose_inverter(catalog: Catalog, text: str) -> Inverter:
    """The inverter that a name means; raises as `choose_module` does."""
    return catalog.inverter(choose(catalog, text, ("inverter",))[1])


def choose(catalog: Catalog, text: str, kinds: Sequence[str] = KINDS) -> tuple[str, int]:
    """Kind and id of the one record of some kinds that a name means; raises as `choose_module` does."""
    from catalog.names import look_up

    known = all_names(catalog, kinds)
    found = look_up(text, known.names, limit=_LISTED + 1)
    if found.match is not None:
        return known.records[found.match]
    what = " or ".join(kinds)
    if not found.candidates:
        raise CatalogError(f"no {what} is called {text!r}: search with 'ferrule sheet find'")
    if found.ambiguous:
        head = f"{text!r} could be several {'s or '.join(kinds)}s: write one of these in full"
    else:
        head = f"no {what} is called {text!r}; the nearest names are"
    listed = found.candidates[:_LISTED]
    near = [known.names[c.id].name for c in listed]
    if len(set(near)) < len(near):
        near = [f"{known.names[c.id].name} (--kind {known.records[c.id][0]})" for c in listed]
    if found.ambiguous and len(found.candidates) > _LISTED:
        near.append(f"... and more: 'ferrule sheet find {quoted(text)}' lists them")
    raise CatalogError("\n  ".join([head, *near]))
