"""Numbers and ranges as they are written on the command line: ``-12,5``, ``60``, ``56..64``, ``0.9..1.4``."""

from __future__ import annotations

import re

from catalog.errors import CatalogError


#: A number with a decimal point or comma, and behind it what may say the unit.
_DEGREES = re.compile(r"([+\-\u2212]?(?:\d+(?:[.,]\d*)?|[.,]\d+)|nan)\s*(?:deg|\u00b0)?\s*([CFK]?)", re.IGNORECASE)


def degrees(text: str, option: str) -> float:
    """A temperature [degC], with a decimal point or comma.

    Raises
    ------
    CatalogError
        Where it is none, or in another unit: with what to write.
    """
    read = _DEGREES.fullmatch(text.strip())
    if read is None:
        raise CatalogError(f"{option} {text}: write the temperature in degC as a number, such as -12 or -12.5")
    value, unit = float(read[1].replace(",", ".").replace("\u2212", "-")), read[2].upper()
    if unit in ("F", "K"):
        celsius = (value - 32.0) / 1.8 if unit == "F" else value - 273.15
        name = "degF" if unit == "F" else "K"
        raise CatalogError(f"{option} {text}: temperatures are in degC; {value:g} {name} is {option} {celsius:.1f}")
    return value


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
        example = "0.9..1.4" if option == "--ratio" else "56..64"
        raise CatalogError(f"{option} {text}: write a number, or a range with two dots such as {example}") from None
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
    """An array written as strings that all face the same way, ``2x11,1x12``: (modules in series, strings) pairs.

    Raises
    ------
    CatalogError
        Where a part is not of this form.
    """
    strings, faces = array_of(text)
    if faces:
        raise CatalogError(f"--strings {text}: which way strings face plays no part here; leave @ and what follows away")
    return strings


def array_of(text: str) -> tuple[tuple[tuple[int, int], ...], tuple[tuple[float, float], ...]]:
    """An array written as strings, ``2x11,1x12``, with the way each part faces, ``2x11@170/30,1x12@260/30``.

    Returns
    -------
    (modules in series, strings) of each part, and azimuth and tilt [deg] of each, or nothing where none is given.

    Raises
    ------
    CatalogError
        Where a part is not of this form, or only some parts say how they face.
    """
    found, faces = [], []
    for part in text.replace(" ", "").split(","):
        wired, at, facing = part.lower().partition("@")
        strings, x, length = wired.partition("x")
        if not (x and strings.isdigit() and length.isdigit() and int(strings) > 0 and int(length) > 0):
            raise CatalogError(f"--strings {text}: write strings x modules in series, such as 2x11,1x12")
        found.append((int(length), int(strings)))
        if at:
            faces.append(_face(facing, text))
    if faces and len(faces) != len(found):
        raise CatalogError(f"--strings {text}: say of every part which way it faces, or of none")
    return tuple(found), tuple(faces)


def _face(text: str, whole: str) -> tuple[float, float]:
    azimuth, slash, tilt = text.partition("/")
    try:
        face = (float(azimuth), float(tilt))
    except ValueError:
        face = (-1.0, -1.0)
    if not slash or not (0 <= face[0] <= 360 and 0 <= face[1] <= 90):
        raise CatalogError(f"--strings {whole}: after @ write azimuth/tilt in degrees, such as 2x11@170/30")
    return face
