"""A newer revision of a table meets a record that people have since worked on.

What a table or sheet states is one layer, what people amended another. A later load takes the place of the
values of its own earlier load, and leaves what was entered by hand or read from another document since.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from functools import cache
from operator import attrgetter
from typing import TYPE_CHECKING, TypeVar

from catalog.records import Inverter, Module, Origin, Source
from catalog.rows import content_names, kind_of

if TYPE_CHECKING:
    from collections.abc import Mapping

Record = TypeVar("Record", Module, Inverter)

_RANK = {Origin.ASSUMED: 0, Origin.DERIVED: 1, Origin.STATED: 2, Origin.ENTERED: 3}


def same(one: Module | Inverter, other: Module | Inverter) -> bool:
    """Whether two records say the same, whatever their id, revision and source."""
    content = _content(kind_of(one))
    return (
        content(one) == content(other)
        and dict(one.origins) == dict(other.origins)
        and dict(one.sources) == dict(other.sources)
    )


def merged(current: Record, loaded: Record, before: Record | None) -> Record:
    """What counts after a load.

    Parameters
    ----------
    current : Module or Inverter
        What counted until now.
    loaded : Module or Inverter
        What the table or sheet says now.
    before : Module or Inverter, optional
        What the same table or sheet said when it was last loaded.

    Returns
    -------
    Module or Inverter
        For each value: if the current one is from the earlier load, the loaded one. If it was entered, or
        read from another document, it stays, unless the loaded one is itself an entered one and new. With no
        earlier load: the loaded one if it has at least the standing of the current (entered, stated, derived,
        assumed).
    """
    family = loaded.source.name
    values, origins, sources = {}, {}, {}
    for name in content_names(kind_of(loaded)):
        taken = loaded if _takes(name, current, loaded, before, family) else current
        values[name] = getattr(taken, name)
        if name in taken.origins:
            origins[name] = taken.origins[name]
        if values[name] is not None or name in taken.origins:
            sources[name] = taken.source_of(name)
    source = _commonest(sources, loaded.source)
    return replace(
        loaded,
        **values,
        source=source,
        origins=origins,
        sources={name: own for name, own in sources.items() if own != source},
    )


@cache
def _content(kind: str) -> attrgetter:
    """All that a record of a kind says, as a tuple."""
    return attrgetter(*content_names(kind))


def _takes(name: str, current: Record, loaded: Record, before: Record | None, family: str) -> bool:
    """Whether the loaded value of a field takes the place of the current one."""
    new, old = getattr(loaded, name), getattr(current, name)
    new_origin = loaded.origins.get(name, Origin.STATED)
    old_origin = current.origins.get(name, Origin.STATED)
    entered = old_origin is Origin.ENTERED
    if old is None and not entered:
        return True
    news = before is None or new != getattr(before, name)
    if news and new is not None and new_origin is Origin.ENTERED:
        return True
    if entered:
        return False
    if current.source_of(name).name == family:
        return True
    return before is None and new is not None and _RANK[new_origin] >= _RANK[old_origin]


def _commonest(sources: Mapping[str, Source], preferred: Source) -> Source:
    """The document that most values are from, so that the fewest need a source of their own."""
    count = Counter(sources.values())
    return max(count, key=lambda source: (count[source], source == preferred), default=preferred)
