"""Datasheets in the JSON of the open standard Orange Button (`catalog.orange_button`), read.

What a record has no field for is kept aside and named; what `catalog.sheets_json_write` put beside the standard's own
places is taken back.
"""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from catalog.cells import unpacked
from catalog.errors import CatalogError
from catalog.headings import spec_of
from catalog.inputs_text import format_inputs
from catalog.orange_button import (
    ELSEWHERE,
    FIELDS,
    PHASES,
    PRODUCTS,
    TECHNOLOGIES,
    TRACKER,
    UNITS,
    WINDOW,
)
from catalog.records import Inputs, Inverter, specs
from catalog.sheet_entries import fields_of
from catalog.sheet_reading import Entry, Reading
from catalog.sheet_values import usable, value_of

#: Names of what `catalog.sheets_json_write` puts beside the standard's own places begin so.
OWN = "ferrule."
_DEEPEST = 6
MOST_TRACKERS = 200
#: Parts of a product that say nothing a datasheet record could hold, or that are taken in another way.
_TAKEN = {
    ("ProdType",),
    ("ModuleElectRatings", "ModuleRatingCondition"),
    ("ProdDatasheetURL",),
    ("DCInput", "MPPTNumber"),
}


def read_entries(text: str, reading: Reading) -> list[Entry]:
    """Entries of a JSON text: product objects, alone, in lists, or anywhere below.

    Raises
    ------
    CatalogError
        If the text is no JSON, or holds no such object.
    """
    try:
        data = json.loads(text, parse_constant=_no_constant)
        products = list(_products(data, "", 0))
    except json.JSONDecodeError as problem:
        raise reading.fault(f"is no valid JSON: {problem.msg}", f"line {problem.lineno}") from None
    except (ValueError, RecursionError) as problem:
        raise reading.fault(f"is no JSON that can be read: {problem}") from None
    if not products:
        raise reading.fault(
            "has no object ProdModule or ProdInverter of the Orange Button standard; give each product its ProdType"
        )
    counts: Counter[str] = Counter()
    entries = []
    names = Counter(_name(product, "ProdName") for _, product in products)
    for kind, product in products:
        counts[kind] += 1
        entries.append(_entry(kind, product, counts[kind], names, reading))
    return entries


def _no_constant(name: str) -> None:
    raise ValueError(f"{name} is no number")


def _products(data: Any, key: str, depth: int) -> Iterator[tuple[str, Mapping[str, Any]]]:
    """Kind and object of every product in a document."""
    if depth > _DEEPEST:
        return
    if isinstance(data, list):
        for item in data:
            yield from _products(item, key, depth + 1)
    elif isinstance(data, dict):
        kind = _kind(data, key)
        if kind:
            yield kind, data
        else:
            for name, item in data.items():
                yield from _products(item, name, depth + 1)


def _kind(product: Mapping[str, Any], key: str) -> str | None:
    stated = _plain(product.get("ProdType"))
    for kind, name in PRODUCTS.items():
        if stated == name or (stated is None and key.removesuffix("s") == name):
            return kind
    if stated is None:
        if "ModuleElectRatings" in product or "PowerSTC" in product:
            return "module"
        if "DCInput" in product or "ACOutputs" in product:
            return "inverter"
    return None


def _plain(node: Any) -> Any:
    """Value of an element; ``None`` where there is none."""
    value = node.get("Value") if isinstance(node, dict) else node
    return None if isinstance(value, (dict, list)) else value


def _name(product: Mapping[str, Any], key: str) -> tuple[str, str]:
    return str(_plain(product.get("ProdMfr"))), str(_plain(product.get(key)))


def _entry(
    kind: str, product: Mapping[str, Any], number: int, names: Mapping[tuple[str, str], int], reading: Reading
) -> Entry:
    places = dict(FIELDS[kind])
    own = _own_values(product, kind)
    # A series sold in several power classes shares its name; the code then tells them apart.
    if names[_name(product, "ProdName")] > 1 and _plain(product.get("ProdCode")) and "model" not in own:
        places["model"] = ("ProdCode",)
    said = " ".join(
        str(own.get(name) or _plain(_at(product, places[name])) or "") for name in ("maker", "model")
    ).strip()
    where = f"{PRODUCTS[kind]} {number}" + (f" ({said[:80]})" if said and said.isprintable() else "")
    taken = set(_TAKEN)
    cells: dict[str, Any] = {}
    units: dict[str, str] = {}
    for name, path in places.items():
        node = _at(product, path)
        if _plain(node) is None and name in ELSEWHERE:
            path = ELSEWHERE[name]
            node = _at(product, path)
        if _plain(node) is None:
            continue
        taken.add(path)
        cells[name] = _cell(name, _plain(node))
        unit = _unit(node, where, name, reading)
        if unit:
            units[name] = unit
    if kind == "inverter":
        taken |= _trackers(product, cells, units, where, reading)
    if _plain(product.get("ProdDatasheetURL")):
        cells["source"] = _plain(product["ProdDatasheetURL"])
    for name, text in own.items():
        cells[name] = text
        units.pop(name, None)
    left = [path for path in _leaves(product, ()) if path not in taken and path[0] != "ProdSpecifications"]
    left += [("ProdSpecifications",)] if _foreign_specifications(product) else []
    if left:
        reading.note(f"kept aside, no field for it: {_listed(left)}", where)
    return Entry(where, kind, unpacked(cells, where, reading), {}, units)


def _listed(paths: Sequence[tuple[str, ...]]) -> str:
    return ", ".join(dict.fromkeys(".".join(path) for path in paths))


