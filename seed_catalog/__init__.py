"""The demo: an invented distributor with invented makers, models, sites, stock and bundles. See README.md there."""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path


def path(name: str) -> Path:
    """Path of one of the demo's files, such as ``"modules.toml"``.

    Raises
    ------
    FileNotFoundError
        If the demo has no such file.
    """
    found = Path(str(files("seed_catalog").joinpath(name)))
    if not found.is_file():
        raise FileNotFoundError(f"the demo has no file {name!r}")
    return found
