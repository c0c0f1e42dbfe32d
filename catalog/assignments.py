"""Values as people type them behind a field's name: ``max_dc_voltage_v=600``, ``inputs[1].max_isc_a=32``."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

from catalog.errors import CatalogError
from catalog.inputs_text import parse_inputs
from catalog.near import nearest
from catalog.records import FieldSpec, Inputs, Inverter, Module, Origin, specs
from catalog.sheet_values import Coefficient, DecimalSigns, value_of
from catalog.units import BASES

_FORM = re.compile(r"\s*([A-Za-z_]\w*)(?:\[(\d{1,3})\])?(?:\.(\w+))?\s*=(.*)", re.DOTALL)
EXAMPLE = "max_dc_voltage_v=600 or inputs[1].max_isc_a=32"


def changes_of(record: Module | Inverter, texts: Sequence[str]) -> dict[str, Any]:
    """Changes of a record that some texts say.

    Parameters
    ----------
    record : Module or Inverter
        As it counts now.
    texts : sequence of str
        Each ``field=value``; ``inputs`` as one line, or one value of a group of trackers (the first is 1; the number
        may be left out where there is one group). A blank value takes the value away. Numbers may carry units.

    Returns
    -------
    dict
        Values by field, as `catalog.store.Catalog.amend` takes them.

    Raises
    ------
    CatalogError
        Naming the text that is not understood.
    """
    changes: dict[str, Any] = {}
    groups: list[Inputs] | None = None
    touched: set[str] = set()
    for text in texts:
        match = _FORM.fullmatch(text)
        if not match:
            raise CatalogError(f"{text!r} is not understood: write a field and its value, like {EXAMPLE}")
        name, number, part, value = match.groups()
        if name == "inputs" and isinstance(record, Inverter):
            if part is None:
                groups, touched = list(_whole(value)), {"trackers"}
                continue
            groups = groups if groups is not None else list(record.inputs)
            touched.add(part)
            _change_group(groups, number, part, value, text)
        elif number or part:
            raise CatalogError(f"{text!r}: only an inverter's inputs have parts, like {EXAMPLE}")
        elif name in changes:
            raise CatalogError(f"{name} is given twice; give it once")
        else:
            changes[name] = value_for(_spec(record, name), value)
    if groups is not None:
        _assumed_trackers(record, touched)
        changes["inputs"] = tuple(groups)
    return relative_resolved(changes, record)


def value_for(spec: FieldSpec, text: str) -> Any:
    """Value of a field from a text; a `Coefficient` where it is in the unit of its value.

    Raises
    ------
    CatalogError
        Naming the field, and how to mend the text.
    """
    try:
        return value_of(text, spec, DecimalSigns())
    except CatalogError as problem:
        raise CatalogError(f"{spec.name}: {problem}") from None


def relative_resolved(values: Mapping[str, Any], record: Any = None) -> dict[str, Any]:
    """Values with coefficients such as mV/K in %/K, by the value at STC among them or of a record."""
    found = dict(values)
    for name, base in BASES.items():
        value = found.get(name)
        if isinstance(value, Coefficient):
            at_stc = found.get(base, getattr(record, base, None))
            if not at_stc or at_stc < 0:
                raise CatalogError(f"{name}: in {value.unit} it needs {base}; give it in %/K")
            found[name] = value.percent(at_stc)
    return found


def _spec(record: Module | Inverter, name: str) -> FieldSpec:
    known = specs(type(record))
    kind = "module" if isinstance(record, Module) else "inverter"
    if name in known:
        return known[name]
    if name in specs(Inputs) and isinstance(record, Inverter):
        raise CatalogError(f"{name} is a value of a group of trackers: write inputs[1].{name}=...")
    raise CatalogError(
        f"{kind}s have no field {name!r}{nearest(name, [*known, *(['inputs'] if kind == 'inverter' else [])])}"
    )


def _whole(text: str) -> tuple[Inputs, ...]:
    try:
        return parse_inputs(text.strip())
    except CatalogError as problem:
        raise CatalogError(f"inputs: {problem}") from None


def _change_group(groups: list[Inputs], number: str | None, part: str, value: str, text: str) -> None:
    known = specs(Inputs)
    if part not in known:
        raise CatalogError(f"{text!r}: a group of trackers has no {part!r}{nearest(part, list(known))}")
    if number is None and len(groups) > 1:
        raise CatalogError(
            f"{text!r}: there are {len(groups)} groups of trackers; say which, like inputs[1].{part}=..."
        )
    place = int(number or 1)
    if not 1 <= place <= len(groups):
        raise CatalogError(f"{text!r}: there is no group {place} of trackers; it has {len(groups)}")
    found = value_for(known[part], value)
    if found is None and known[part].required:
        raise CatalogError(f"{text!r}: every group needs {part}")
    groups[place - 1] = replace(groups[place - 1], **{part: found})


def _assumed_trackers(record: Module | Inverter, touched: set[str]) -> None:
    """A rating of trackers whose number is only assumed would make the number look entered."""
    if record.origin("inputs") is Origin.ASSUMED and "trackers" not in touched:
        given = f"inputs.{sorted(touched)[0]}=..."
        raise CatalogError(
            f"the trackers of {record.name} are assumed, not stated: say how many it has too, like"
            f" inputs.trackers=2 {given}"
        )
