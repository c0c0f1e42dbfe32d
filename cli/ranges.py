"""Ranges as they are written on the command line: ``60``, ``56..64``, ``0.9..1.4``."""

from __future__ import annotations

from catalog.errors import CatalogError


def number_range(text: str, option: str) -> tuple[float, float]:
    """Lowest and highest of a range of numbers.

    Raises
    ------
    CatalogError
        Where it is no range, is upside down, or is not above 0.
    """
    low, dots, high = text.replace(",", ".").partition("..")
    try:
        bounds = (float(low), float(high if dots else low))
    except ValueError:
        raise CatalogError(f"{option} {text}: write a number, or a range with two dots such as 0.9..1.4") from None
    if not 0 < bounds[0] <= bounds[1] < float("inf"):
        raise CatalogError(f"{option} {text}: the range must be above 0 and run from low to high")
    return bounds


def whole_range(text: str, option: str) -> tuple[int, int]:
    """Lowest and highest of a range of whole numbers; raises as `number_range` does."""
    low, high = number_range(text, option)
    if low != int(low) or high != int(high):
        raise CatalogError(f"{option} {text}: write whole numbers, such as 60 or 56..64")
    return int(low), int(high)


def strings_of(text: str) -> tuple[tuple[int, int], ...]:
    """An array written as strings, ``2x11,1x12``: (modules in series, strings) pairs.

    Raises
    ------
    CatalogError
        Where a part is not of this form.
    """
    found = []
    for part in text.replace(" ", "").split(","):
        strings, x, length = part.lower().partition("x")
        if not (x and strings.isdigit() and length.isdigit() and int(strings) > 0 and int(length) > 0):
            raise CatalogError(f"--strings {text}: write strings x modules in series, such as 2x11,1x12")
        found.append((int(length), int(strings)))
    return tuple(found)
