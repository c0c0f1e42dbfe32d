"""The sites that are kept, by name; names that differ only in case or blanks are one."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from catalog.errors import CatalogError
from catalog.near import nearest
from catalog.records import Site
from catalog.rows import read_sites
from catalog.sites import checked

if TYPE_CHECKING:
    from sqlmodel import Session

    from catalog.database import Run


def site_of(sites: Sequence[Site], name: str) -> Site:
    """The site of a name.

    Raises
    ------
    CatalogError
        If there is none; the nearest names are told.
    """
    for site in sites:
        if _key(site.name) == _key(name):
            return site
    if not sites:
        raise CatalogError(f"no site is called {name!r}, and none is kept: 'ferrule site add' keeps one")
    raise CatalogError(f"no site is called {name!r}{nearest(name, [site.name for site in sites])}")


def add(session: Session, site: Site, *, replace: bool) -> None:
    """Keep a site; see `catalog.store.Catalog.add_site`."""
    from catalog.tables import SiteRow

    site = checked(site)
    key = _key(site.name)
    if not key:
        raise CatalogError("a site needs a name")
    if not site.name.isprintable():
        raise CatalogError(f"the name {site.name!r} of a site holds a character that cannot be printed")
    taken = session.get(SiteRow, key)
    if taken is not None and not replace:
        raise CatalogError(f"a site is called {taken.name!r} already: drop it first, or choose another name")
    values = {name: getattr(site, name) for name in SiteRow.model_fields if name != "name_key"}
    session.merge(SiteRow(name_key=key, **values))


def drop(session: Session, run: Run, name: str) -> None:
    """Forget a site; raises as `site_of` does."""
    from catalog.tables import SiteRow

    site = site_of(read_sites(run), name)
    session.delete(session.get(SiteRow, _key(site.name)))


def _key(name: str) -> str:
    return " ".join(name.split()).casefold()
