"""What is measured: public tables, a weather file and a site; all from what pvlib installs."""

from __future__ import annotations

from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING

from catalog.records import Inverter, Module, Site

if TYPE_CHECKING:
    from matcher.moduleyear import PlaneYear

SITE = Site(name="Benchmark", design_low_c=-12.0, design_high_c=38.0)
DC_LOSS_PCT = 2.0

#: A module of 60 cells and ordinary size.
MODULE = "CS6K-270P"


@cache
def modules() -> list[Module]:
    """The public module table."""
    from catalog.cec import read_cec_modules

    return read_cec_modules()


@cache
def inverters() -> list[Inverter]:
    """The public inverter table."""
    from catalog.cec import read_cec_inverters

    return read_cec_inverters()


def module() -> Module:
    """The one module of the questions about one module."""
    return next(m for m in modules() if m.model == MODULE)


@cache
def plane() -> PlaneYear:
    """A typical year of Greensboro on a roof of 30 degrees to the south."""
    import pvlib

    from matcher.moduleyear import plane_year
    from matcher.weather import read_weather

    return plane_year(read_weather(Path(pvlib.__file__).parent / "data" / "723170TYA.CSV"), 30.0, 180.0)
