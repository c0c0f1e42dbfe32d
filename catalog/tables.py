"""The tables of a catalog, as SQLModel classes; columns of values come from the fields of `catalog.records`.

A record is a name. What is known of it stands in its revisions: each holds all values, so that any of them
can be read alone, and none is ever changed. ``record.current`` tells which one counts. A change to a table
here is a new schema version: see `catalog.schema`.
"""

from __future__ import annotations

from pydantic import create_model
from sqlalchemy import ForeignKeyConstraint, Text, UniqueConstraint
from sqlmodel import Field, SQLModel

from catalog.records import Inputs, Inverter, Module, Site, specs


class SourceRow(SQLModel, table=True):
    """A document that values were read from."""

    __tablename__ = "source"
    __table_args__ = (UniqueConstraint("name", "revision"),)

    id: int = Field(primary_key=True, sa_column_kwargs={"autoincrement": False})
    name: str
    revision: str
    first_seen: str


class RecordRow(SQLModel, table=True):
    """The name of a module or inverter type, and the number of the revision that counts."""

    __tablename__ = "record"
    __table_args__ = (UniqueConstraint("kind", "maker", "model"),)

    id: int = Field(primary_key=True, sa_column_kwargs={"autoincrement": False})
    kind: str
    maker: str
    model: str
    current: int


class RevisionBase(SQLModel):
    """What revisions of modules and of inverters have in common.

    ``act`` tells how it came about, ``previous`` what counted before. ``source_id`` is the document of the
    values, but for those in ``sources``; ``act_source_id`` is the document of this act. Origins and sources
    are JSON objects by field name that hold only the exceptions.
    """

    record_id: int = Field(primary_key=True, foreign_key="record.id")
    revision: int = Field(primary_key=True)
    previous: int | None
    act: str
    source_id: int = Field(foreign_key="source.id")
    act_source_id: int = Field(foreign_key="source.id")
    created_at: str
    note: str
    origins: str = Field(sa_type=Text)
    sources: str = Field(sa_type=Text)


class SiteBase(SQLModel):
    """A site; its name is unique whatever its case."""

    name_key: str = Field(primary_key=True)
    mounting: str


class StockRow(SQLModel, table=True):
    """A line of a stock list: how many of an article lie where, at what price, and which record it means."""

    __tablename__ = "stock"

    id: int = Field(primary_key=True, sa_column_kwargs={"autoincrement": False})
    kind: str | None
    record_id: int | None = Field(foreign_key="record.id")
    quantity: int
    unit_price: float | None
    currency: str | None
    place: str
    article: str
    text: str = Field(sa_type=Text)
    named: str = Field(sa_type=Text)
    confidence: str
    source_id: int = Field(foreign_key="source.id")
    loaded_at: str


class DecisionRow(SQLModel, table=True):
    """Which record a person said that a supplier's article means; no record: none of the catalog."""

    __tablename__ = "stock_decision"

    article_key: str = Field(primary_key=True)
    text_key: str = Field(primary_key=True, sa_type=Text)
    record_id: int | None = Field(foreign_key="record.id")
    decided_at: str


class KeptRow(SQLModel, table=True):
    """Something computed that is worth keeping; it can be thrown away at any time."""

    __tablename__ = "kept"

    key: str = Field(primary_key=True)
    data: bytes
    made_at: str


class MetaRow(SQLModel, table=True):
    """Facts of the catalog itself: its schema version."""

    __tablename__ = "meta"

    key: str = Field(primary_key=True)
    value: str


class InputsBase(SQLModel):
    """A tracker group of one revision of an inverter."""

    __table_args__ = (
        ForeignKeyConstraint(
            ["record_id", "revision"], ["inverter_revision.record_id", "inverter_revision.revision"]
        ),
    )

    record_id: int = Field(primary_key=True)
    revision: int = Field(primary_key=True)
    position: int = Field(primary_key=True)


def _table(name: str, base: type[SQLModel], record_type: type) -> type[SQLModel]:
    """A table with the columns of a base class and one column per value field of a record type."""
    columns = {
        spec.name: (spec.type, ...) if spec.required else (spec.type | None, None)
        for spec in specs(record_type).values()
        if spec.name not in RecordRow.model_fields
    }
    return create_model(name, __base__=base, __module__=__name__, __cls_kwargs__={"table": True}, **columns)


ModuleRow = _table("module_revision", RevisionBase, Module)
InverterRow = _table("inverter_revision", RevisionBase, Inverter)
InputsRow = _table("inputs", InputsBase, Inputs)
SiteRow = _table("site", SiteBase, Site)

REVISION_ROWS = {"module": ModuleRow, "inverter": InverterRow}
