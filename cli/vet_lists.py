"""A list of bundles vetted, row by row."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from catalog.errors import CatalogError
from cli.bundle_lists import BundleRow, Reader, whole
from cli.ranges import strings_of
from matcher.errors import MatcherError

if TYPE_CHECKING:
    from catalog.records import Inverter, Site
    from catalog.store import Catalog
    from matcher.rules import RuleSet
    from cli.vet_parts import Question
    from cli.years import SitePlane
    from matcher.moduleyear import PlaneYear
    from matcher.vet import Vetted

@dataclass(frozen=True, slots=True)
class Line:
    """One row and what came out: ``vetted``, or the ``reason`` why it has no verdict.

    ``read_as`` tells which records were taken for names that are written otherwise.
    """

    row: BundleRow
    verdict: str
    vetted: Vetted | None = None
    reason: str = ""
    read_as: tuple[str, ...] = ()

    @property
    def remarks(self) -> tuple[str, ...]:
        """What is worth knowing: how its names were read, and of the bundle itself."""
        return self.read_as + (self.vetted.remarks if self.vetted is not None else ())


@dataclass(frozen=True, slots=True)
class VettedList:
    """The lines of a list, and where clipping and energy of each site come from."""

    lines: Sequence[Line]
    years: Mapping[Site, SitePlane]


def vet_rows(
    catalog: Catalog, rows: Sequence[BundleRow], site: Site | None, like: Site, rules: RuleSet, combiner: bool,
    available: Sequence[bool] | None = None, progress: Callable[[int, int], None] = lambda done, of: None,
    jobs: int | None = None,
) -> VettedList:  # fmt: skip
    """Vet the rows of a list; a row's own site goes before the one for all.

    ``progress`` is told how many of how many rows are done; rows that ask the same are worked out once.
    """
    from cli.vet_parts import Task, vet_all
    from matcher.vet import NO_VERDICT

    inverters = catalog.inverters()
    names = _readers(catalog)
    asked = _questions(catalog, names, rows, site, inverters)
    different = {_key(q): q for q in asked if not isinstance(q, str)}
    years = {s: _years(catalog, s, rules) for s in dict.fromkeys(s for _, s in different.values()) if s is not None}
    task = Task(
        tuple(inverters), rules, combiner, None if available is None else tuple(available), like,
        {s: y.condensed.plane for s, y in years.items() if y.condensed.plane is not None},
        {s: y.hourly for s, y in years.items() if y.hourly is not None},
    )  # fmt: skip
    keys, done = list(different), {}
    alike = Counter(_key(q) for q in asked if not isinstance(q, str))
    told = len(rows) - alike.total()
    for k, found in vet_all(task, list(different.values()), jobs):
        done[keys[k]] = found
        told += alike[keys[k]]
        progress(told, len(rows))
    lines = []
    for row, question in zip(rows, asked, strict=True):
        found = question if isinstance(question, str) else done[_key(question)]
        if isinstance(found, str):
            lines.append(Line(row, NO_VERDICT, reason=found))
        else:
            read_as = tuple(filter(None, (names[kind].read_as(getattr(row, kind)) for kind in names)))
            lines.append(Line(row, found.verdict, found, read_as=read_as))
    return VettedList(lines, {s: y.condensed for s, y in years.items()})


def _readers(catalog: Catalog) -> dict[str, Reader]:
    from catalog.names import NameIndex

    return {kind: Reader(NameIndex(catalog.names(kind)), kind) for kind in ("module", "inverter")}


def _questions(
    catalog: Catalog, names: Mapping[str, Reader], rows: Sequence[BundleRow], site: Site | None, inverters: Sequence[Inverter]
) -> list[Question | str]:
    """What each row asks, or why it asks nothing that can be judged."""
    from matcher.vet import Bundle

    place = {record.id: k for k, record in enumerate(inverters)}
    wanted = {names["module"].read(row.module) for row in rows}
    modules = {m.id: m for m in catalog.modules([w for w in wanted if isinstance(w, int)])}
    sites: dict[str, Site | str] = {}

    def asked(row: BundleRow) -> Question | str:
        read = {
            "module": names["module"].read(row.module),
            "inverter": names["inverter"].read(row.inverter),
            "modules": whole(row.modules, "number of modules"),
            "units": whole(row.units, "number of inverters") if row.units else 1,
            "site": _site(catalog, row.site, sites) if row.site else site,
        }
        wrong = "; ".join(v for v in read.values() if isinstance(v, str))
        if wrong:
            return wrong
        try:
            strings = strings_of(row.strings) if row.strings else None
            bundle = Bundle(modules[read["module"]], place[read["inverter"]], read["modules"], read["units"], strings)
        except (CatalogError, MatcherError) as error:
            return str(error).removeprefix("--")
        return bundle, read["site"]

    return [asked(row) for row in rows]


def _key(question: Question) -> tuple:
    """What tells bundles apart, without going through the module's record."""
    bundle, site = question
    return bundle.module.id, bundle.inverter, bundle.modules, bundle.units, bundle.strings, site


@dataclass(frozen=True, slots=True)
class _Years:
    """The years of a site's array: condensed for energy and clipping, and hour by hour where the rules take it."""

    condensed: SitePlane
    hourly: PlaneYear | None


def _years(catalog: Catalog, site: Site, rules: RuleSet) -> _Years:
    from cli.years import cold_plane, condensed_plane
    from matcher.request import Request

    return _Years(condensed_plane(catalog, site), cold_plane(Request(site, rules)))


def _site(catalog: Catalog, name: str, known: dict[str, Site | str]) -> Site | str:
    if name not in known:
        try:
            known[name] = catalog.site(name)
        except CatalogError as error:
            known[name] = str(error)
    return known[name]
