"""Cells that hold more than one value, taken apart and put together.

``inputs`` (see `catalog.inputs_text`); ``entered``, ``derived`` and ``assumed``, field names with blanks between;
``sources``, like ``max_dc_voltage_v = Installation manual [rev. 3]``, parted by ``|``, where a backslash takes its
meaning from a mark in a source's name. In the tables of others also: a range ("180 - 850 V"), dimensions
("1722 x 1134 x 30 mm"), and inputs in columns of their own.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from catalog.errors import CatalogError
from catalog.headings import OF_INPUTS
from catalog.inputs_text import format_inputs, parse_inputs
from catalog.records import Inputs, Inverter, Module, Source, specs
from catalog.sheet_entries import MARKED_ORIGINS, cells_of
from catalog.sheet_reading import Reading
from catalog.sheet_values import value_of

LISTS = tuple(origin.value for origin in MARKED_ORIGINS)

_FIGURE = r"\d[\d.,' \u00a0]*"
_RANGE = re.compile(
    rf"({_FIGURE}?)\s*(?:V\s*)?(?:-|\u2013|\u2014|~|\.\.\.?|\u2026|to|bis|/)\s*({_FIGURE}?)\s*(?:V(?:\s*dc)?)?",
    re.IGNORECASE,
)
_SIZES = re.compile(rf"({_FIGURE}?)\s*(mm|cm|m|in)?\s*[x\u00d7*]\s*({_FIGURE}?)\s*(mm|cm|m|in)?(?:\s*[x\u00d7*]\s*{_FIGURE}?\s*(mm|cm|m|in)?)?", re.IGNORECASE)  # fmt: skip


def unpacked(cells: Mapping[str, Any], where: str, reading: Reading) -> dict[str, Any]:
    """Cells of a row, those with more than one value taken apart.

    Raises
    ------
    CatalogError
        Where one is not understood.
    """
    found: dict[str, Any] = dict(cells)
    for name in LISTS:
        if cells.get(name):
            found[name] = re.split(r"[\s,;]+", str(cells[name]))
    for name, parse in (("inputs", parse_inputs), ("sources", parse_sources)):
        if cells.get(name):
            try:
                found[name] = parse(str(cells[name]))
            except CatalogError as problem:
                raise reading.fault(problem, where, name) from None
    return found


def packed(record: Module | Inverter) -> dict[str, Any]:
    """Cells of a record by field, as one row holds them: texts, numbers, yes and no."""
    row: dict[str, Any] = {"kind": "module" if isinstance(record, Module) else "inverter"}
    for name, cell in cells_of(record).items():
        if name in LISTS:
            row[name] = " ".join(cell)
        elif name == "inputs":
            row[name] = format_inputs(cell)
        elif name == "sources":
            row[name] = format_sources(cell)
        elif isinstance(cell, bool):
            row[name] = "yes" if cell else "no"
        else:
            row[name] = cell
    return row


def parse_sources(text: str) -> dict[str, dict[str, str]]:
    """Sources by field from one cell.

    Raises
    ------
    CatalogError
        Naming the part that is not understood.
    """
    found = {}
    for part in re.findall(r"(?:\\.|[^|\\])+", text, re.DOTALL):
        match = re.fullmatch(
            r"\s*(\w+)\s*=\s*((?:\\.|[^\[\\])+?)\s*(?:\[((?:\\.|[^\]\\])*)\])?\s*", part, re.DOTALL
        )
        if not match:
            raise CatalogError(
                f"{part.strip()!r} is not understood; write it like 'max_dc_voltage_v = Manual [rev. 3]'"
            )
        name, revision = (re.sub(r"\\(.)", r"\1", some or "", flags=re.DOTALL) for some in match.groups()[1:])
        found[match[1]] = {"name": name, "revision": revision}
    return found


def format_sources(sources: Mapping[str, Source]) -> str:
    """Sources by field as one cell; `parse_sources` reads it back without loss."""

    def guarded(text: str) -> str:
        return re.sub(r"([\\|\[\]])", r"\\\1", text)

    return " | ".join(
        f"{field} = {guarded(source.name)}" + (f" [{guarded(source.revision)}]" if source.revision else "")
        for field, source in sources.items()
    )


def composed_cells(
    cells: dict[str, Any], units: dict[str, str], where: str, reading: Reading
) -> dict[str, Any]:
    """Cells of a table of others: ranges, dimensions and inputs in columns of their own become fields.

    Raises
    ------
    CatalogError
        Where one is not understood.
    """
    found = {name: cell for name, cell in cells.items() if name not in ("mppt_range", "dimensions")}
    window = str(cells.get("mppt_range", "")).strip()
    if window and window not in ("-", "?", "n/a"):
        match = _RANGE.fullmatch(window)
        if not match:
            raise reading.fault(f"{window!r} is no range; write it like 180 - 850", where, "mppt_range")
        found |= {"mppt_low_v": match[1].strip(), "mppt_high_v": match[2].strip()}
        if "mppt_range" in units:
            units |= {"mppt_low_v": units["mppt_range"], "mppt_high_v": units["mppt_range"]}
    size = str(cells.get("dimensions", "")).strip()
    if size and size not in ("-", "?", "n/a"):
        found |= _sizes(size, units.get("dimensions"), where, reading)
    for name in ("length_m", "width_m"):
        if name in found and name not in units:
            found[name] = _with_unit(found[name], where, name, reading)
    if any(name in found for name in OF_INPUTS):
        own = {name: found.pop(name) for name in OF_INPUTS if name in found}
        if found.get("inputs") in (None, ""):
            found["inputs"] = _inputs(own, units, where, reading)
    return found


def _sizes(size: str, unit: str | None, where: str, reading: Reading) -> dict[str, Any]:
    match = _SIZES.fullmatch(size)
    if not match:
        raise reading.fault(f"{size!r} is no size; write it like 1722 x 1134 mm", where, "dimensions")
    unit = match[5] or match[4] or match[2] or unit
    sides = [f"{match[k].strip()} {unit}" if unit else match[k].strip() for k in (1, 3)]
    return dict(zip(("length_m", "width_m"), sides, strict=True))


def _with_unit(cell: Any, where: str, name: str, reading: Reading) -> Any:
    """A length without a unit is in m or mm; its size tells which, and where it does not, that is asked for."""
    text = str(cell).strip()
    number = re.fullmatch(r"\d+(?:[.,]\d+)?", text)
    if not number:
        return cell
    value = float(text.replace(",", "."))
    if value >= 300:
        return f"{text} mm"
    if value > 10:
        raise reading.fault(f"{text} may be cm, mm or inches; write the unit beside it", where, name)
    return cell


def _inputs(
    own: Mapping[str, Any], units: Mapping[str, str], where: str, reading: Reading
) -> tuple[Inputs, ...] | str:
    """Groups of inputs from columns; "2/1" or "26 A / 13 A" gives one value per tracker."""
    known = specs(Inputs)
    values: dict[str, list[Any]] = {}
    for name, cell in own.items():
        parts = (
            [cell]
            if not isinstance(cell, str) or name == "trackers"
            else re.split(r"\s*[/|;]\s*", cell.strip())
        )
        try:
            values[name] = [
                value_of(part, known[name], reading.signs, f"{where}, {name}", units.get(name))
                for part in parts
            ]
        except CatalogError as problem:
            raise reading.fault(problem, where, name) from None
    if not any(value is not None for some in values.values() for value in some):
        return ""
    trackers = values.pop("trackers", [None])[0]
    several = {len(some) for some in values.values() if len(some) > 1}
    if trackers is None:
        raise reading.fault(
            "ratings of a tracker are given, but not how many trackers there are; add the column, or --set trackers=1",
            where, "trackers",
        )  # fmt: skip
    if not several:
        return (Inputs(trackers=trackers, **{name: some[0] for name, some in values.items()}),)
    if several != {trackers}:
        raise reading.fault(
            f"{trackers} trackers, and values for {' or '.join(map(str, sorted(several)))} of them; give one for each",
            where, "inputs",
        )  # fmt: skip
    groups: list[Inputs] = []
    for k in range(trackers):
        group = Inputs(trackers=1, **{name: some[k if len(some) > 1 else 0] for name, some in values.items()})
        if groups and all(getattr(groups[-1], n) == getattr(group, n) for n in OF_INPUTS if n != "trackers"):
            groups[-1] = Inputs(
                trackers=groups[-1].trackers + 1,
                **{n: some[k if len(some) > 1 else 0] for n, some in values.items()},
            )
        else:
            groups.append(group)
    return tuple(groups)
