"""What every record must pass on its way into the catalog."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from operator import attrgetter
from typing import Any

from catalog.errors import CatalogError
from catalog.records import FieldSpec, Inputs, Inverter, Module, Source, specs
from catalog.rows import RECORD_TYPES, content_names

_LONGEST_TEXT = 1000
_WHAT = {int: "a whole number", float: "a number", bool: "yes or no", str: "a text"}


def check_records(records: Sequence[Module | Inverter]) -> None:
    """Refuse records that are impossible.

    Raises
    ------
    CatalogError
        Naming the first such record and field, and how many more there are.
    """
    from catalog.plausibility import by_severity, findings_of

    # Values of another type would break the rules of plausibility, so types come first.
    refused = dict(_of_wrong_type(records))
    if not refused:
        for k, finding in by_severity(findings_of(records), "impossible"):
            named = finding.field in finding.message
            refused.setdefault(k, finding.message if named else f"{finding.field}: {finding.message}")
    if refused:
        k = min(refused)
        more = len(refused) - 1
        others = f" (and {more:,} more record{'s' if more > 1 else ''} like it)" if more else ""
        name = records[k].name if isinstance(records[k].name, str) else ""
        name = name.strip() or "a record without a name"
        raise CatalogError(f"{name}: {refused[k]}{others}; nothing was kept")


def checked_value(spec: FieldSpec, value: Any) -> Any:
    """A value as the type of its field; whole numbers do for numbers.

    Raises
    ------
    CatalogError
        If it is of another type, not finite, or a text that cannot be kept.
    """
    wrong = _wrong(spec, value)
    if wrong:
        raise CatalogError(f"{spec.name}: {wrong}")
    return float(value) if spec.type is float and value is not None else value


def checked_field(kind: str, name: str) -> str:
    """The name of a field that can be amended.

    Raises
    ------
    CatalogError
        If there is no such field; the nearest ones are named.
    """
    known = [*specs(RECORD_TYPES[kind]), *(["inputs"] if kind == "inverter" else [])]
    if name in ("maker", "model"):
        raise CatalogError(f"the {name} is the record's name and stays: enter a record with the right one")
    if name not in known:
        from catalog.near import nearest

        raise CatalogError(f"{kind}s have no field {name!r}{nearest(name, known)}")
    return name


def _of_wrong_type(records: Sequence[Module | Inverter]) -> Iterator[tuple[int, str]]:
    """Position of records with a value of another type than its field's, and what is wrong."""
    for kind, type_ in RECORD_TYPES.items():
        rows = [k for k, record in enumerate(records) if isinstance(record, type_)]
        chosen = [records[k] for k in rows]
        for spec in specs(type_).values():
            yield from _column(spec, map(attrgetter(spec.name), chosen), rows)
        yield from _provenance(chosen, rows, frozenset(content_names(kind)))
        if type_ is Inverter:
            groups = [(k, group) for k, record in zip(rows, chosen, strict=True) for group in record.inputs]
            for spec in specs(Inputs).values():
                yield from _column(
                    spec, (getattr(group, spec.name) for _, group in groups), [k for k, _ in groups]
                )


def _column(spec: FieldSpec, values: Iterable[Any], rows: Sequence[int]) -> Iterator[tuple[int, str]]:
    """What is wrong in the values of one field; the usual case, nothing, is found out fast."""
    values = list(values)
    usual = {spec.type, int} if spec.type is float else {spec.type}
    sound = set(map(type, values)) <= usual | {type(None)}
    # Texts repeat a lot, so each is looked at once.
    if sound and (spec.type is not str or not any(_wrong(spec, text) for text in set(values))):
        return
    for k, value in zip(rows, values, strict=True):
        wrong = None if value is None and not spec.required else _wrong(spec, value)
        if wrong:
            yield k, f"{spec.name}: {wrong}"


def _provenance(
    records: Sequence[Module | Inverter], rows: Sequence[int], known: frozenset[str]
) -> Iterator[tuple[int, str]]:
    """What is wrong in the sources and origins of records."""
    sound: set[Source] = set()
    for k, record in zip(rows, records, strict=True):
        if not (record.origins.keys() <= known and record.sources.keys() <= known):
            unknown = sorted({*record.origins, *record.sources} - known)[0]
            yield k, f"an origin or source is given for {unknown!r}, which is no value of it"
        for source in (record.source, *record.sources.values()):
            if source not in sound:
                wrong = _wrong_text(source.name) or _wrong_text(source.revision, blank=True)
                if wrong:
                    yield k, f"source: {wrong}"
                sound.add(source)


def _wrong(spec: FieldSpec, value: Any) -> str | None:
    """What is wrong with the type of a value."""
    if value is None:
        return f"{spec.meaning} is missing" if spec.required else None
    kind = type(value)
    if kind is not spec.type and not (spec.type is float and kind is int):
        return f"{value!r} is not {_WHAT[spec.type]}"
    if spec.type is str:
        return _wrong_text(value)
    return None if math.isfinite(value) else f"{value!r} is no finite number"


def _wrong_text(text: Any, *, blank: bool = False) -> str | None:
    if type(text) is not str:
        return f"{text!r} is not a text"
    if not blank and not text.strip():
        return "is blank"
    if len(text) > _LONGEST_TEXT:
        return f"{text[:20]!r}... is longer than {_LONGEST_TEXT} characters"
    if not text.isprintable():
        return f"{text!r} holds a character that cannot be printed"
    return None
