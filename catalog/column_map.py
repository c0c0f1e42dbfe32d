"""Which column of a table holds which field: proposed from the headings, corrected by people, kept for the next file."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Collection, Mapping, Sequence
from dataclasses import asdict, dataclass, replace

from catalog.errors import CatalogError
from catalog.headings import COMPOSED, OF_INPUTS, Meaning, meaning, parted, spec_of
from catalog.records import FieldSpec, Inverter, Module, specs
from catalog.units import fits, unit_of

KINDS: Mapping[str, type] = {"module": Module, "inverter": Inverter}
_ABOUT = ("source", "source_revision")


@dataclass(frozen=True, slots=True)
class MappedColumn:
    """A heading, the field that it means (``None``: left out), its unit, and whether that is beyond doubt."""

    heading: str
    field: str | None
    unit: str | None = None
    sure: bool = True
    remark: str = ""

    def __str__(self) -> str:
        if self.field is None:
            return f"{self.heading}: left out" + (f" ({self.remark})" if self.remark else "")
        spec = spec_of(self.field)
        unit = self.unit or (spec.unit if spec else "")
        shown = f" in {unit}" if unit not in ("", "1") else ""
        return f"{self.heading}: {self.field}{shown}" + ("" if self.sure else f" ? ({self.remark})")


@dataclass(frozen=True, slots=True)
class ColumnMap:
    """The columns of a table, in order, and the kind of record that its rows are."""

    kind: str
    columns: tuple[MappedColumn, ...]

    @property
    def doubtful(self) -> tuple[MappedColumn, ...]:
        """Columns that someone should confirm."""
        return tuple(c for c in self.columns if c.field is not None and not c.sure)

    @property
    def signature(self) -> str:
        """The same for tables with the same headings, whatever their rows."""
        return signature([c.heading for c in self.columns])

    def without(self, given: Collection[str] = ()) -> tuple[FieldSpec, ...]:
        """Fields that a record needs and no column gives, but for those that are ``given`` otherwise."""
        there = {*given, *(c.field for c in self.columns)}
        if COMPOSED[0] in there:
            there |= {"mppt_low_v", "mppt_high_v"}
        needed = specs(KINDS[self.kind]).values()
        return tuple(spec for spec in needed if spec.required and spec.name not in there)

    def confirmed(self) -> ColumnMap:
        """This map with every column beyond doubt."""
        return replace(
            self, columns=tuple(replace(c, sure=True, remark="") if c.field else c for c in self.columns)
        )

    def with_fields(self, changes: Mapping[str, str]) -> ColumnMap:
        """This map with the fields of some headings as they are given; a blank field leaves a column out.

        Raises
        ------
        CatalogError
            Where there is no such heading or field.
        """
        columns = list(self.columns)
        by_heading = {_key(c.heading): k for k, c in enumerate(columns)}
        for heading, name in changes.items():
            k = by_heading.get(_key(heading))
            if k is None:
                listed = ", ".join(repr(c.heading) for c in columns)
                raise CatalogError(f"no column is headed {heading!r}; the columns are {listed}")
            columns[k] = _given(columns[k].heading, name.strip(), self.kind)
        return _once(ColumnMap(self.kind, tuple(columns)), frozenset(by_heading[_key(h)] for h in changes))

    def to_bytes(self) -> bytes:
        """To keep it."""
        return json.dumps(asdict(self)).encode()

    @staticmethod
    def from_bytes(data: bytes) -> ColumnMap | None:
        """A map that was kept; ``None`` if it cannot be understood (any more)."""
        try:
            found = json.loads(data)
            columns = tuple(MappedColumn(**c) for c in found["columns"])
            allowed = {*fields_for(found["kind"]), None}
            return ColumnMap(found["kind"], columns) if all(c.field in allowed for c in columns) else None
        except (ValueError, KeyError, TypeError):
            return None


def signature(headings: Sequence[str]) -> str:
    """One text for all tables with these headings."""
    return hashlib.sha256("\x1f".join(_key(h) for h in headings).encode()).hexdigest()[:32]


def fields_for(kind: str) -> tuple[str, ...]:
    """What a column of a table of this kind may hold."""
    more = OF_INPUTS + ("inputs", COMPOSED[0]) if kind == "inverter" else (COMPOSED[1],)
    return (*specs(KINDS[kind]), *more, *_ABOUT)


def proposed(headings: Sequence[str], kind: str | None = None) -> ColumnMap:
    """What the columns of a table most likely are.

    Parameters
    ----------
    headings : sequence of str
    kind : {"module", "inverter"}, optional
        What its rows are; else the headings tell.

    Raises
    ------
    CatalogError
        If the headings could be either, or two of them mean one field beyond doubt.
    """
    found = {k: [meaning(h, k) for h in headings] for k in ([kind] if kind else KINDS)}
    score = {
        k: (sum(m.sure for m in some), sum(m.field is not None for m in some)) for k, some in found.items()
    }
    best = max(score, key=score.__getitem__)
    if len([k for k in score if score[k] == score[best]]) > 1:
        raise CatalogError("the columns may be those of modules or of inverters; say which with --kind")
    columns = [_mapped(h, m) for h, m in zip(headings, found[best], strict=True)]
    return _once(ColumnMap(best, tuple(columns)))


def _mapped(heading: str, found: Meaning) -> MappedColumn:
    return MappedColumn(heading, found.field, found.unit, found.sure or found.field is None, found.remark)


def _once(found: ColumnMap, given: frozenset[int] = frozenset()) -> ColumnMap:
    """Leave out doubtful columns of a field that another one gives; refuse two that give it beyond doubt."""
    columns = list(found.columns)
    for name in {c.field for c in columns if c.field}:
        several = [k for k, c in enumerate(columns) if c.field == name]
        if len(several) < 2:
            continue
        sure = [k for k in several if k in given] or [k for k in several if columns[k].sure] or several[:1]
        if len(sure) > 1:
            listed = " and ".join(repr(columns[k].heading) for k in sure[:2])
            raise CatalogError(
                f'{listed} both mean {name}; take one out, or leave it out with --map "{columns[sure[1]].heading}="'
            )
        for k in several:
            if k != sure[0]:
                remark = f"{name} is in {columns[sure[0]].heading!r}"
                columns[k] = MappedColumn(columns[k].heading, None, None, True, remark)
    return replace(found, columns=tuple(columns))


def _given(heading: str, text: str, kind: str) -> MappedColumn:
    """A column as someone says it is: ``voc_v``, or ``voc_v in mV``; nothing leaves it out."""
    if not text:
        return MappedColumn(heading, None)
    name, _, unit_text = text.partition(" in ")
    known = fields_for(kind)
    if name not in known:
        from catalog.near import nearest

        raise CatalogError(f"{heading!r}: there is no field {name!r}{nearest(name, known)}")
    unit = unit_of(unit_text) if unit_text else parted(heading)[1]
    spec = spec_of(name)
    if unit_text and (unit is None or spec is None or not fits(unit, spec.unit)):
        raise CatalogError(f"{heading!r}: {unit_text!r} is no unit of {name}")
    return MappedColumn(heading, name, unit if spec and unit and fits(unit, spec.unit) else None)


def _key(heading: str) -> str:
    return " ".join(heading.casefold().split())
