"""A list of bundles vetted, row by row."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from catalog.errors import CatalogError
from cli.bundle_lists import BundleRow, Reader, whole
from cli.ranges import strings_of
from matcher.errors import MatcherError

if TYPE_CHECKING:
    from catalog.records import Site
    from catalog.store import Catalog
    from matcher.rules import RuleSet
    from matcher.vet import Bundle, Vetted


@dataclass(frozen=True, slots=True)
class Line:
    """One row and what came out: ``vetted``, or the ``reason`` why it was not judged."""

    row: BundleRow
    verdict: str
    vetted: Vetted | None = None
    reason: str = ""


def vet_rows(
    catalog: Catalog, rows: Sequence[BundleRow], site: Site | None, like: Site, rules: RuleSet, combiner: bool,
    available: Sequence[bool] | None = None,
) -> Iterator[Line]:  # fmt: skip
    """Vet the rows of a list; a row's own site goes before the one for all."""
    from catalog.names import NameIndex
    from matcher.vet import Bundle, Vetter

    inverters = catalog.inverters()
    place = {record.id: k for k, record in enumerate(inverters)}
    vetter = Vetter(inverters, rules, combiner, available)
    names = {kind: Reader(NameIndex(catalog.names(kind)), kind) for kind in ("module", "inverter")}
    wanted = {names["module"].read(row.module) for row in rows}
    modules = {m.id: m for m in catalog.modules([w for w in wanted if isinstance(w, int)])}
    sites: dict[str, Site | str] = {}
    done: dict[tuple[Bundle, Site | None], Vetted] = {}

    for row in rows:
        read = {
            "module": names["module"].read(row.module),
            "inverter": names["inverter"].read(row.inverter),
            "modules": whole(row.modules, "number of modules"),
            "units": whole(row.units, "number of inverters") if row.units else 1,
            "site": _site(catalog, row.site, sites) if row.site else site,
        }
        wrong = next((v for v in read.values() if isinstance(v, str)), None)
        if wrong is not None:
            yield Line(row, "not-judged", reason=wrong)
            continue
        try:
            strings = strings_of(row.strings) if row.strings else None
            bundle = Bundle(modules[read["module"]], place[read["inverter"]], read["modules"], read["units"], strings)
            key = (bundle.module.id, bundle.inverter, bundle.modules, bundle.units, strings, read["site"])
            if key not in done:
                done[key] = vetter.vet(bundle, read["site"], like=like)
        except (CatalogError, MatcherError) as error:
            yield Line(row, "not-judged", reason=str(error).removeprefix("--"))
            continue
        yield Line(row, done[key].verdict, done[key])


def _site(catalog: Catalog, name: str, known: dict[str, Site | str]) -> Site | str:
    if name not in known:
        try:
            known[name] = catalog.site(name)
        except CatalogError as error:
            known[name] = str(error)
    return known[name]
