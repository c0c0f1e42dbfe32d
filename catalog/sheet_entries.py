"""From the entries of a datasheet file, whatever its form, to records; and from records to entries.

An entry is one row or table with the fields of a record by name, and beside them: ``source`` and
``source_revision``; ``entered``, ``derived`` and ``assumed``, lists of the fields whose value has that
origin; ``sources``, the documents of single values that come from another one than ``source``.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from functools import cache
from typing import Any

from catalog.errors import CatalogError
from catalog.inputs_text import EXAMPLE
from catalog.plausibility import findings_of
from catalog.records import FieldSpec, Inputs, Inverter, Module, Origin, Source, specs
from catalog.sheet_needs import all_needed, needed
from catalog.sheet_reading import Entry, Reading, nearest
from catalog.sheet_values import Coefficient, value_of
from catalog.units import BASES

KINDS: Mapping[str, type] = {"module": Module, "inverter": Inverter}
MARKED_ORIGINS = (Origin.ENTERED, Origin.DERIVED, Origin.ASSUMED)
ABOUT = ("source", "source_revision", *(o.value for o in MARKED_ORIGINS), "sources")

#: Faults of a file that are told one by one.
_TOLD = 10

_TEXT = {
    name: FieldSpec(name, str, "", name, False) for name in ("source", "source_revision", "name", "revision")
}


def fields_of(kind: str) -> tuple[str, ...]:
    """Fields that an entry of a kind may have, in the order in which they are written."""
    values = tuple(specs(KINDS[kind]))
    if kind == "inverter":
        behind = values.index("max_array_power_w") + 1
        values = (*values[:behind], "inputs", *values[behind:])
    return values + ABOUT


def records_of(entries: Sequence[Entry], reading: Reading) -> list[Module | Inverter]:
    """Records of entries, checked; odd values and what is assumed go to the notes of ``reading``.

    Parameters
    ----------
    entries : sequence of Entry
    reading : Reading
        Of the file.

    Raises
    ------
    CatalogError
        For the entries that cannot be taken, a line each with its place in the file.
    """
    records = []
    first: dict[tuple[str, str, str], tuple[str, Module | Inverter]] = {}
    places = []
    if reading.given:
        from catalog.sheet_given import completed

        entries = completed(entries, reading)
    bad: dict[str, list[str]] = {}
    for entry in entries:
        try:
            record = _record(entry, reading)
            key = (entry.kind, record.maker, record.model)
            if key in first:
                _same_or_fault(entry, record, *first[key], reading)
                continue
        except CatalogError as problem:
            # Like faults of several rows are told once.
            bad.setdefault(str(problem).replace(entry.where, "", 1), []).append(str(problem))
            continue
        first[key] = (entry.where, record)
        records.append(record)
        places.append(entry.where)
    if bad:
        lines = list(_told(list(bad.values())))
        try:
            _check(records, places, reading)
        except CatalogError as problem:
            lines.append(str(problem))
        raise CatalogError("\n".join(lines))
    try:
        reading.signs.check()
    except CatalogError as problem:
        raise reading.fault(problem) from None
    if reading.signs.comma:
        reading.note("decimal commas were read as decimal points")
    if reading.signs.thousands:
        reading.note(f"marks between thousands were taken out, first in {reading.signs.thousands}")
    return checked_records(records, places, reading)


def _told(faults: Sequence[Sequence[str]]) -> Iterator[str]:
    """Lines of faults, like ones by their first."""
    for like in faults[:_TOLD]:
        yield like[0] + (f" ({_some(len(like) - 1, 'more record')} like it)" if len(like) > 1 else "")
    left = sum(map(len, faults[_TOLD:]))
    if left:
        yield f"  ... and {_some(left, 'more record')} that cannot be taken"


def checked_records(
    records: list[Module | Inverter], places: Sequence[str], reading: Reading
) -> list[Module | Inverter]:
    """Records as they are; impossible ones are refused, odd values and what is assumed are noted.

    Raises
    ------
    CatalogError
        For the first record that cannot be, with its place in the file.
    """
    _note_defaults(records, reading)
    _check(records, places, reading)
    return records


def _record(entry: Entry, reading: Reading) -> Module | Inverter:
    if entry.fault:
        raise CatalogError(entry.fault)
    type_ = KINDS[entry.kind]
    values: dict[str, Any] = {}
    missing: list[FieldSpec] = []
    units = entry.units
    for name, spec in specs(type_).items():
        try:
            value = (
                value_of(entry.cells[name], spec, reading.signs, f"{entry.where}, {name}", units.get(name))
                if name in entry.cells
                else None
            )
        except CatalogError as problem:
            raise reading.fault(problem, entry.where, name) from None
        if value is not None:
            values[name] = value
        elif spec.required:
            missing.append(spec)
    if len(missing) == 1:
        raise reading.fault(needed(entry, missing[0]), entry.where, missing[0].name)
    if missing:
        raise reading.fault(all_needed(entry, missing), entry.where)
    for name, base in BASES.items():
        if isinstance(values.get(name), Coefficient):
            if not values[base] > 0:
                raise reading.fault(f"is {values[base]:g}; enter the value at STC", entry.where, base)
            values[name] = values[name].percent(values[base])
    origins = _origins(entry, reading, type_)
    if type_ is Inverter:
        inputs = _inputs(entry, reading)
        if inputs:
            values["inputs"] = inputs
        else:
            origins["inputs"] = Origin.ASSUMED
    for name in origins:
        if name not in values and name != "inputs":
            raise reading.fault(
                f"is marked {origins[name]} and has no value; enter the value or take the mark away",
                entry.where,
                name,
            )
    return type_(
        **values, source=_source(entry, reading), origins=origins, sources=_sources(entry, reading, type_)
    )


def _inputs(entry: Entry, reading: Reading) -> tuple[Inputs, ...]:
    """Groups of inputs of an entry, given as a list of tables; none where nothing is said."""
    groups = entry.cells.get("inputs") or []
    if isinstance(groups, tuple):
        return groups
    if not isinstance(groups, list) or not all(isinstance(group, Mapping) for group in groups):
        raise reading.fault(
            "is no list of groups; write inputs = [{trackers = 2, max_current_a = 26}]", entry.where, "inputs"
        )
    found = []
    known = specs(Inputs)
    for group in groups:
        reading.unknown(
            [name for name in group if name not in known], tuple(known), "key", f"{entry.where}, inputs"
        )
        values = {}
        for name, spec in known.items():
            try:
                values[name] = (
                    value_of(group[name], spec, reading.signs, f"{entry.where}, inputs")
                    if name in group
                    else None
                )
            except CatalogError as problem:
                raise reading.fault(f"{name}: {problem}", entry.where, "inputs") from None
        if values["trackers"] is None:
            raise reading.fault(
                "a group has no trackers; a group reads like {trackers = 2, max_current_a = 26}",
                entry.where,
                "inputs",
            )
        found.append(Inputs(**values))
    return tuple(found)


@cache
def marked_fields(type_: type) -> tuple[str, ...]:
    """Fields whose value has an origin and a source: all but the name."""
    return (
        *(name for name in specs(type_) if name not in ("maker", "model")),
        *(["inputs"] if type_ is Inverter else []),
    )


def _notmarked_fields(name: object, allowed: Sequence[str]) -> str:
    near = nearest(str(name), allowed)
    hint = f"did you mean {near}?" if near else "name a value as its column is named"
    return f"{name!r} is no value of this kind of record; {hint}"


def _origins(entry: Entry, reading: Reading, type_: type) -> dict[str, Origin]:
    allowed = marked_fields(type_)
    origins: dict[str, Origin] = {}
    for origin in MARKED_ORIGINS:
        names = entry.cells.get(origin.value) or []
        if not isinstance(names, list):
            raise reading.fault('is no list of fields; write it like ["noct_c"]', entry.where, origin.value)
        for name in names:
            if name not in allowed:
                raise reading.fault(_notmarked_fields(name, allowed), entry.where, origin.value)
            if name in origins:
                raise reading.fault(
                    f"{name} is marked {origins[name]} as well; keep one mark", entry.where, origin.value
                )
            origins[name] = origin
    return origins


def _text(cells: Mapping[str, Any], name: str, reading: Reading, where: str) -> str:
    try:
        return value_of(cells.get(name, ""), _TEXT[name], reading.signs) or ""
    except CatalogError as problem:
        raise reading.fault(problem, where, name) from None


def _source(entry: Entry, reading: Reading) -> Source:
    name = _text(entry.cells, "source", reading, entry.where)
    return Source(name or reading.path.name, _text(entry.cells, "source_revision", reading, entry.where))


def _sources(entry: Entry, reading: Reading, type_: type) -> dict[str, Source]:
    allowed = marked_fields(type_)
    given = entry.cells.get("sources") or {}
    if not isinstance(given, Mapping):
        raise reading.fault("is no table of sources by field", entry.where, "sources")
    found = {}
    for name, source in given.items():
        if name not in allowed:
            raise reading.fault(_notmarked_fields(name, allowed), entry.where, "sources")
        if not isinstance(source, Mapping) or not source.get("name"):
            raise reading.fault(f"{name} has no source with a name", entry.where, "sources")
        where = f"{entry.where}, sources"
        found[name] = Source(_text(source, "name", reading, where), _text(source, "revision", reading, where))
    return found


def _same_or_fault(
    entry: Entry, record: Module | Inverter, earlier: str, first: Module | Inverter, reading: Reading
) -> None:
    """Note a record that stands in the file twice; refuse it where the two differ."""
    if record == first:
        reading.note(f"is in {earlier} already, with the same values; taken once", entry.where)
        return
    differ = [name for name in marked_fields(type(record)) if getattr(record, name) != getattr(first, name)]
    what = f"another {', '.join(differ[:3])}" if differ else "other sources or origins"
    raise reading.fault(f"is in {earlier} already, with {what}; keep the right one", entry.where, "model")


def _note_defaults(records: Sequence[Module | Inverter], reading: Reading) -> None:
    unnamed = sum(r.source.name == reading.path.name for r in records)
    if unnamed:
        reading.note(f"no source is named for {_some(unnamed, 'record')}, so the file's name stands for it")
    blank = sum(
        r.origins.get("inputs") is Origin.ASSUMED and r.inputs == (Inputs(trackers=1),) for r in records
    )
    if blank:
        reading.note(
            f"no inputs are stated for {_some(blank, 'inverter')}, so one tracker is assumed; state them"
            f" like '{EXAMPLE}'"
        )


def _some(count: int, what: str) -> str:
    return f"{count:,} {what}{'' if count == 1 else 's'}"


def _check(records: Sequence[Module | Inverter], places: Sequence[str], reading: Reading) -> None:
    """Refuse what is impossible, note what is odd."""
    found = findings_of(records)
    refused = {k: some[0] for k, some in found.items() if some[0].severity == "impossible"}
    for k, finding in refused.items():
        others = (
            f" ({_some(len(refused) - 1, 'more record')} of the file cannot be either)"
            if len(refused) > 1
            else ""
        )
        raise reading.fault(f"{finding.message}{others}", places[k], finding.field)
    for k, some in found.items():
        for finding in some:
            reading.note(f"{finding.message}; kept as it is", places[k], finding.field)


def cells_of(record: Module | Inverter) -> dict[str, Any]:
    """What an entry of a record holds, in the order in which it is written; what is not known is left out.

    The id and the revision number belong to a catalog and not to the datasheet, so they are left out too.
    """
    kind = "module" if isinstance(record, Module) else "inverter"
    cells = {}
    for name in fields_of(kind):
        if name not in ABOUT and getattr(record, name) is not None:
            cells[name] = getattr(record, name)
    cells["source"] = record.source.name
    cells["source_revision"] = record.source.revision
    for origin in MARKED_ORIGINS:
        cells[origin.value] = [name for name in cells if record.origins.get(name) is origin]
    cells["sources"] = {name: source for name, source in record.sources.items() if name in cells}
    return {name: cell for name, cell in cells.items() if cell not in ("", [], {})}