def _cell(name: str, value: Any) -> Any:
    if name == "technology":
        return TECHNOLOGIES.get(str(value), value)
    if name == "phases":
        return PHASES.get(str(value), value)
    return value


def _unit(node: Any, where: str, name: str, reading: Reading) -> str | None:
    """Unit of an element in the spelling of `catalog.units`."""
    stated = node.get("Unit") if isinstance(node, dict) else None
    if stated in (None, ""):
        return "fraction" if name == "weighted_efficiency_pct" else None
    unit = UNITS.get(stated) if isinstance(stated, str) else None
    spec = spec_of(name)
    if unit is None or spec is None or not usable(unit, spec):
        raise reading.fault(f"is in {stated!r}, which is no unit of it that is known", where, name)
    return unit


def _at(product: Any, path: Sequence[str]) -> Any:
    """Element at a path; of a list the first, of electrical ratings those at STC."""
    node = product
    for key in path:
        node = node.get(key) if isinstance(node, dict) else None
        if isinstance(node, list):
            node = _stc(node) if key == "ModuleElectRatings" else next(iter(node), None)
    return node


def _stc(ratings: Sequence[Any]) -> Any:
    sound = [rating for rating in ratings if isinstance(rating, dict)]
    return next((r for r in sound if _plain(r.get("ModuleRatingCondition")) == "STC"), None)


def _leaves(node: Any, path: tuple[str, ...]) -> Iterator[tuple[str, ...]]:
    """Paths of all values below a node that are not taken as the first of a list or at STC."""
    if isinstance(node, dict) and "Value" not in node:
        for key, item in node.items():
            yield from _leaves(item, (*path, str(key)))
    elif isinstance(node, list):
        first = _stc(node) if path == ("ModuleElectRatings",) else next(iter(node), None)
        for item in node:
            for leaf in _leaves(item, path):
                yield (
                    leaf
                    if item is first or path == ("DCInput", "MPPTs")
                    else (*leaf[:-1], f"{leaf[-1]} (another)")
                )
    elif _plain(node) is not None:
        yield path


def _trackers(
    product: Mapping[str, Any], cells: dict[str, Any], units: dict[str, str], where: str, reading: Reading
) -> set[tuple[str, ...]]:
    """Take the trackers (``DCInput.MPPTs``) into cells; returns the paths that were taken."""
    dc = product.get("DCInput") if isinstance(product.get("DCInput"), dict) else {}
    listed = (
        [m for m in dc.get("MPPTs", []) if isinstance(m, dict)] if isinstance(dc.get("MPPTs"), list) else []
    )
    known = specs(Inputs) | specs(Inverter)

    def value(mppt: Mapping[str, Any], name: str, key: str) -> Any:
        node = mppt.get(key)
        try:
            return value_of(
                "" if _plain(node) is None else _plain(node),
                known[name],
                reading.signs,
                "",
                _unit(node, where, name, reading),
            )
        except CatalogError as problem:
            raise (
                problem if str(problem).startswith(str(reading.path)) else reading.fault(problem, where, key)
            ) from None

    ends = {
        name: [v for m in listed if (v := value(m, name, key)) is not None] for name, key in WINDOW.items()
    }
    for name, some in ends.items():
        if some:
            cells[name] = max(some) if name == "mppt_low_v" else min(some)
            if len(set(some)) > 1:
                reading.note(f"differs between trackers; {cells[name]:g} V holds for all", where, name)
    groups: list[Inputs] = []
    for mppt in listed[: MOST_TRACKERS + 1]:
        ratings = {name: value(mppt, name, key) for name, key in TRACKER.items()}
        last = groups[-1] if groups else None
        if last and all(getattr(last, name) == rating for name, rating in ratings.items()):
            groups[-1] = Inputs(trackers=last.trackers + 1, **ratings)
        else:
            groups.append(Inputs(trackers=1, **ratings))
    number = _plain(dc.get("MPPTNumber"))
    if isinstance(number, int) and not isinstance(number, bool) and 0 < number <= MOST_TRACKERS:
        if len(groups) == 1 and groups[0].trackers == 1:
            # One element that stands for all trackers alike.
            groups = [Inputs(trackers=number, **{name: getattr(groups[0], name) for name in TRACKER})]
        elif not groups:
            groups = [Inputs(trackers=number)]
        elif len(listed) != number:
            raise reading.fault(
                f"is {number}, but {len(listed)} trackers are listed; correct one of them",
                where,
                "MPPTNumber",
            )
    if groups:
        cells["inputs"] = format_inputs(groups)
    return {("DCInput", "MPPTs", key) for key in (*WINDOW.values(), *TRACKER.values())}


def _own_values(product: Mapping[str, Any], kind: str) -> dict[str, Any]:
    """What `catalog.sheets_json_write` wrote beside the standard's own places."""
    listed = product.get("ProdSpecifications")
    found = {}
    for item in listed if isinstance(listed, list) else ():
        name = _specification(item)
        if name in fields_of(kind):
            found[name] = _plain(item.get("SpecificationValue"))
    return {name: "" if value is None else value for name, value in found.items()}


def _specification(item: Any) -> str | None:
    name = _plain(item.get("SpecificationName")) if isinstance(item, dict) else None
    return name.removeprefix(OWN) if isinstance(name, str) and name.startswith(OWN) else None


def _foreign_specifications(product: Mapping[str, Any]) -> bool:
    listed = product.get("ProdSpecifications")
    return bool(listed) and not (isinstance(listed, list) and all(_specification(item) for item in listed))
