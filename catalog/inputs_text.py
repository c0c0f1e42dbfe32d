"""Groups of inputs as one line that reads like a datasheet.

``2 trackers: 2 strings, 26 A, Isc 32 A | 1 tracker: 13 A``: groups are parted by ``|``. After the number of
trackers stands what is known of one tracker: strings, operating current, short-circuit current (with ``Isc``
before it), power. What is left out is not known.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

from catalog.errors import CatalogError
from catalog.records import Inputs

EXAMPLE = "2 trackers: 2 strings, 26 A, Isc 32 A | 1 tracker: 1 string, 13 A"

_NUMBER = r"(\d+(?:\.\d+)?(?:e[+-]?\d+)?)"
_ITEMS = (
    ("strings_per_tracker", re.compile(r"(\d{1,9}) ?strings?"), int),
    ("max_isc_a", re.compile(rf"isc {_NUMBER} ?a"), float),
    ("max_current_a", re.compile(rf"{_NUMBER} ?a"), float),
    ("max_power_w", re.compile(rf"{_NUMBER} ?w"), float),
)


def format_inputs(groups: Iterable[Inputs]) -> str:
    """Groups of inputs as one line; `parse_inputs` reads it back without loss."""
    return " | ".join(_format_group(group) for group in groups)


def _format_group(group: Inputs) -> str:
    known = []
    if group.strings_per_tracker is not None:
        known.append(f"{group.strings_per_tracker} string{'s' if group.strings_per_tracker != 1 else ''}")
    if group.max_current_a is not None:
        known.append(f"{_plain(group.max_current_a)} A")
    if group.max_isc_a is not None:
        known.append(f"Isc {_plain(group.max_isc_a)} A")
    if group.max_power_w is not None:
        known.append(f"{_plain(group.max_power_w)} W")
    trackers = f"{group.trackers} tracker{'s' if group.trackers != 1 else ''}"
    return f"{trackers}: {', '.join(known)}" if known else trackers


def _plain(value: float) -> str:
    return repr(float(value)).removesuffix(".0")


def parse_inputs(text: str) -> tuple[Inputs, ...]:
    """Groups of inputs from one line.

    Parameters
    ----------
    text : str
        Like ``2 trackers: 2 strings, 26 A, Isc 32 A | 1 tracker: 1 string, 13 A``.

    Raises
    ------
    CatalogError
        Naming the part that is not understood.
    """
    return tuple(_parse_group(part.strip()) for part in text.split("|"))


def _parse_group(text: str) -> Inputs:
    head, _, tail = text.partition(":")
    trackers = re.fullmatch(r"(\d{1,9}) ?trackers?", head.strip().casefold())
    if not trackers:
        raise CatalogError(f"{text!r} does not begin with a number of trackers; write it like '{EXAMPLE}'")
    found: dict[str, float] = {}
    for item in filter(None, (part.strip() for part in tail.split(","))):
        name, value = _parse_item(item)
        if name in found:
            raise CatalogError(f"{text!r} has two values for {name}; write each once, with a decimal point")
        found[name] = value
    return Inputs(trackers=int(trackers[1]), **found)


def _parse_item(item: str) -> tuple[str, float]:
    words = " ".join(item.casefold().split())
    for name, pattern, type_ in _ITEMS:
        match = pattern.fullmatch(words)
        if match:
            return name, type_(match[1])
    raise CatalogError(f"{item!r} is not understood; write it like '{EXAMPLE}', with decimal points")
