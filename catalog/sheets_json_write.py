"""Datasheets in the JSON of the open standard Orange Button (`catalog.orange_button`), written.

What the standard has a place for stands there. The rest of a record (origins, sources, model parameters) is written as
``ProdSpecifications``, the standard's own place for anything else, under names that begin with ``ferrule.``.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from catalog.cells import packed
from catalog.orange_button import FIELDS, PHASES, PRODUCTS, TECHNOLOGIES, TRACKER, WINDOW, WRITTEN
from catalog.records import Inputs, Inverter, Module, specs
from catalog.sheet_entries import KINDS
from catalog.sheets_json import MOST_TRACKERS, OWN
from catalog.units import converted


def write_json(path: Path, records: Sequence[Module | Inverter]) -> None:
    """Write records as a list of product objects."""
    text = json.dumps([_product(record) for record in records], ensure_ascii=False, allow_nan=False, indent=1)
    path.write_text(text + "\n", encoding="utf-8", newline="\n")


def _product(record: Module | Inverter) -> dict[str, Any]:
    kind = "module" if isinstance(record, Module) else "inverter"
    product: dict[str, Any] = {"ProdType": {"Value": PRODUCTS[kind]}}
    rest = packed(record)
    rest.pop("kind")
    for name, place in FIELDS[kind].items():
        value = getattr(record, name)
        element = None if value is None else _element(name, value, specs(KINDS[kind])[name].unit)
        if element is not None:
            _put(product, place, element)
            del rest[name]
    if isinstance(record, Module):
        _put(product, ("ModuleElectRatings", "ModuleRatingCondition"), {"Value": "STC"})
        _put(product, ("ModuleElectRatings", "PowerDC"), {"Value": record.pmax_w, "Unit": "W"})
    else:
        _put_trackers(product, record, rest)
    product["ProdSpecifications"] = [
        {"SpecificationName": {"Value": OWN + name}, "SpecificationValue": {"Value": _text(cell)}}
        for name, cell in rest.items()
    ]
    return product


def _text(cell: Any) -> str:
    return repr(cell) if isinstance(cell, float) else str(cell)


def _element(name: str, value: Any, unit: str) -> dict[str, Any] | None:
    """A value as an element of the standard; ``None`` where the standard cannot hold it exactly."""
    words = {"technology": TECHNOLOGIES, "phases": PHASES}.get(name)
    if words:
        return next(({"Value": word} for word, own in words.items() if own == value), None)
    if unit == "%":
        share = float(f"{value / 100:.15g}")
        return {"Value": share, "Unit": WRITTEN[unit]} if converted(share, "fraction", "%") == value else None
    return {"Value": value, "Unit": WRITTEN[unit]} if unit in WRITTEN else {"Value": value}


def _put(product: dict[str, Any], path: Sequence[str], element: dict[str, Any]) -> None:
    node: Any = product
    for key in path[:-1]:
        new: Any = [{}] if key in ("ModuleElectRatings", "ACOutputs") else {}
        node = node.setdefault(key, new)
        node = node[0] if isinstance(node, list) else node
    node[path[-1]] = element


def _put_trackers(product: dict[str, Any], record: Inverter, rest: dict[str, Any]) -> None:
    """Trackers one by one, each with the window; groups that this does not show stay among the rest too."""
    window = {key: {"Value": getattr(record, name), "Unit": "V"} for name, key in WINDOW.items()}
    known = specs(Inputs)
    listed = []
    for group in record.inputs:
        ratings = {
            key: {"Value": getattr(group, name)} | ({"Unit": known[name].unit} if known[name].unit else {})
            for name, key in TRACKER.items()
            if getattr(group, name) is not None
        }
        listed += [window | ratings] * min(group.trackers, MOST_TRACKERS)
    dc = product.setdefault("DCInput", {})
    dc["MPPTNumber"] = {"Value": len(listed)}
    dc["MPPTs"] = listed
    for name in WINDOW:
        del rest[name]
