"""``ferrule sheet find``: records by words of their names or by their values, with their key ratings."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Annotated, Any

import typer

from catalog.errors import CatalogError
from cli.kinds import KindOption, all_names, asked_kinds, of_kind
from cli.opening import CatalogOption, open_catalog

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from catalog.store import Catalog
    from cli.console import Column

SCHEMA = "ferrule.find/1"
NOTHING_FOUND = 1


def find(
    words: Annotated[
        list[str] | None,
        typer.Argument(
            metavar="[WORDS...]",
            help="Words of maker and model, in any order; the last may be unfinished.",
            show_default=False,
        ),
    ] = None,
    where: Annotated[
        str | None,
        typer.Option(
            metavar="CONDITION",
            help='On values, such as "ac_power_w >= 5 kW and phases == 1"; also or, not, brackets, == unknown, ~ "text".',
            show_default=False,
        ),
    ] = None,
    kind: KindOption = None,
    limit: Annotated[int, typer.Option(metavar="N", min=1, help="Records shown.")] = 20,
    as_json: Annotated[bool, typer.Option("--json", help="Print the result as a document.")] = False,
    catalog: CatalogOption = None,
) -> int:
    """Find records by words of their names, by their values, or both, with their key ratings.

    A value that no source states meets no comparison; ask for it with == unknown.

    Exit status: 0 something found, 1 nothing found, 2 bad input.

    Example: ferrule sheet find klassik 270
    """
    kinds = asked_kinds(kind)
    query = " ".join(words or ())
    if not query and where is None:
        raise CatalogError("name words of a maker or model, or a condition with --where")
    with open_catalog(catalog) as opened:
        if where is None:
            found, total = _by_words(opened, query, kinds, limit)
        else:
            found, total = _by_values(opened, query, where, kinds, limit)
        records = {
            (k, r.id): r
            for k in kinds
            for r in of_kind(opened, k, [id_ for kind_, id_, _ in found if kind_ == k])
        }
    hits = [(k, records[k, id_], score) for k, id_, score in found]
    if as_json:
        from cli.console import print_json

        document: dict[str, Any] = {"schema": SCHEMA, "query": query}
        if where is not None:
            document["where"] = where
        print_json(document | {"total": total, "found": [_entry(*hit) for hit in hits]})
    elif hits:
        _show(query, hits, limit, total)
    else:
        from cli.console import say

        asked = [f"has a name like {query!r}"] if query else []
        asked += [f"is known to meet {where!r}"] if where is not None else []
        say(f"No {' or '.join(kinds)} {' and '.join(asked)}.")
    return 0 if hits else NOTHING_FOUND


def _by_words(
    catalog: Catalog, query: str, kinds: Sequence[str], limit: int
) -> tuple[list[tuple[str, int, float | None]], int | None]:
    """Kind, id and score of the first records with such names, and how many there are, if they are more than near."""
    from catalog.names import search

    known = all_names(catalog, kinds)
    found = search(query, known.names, limit)
    return [(*known.records[c.id], c.score) for c in found.candidates], found.total


def _by_values(
    catalog: Catalog, query: str, where: str, kinds: Sequence[str], limit: int
) -> tuple[list[tuple[str, int, float | None]], int]:
    """Kind, id and score of the first records that meet a condition (and are named so), and how many there are."""
    from catalog.names import Named
    from catalog.names import find as search
    from catalog.where import condition, kinds_of

    met = [
        (kind, id_)
        for kind in kinds_of(where, kinds)
        for id_ in catalog.matching(kind, condition(where, kind))
    ]
    if not query:
        return [(*record, None) for record in met[:limit]], len(met)
    wanted = set(met)
    known = all_names(catalog, kinds)
    names = [Named(n.id, n.maker, n.model) for n in known.names if known.records[n.id] in wanted]
    found = search(query, names, len(names)) if names else []
    return [(*known.records[c.id], c.score) for c in found[:limit]], len(found)


def _show(
    query: str, hits: Sequence[tuple[str, Module | Inverter, float | None]], limit: int, total: int | None
) -> None:
    from catalog.namekeys import compact
    from cli.console import counted, print_table, say

    best = compact(hits[0][1].name)
    if not all(compact(word) in best for word in query.split()):
        say(f"No name holds all of {query!r}; the nearest are:")
    for number, kind in enumerate(dict.fromkeys(k for k, _, _ in hits)):
        if number:
            say()
        columns = _COLUMNS[kind]()
        records = [r for k, r, _ in hits if k == kind]
        print_table([c for c, _ in columns], [[text(r) for _, text in columns] for r in records])
    if total is not None and total > len(hits):
        narrower = "more words narrow it" if query else "a narrower condition asks for fewer"
        say(f"{len(hits):,} of {counted(total, 'record')} shown; {narrower}, --limit {total} shows all.")
    elif total is not None:
        say(f"{counted(total, 'record')}.")


def _module_columns() -> list[tuple[Column, Callable[[Module], str]]]:
    from cli.console import Column, number

    return [
        (Column("module", fold=True), lambda m: m.name),
        (Column("Pmax W", number=True), lambda m: number(m.pmax_w, 1)),
        (Column("Voc V", number=True), lambda m: number(m.voc_v, 2)),
        (Column("Isc A", number=True), lambda m: number(m.isc_a, 2)),
        (Column("Vmp V", number=True), lambda m: number(m.vmp_v, 2)),
        (Column("Imp A", number=True), lambda m: number(m.imp_a, 2)),
        (Column("Voc %/K", number=True), lambda m: number(m.voc_coef_pct, 3)),
        (Column("technology", fold=True), lambda m: m.technology),
    ]


def _inverter_columns() -> list[tuple[Column, Callable[[Inverter], str]]]:
    from cli.console import Column, number

    return [
        (Column("inverter", fold=True), lambda i: i.name),
        (Column("AC kW", number=True), lambda i: number(i.ac_power_w / 1000, 2)),
        (Column("AC V", number=True), lambda i: number(i.ac_voltage_v)),
        (Column("MPPT V", number=True), lambda i: f"{i.mppt_low_v:.0f} to {i.mppt_high_v:.0f}"),
        (Column("max DC V", number=True), lambda i: number(i.max_dc_voltage_v)),
        (Column("trackers", number=True), _trackers),
        (Column("eff. %", number=True), lambda i: number(i.weighted_efficiency_pct, 1)),
    ]


def _trackers(inverter: Inverter) -> str:
    """Number of trackers; in brackets where it is only assumed."""
    number = sum(group.trackers for group in inverter.inputs)
    return f"({number})" if inverter.origin("inputs") == "assumed" else str(number)


_COLUMNS: dict[str, Callable[[], list[tuple[Column, Callable[[Any], str]]]]] = {
    "module": _module_columns,
    "inverter": _inverter_columns,
}

_RATINGS = {
    "module": (
        "technology",
        "pmax_w",
        "voc_v",
        "isc_a",
        "vmp_v",
        "imp_a",
        "voc_coef_pct",
        "max_system_voltage_v",
    ),
    "inverter": (
        "ac_power_w",
        "ac_voltage_v",
        "mppt_low_v",
        "mppt_high_v",
        "max_dc_voltage_v",
        "weighted_efficiency_pct",
    ),
}


def _entry(kind: str, record: Module | Inverter, score: float | None) -> dict[str, Any]:
    entry = {"kind": kind, "id": record.id, "maker": record.maker, "model": record.model, "score": score}
    entry |= {name: getattr(record, name) for name in _RATINGS[kind]}
    if kind == "inverter":
        entry["trackers"] = sum(group.trackers for group in record.inputs)
    return entry
