"""Read the public CEC tables of modules and inverters into records.

pvlib installs one of each; newer ones of the same form are read from a path.

What the inverter table does not say. Its ``Vdcmax`` repeats ``Mppt_high`` in every row: it is the top of the
tested window and no maximum input voltage, so ``max_dc_voltage_v`` stays unknown. Its ``Idcmax`` is
``Pdco / Vdco``: an operating point and no rating, so it is kept as derived and limits nothing. Of trackers it
says nothing: one is assumed.
"""

from __future__ import annotations

import csv
import re
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Literal

from catalog.cec_table import CecTable, number, read_table
from catalog.makers import split_maker
from catalog.records import SANDIA_PARAMETERS, SIX_PARAMETERS, Inputs, Inverter, Module, Origin, Source

MODULE_COLUMNS = (
    ("Name", "Technology", "Bifacial", "STC", "Length", "Width", "N_s")
    + ("I_sc_ref", "V_oc_ref", "I_mp_ref", "V_mp_ref", "alpha_sc", "beta_oc", "T_NOCT", "gamma_r")
    + SIX_PARAMETERS
)
INVERTER_COLUMNS = ("Name", "Vac", "Pnt", "Idcmax", "Mppt_low", "Mppt_high") + SANDIA_PARAMETERS

_NOMINAL_VAC = frozenset({"208", "240", "277", "480", "600"})  # of North America [V]


def cec_kind(path: Path) -> Literal["module", "inverter"] | None:
    """Which CEC table a file is, judged by its heading; ``None`` if it is neither or cannot be read.

    Parameters
    ----------
    path : Path
        Any file.
    """
    try:
        with Path(path).open(encoding="utf-8-sig", newline="") as file:
            heading = {cell.strip() for cell in next(csv.reader(file), [])}
    except (OSError, UnicodeDecodeError, csv.Error):
        return None
    if {"Name", *SIX_PARAMETERS} <= heading:
        return "module"
    return "inverter" if {"Name", *SANDIA_PARAMETERS} <= heading else None


def read_cec_modules(path: Path | None = None) -> list[Module]:
    """Read a CEC module table.

    Parameters
    ----------
    path : Path, optional
        The CSV file; without it, the newest table that pvlib installs.

    Returns
    -------
    list of Module
        In the order of the table. A blank cell is ``None``. Temperature coefficients are percent of the STC
        value per kelvin.

    Raises
    ------
    CatalogError
        If the file is missing, cut off or no such table, or a cell cannot be read.
    """
    table = read_table("module", path, MODULE_COLUMNS, {"gamma_r": "gamma_pmp"})
    names = _split(table, _module_name)
    voc, isc = table.needed("V_oc_ref"), table.needed("I_sc_ref")
    columns = {
        "technology": table.each("Technology", _text),
        "bifacial": table.each("Bifacial", _flag),
        "cells_in_series": table.each("N_s", _whole),
        "pmax_w": table.needed("STC"),
        "voc_v": voc,
        "isc_a": isc,
        "vmp_v": table.needed("V_mp_ref"),
        "imp_a": table.needed("I_mp_ref"),
        "voc_coef_pct": _percent(table.numbers("beta_oc"), voc),
        "isc_coef_pct": _percent(table.numbers("alpha_sc"), isc),
        "pmax_coef_pct": table.numbers("gamma_r"),
        "noct_c": table.numbers("T_NOCT"),
        "length_m": table.numbers("Length"),
        "width_m": table.numbers("Width"),
    } | {name: table.numbers(name) for name in SIX_PARAMETERS}
    source = Source("CEC module table", table.revision("Date"))
    keys = tuple(columns)
    return [
        Module(maker=maker, model=model, source=source, **dict(zip(keys, values)))
        for (maker, model), values in zip(names, zip(*columns.values()))
    ]


def read_cec_inverters(path: Path | None = None) -> list[Inverter]:
    """Read a CEC inverter table.

    The model keeps the nominal voltage that the table writes behind it ("SHO-5.2 [240V]"): most models are
    listed once per voltage. Where the voltage column is empty, the voltage is taken from the name if the name
    states it beyond doubt.

    Parameters
    ----------
    path : Path, optional
        The CSV file; without it, the newest table that pvlib installs.

    Returns
    -------
    list of Inverter
        In the order of the table. A blank cell is ``None``.

    Raises
    ------
    CatalogError
        If the file is missing, cut off or no such table, or a cell cannot be read.
    """
    table = read_table("inverter", path, INVERTER_COLUMNS)
    names = _split(table, _inverter_name)
    power, night = table.needed("Paco"), table.numbers("Pnt")
    columns = {
        "ac_power_w": power,
        "mppt_low_v": table.needed("Mppt_low"),
        "mppt_high_v": table.needed("Mppt_high"),
        "night_w": night,
        "Pnt": night,
        "operating_dc_current_a": table.numbers("Idcmax"),
    } | {name: table.numbers(name) for name in SANDIA_PARAMETERS}
    source = Source("CEC inverter table", table.revision("CEC_Date"))
    usual = {"inputs": Origin.ASSUMED, "operating_dc_current_a": Origin.DERIVED}
    from_name = usual | {"ac_voltage_v": Origin.DERIVED}
    one_tracker = (Inputs(trackers=1),)
    keys = tuple(columns)
    records = []
    volts = table.each("Vac", _volts)
    for (maker, model), stated, watts, values in zip(names, volts, power, zip(*columns.values())):
        named = None if stated else _voltage_in_name(model, watts)
        records.append(
            Inverter(
                maker=maker,
                model=model,
                ac_voltage_v=stated or named,
                inputs=one_tracker,
                source=source,
                origins=from_name if named else usual,
                **dict(zip(keys, values)),
            )
        )
    return records


def _split(table: CecTable, split: Callable[[str, str], tuple[str, str]]) -> list[tuple[str, str]]:
    """Maker and model of every row; each pair once."""
    makers = table.cells.get("Manufacturer") or [""] * len(table.rows)
    names = [split(name, maker) for name, maker in zip(table.cells["Name"], makers)]
    for k, (maker, model) in enumerate(names):
        if not (maker and model):
            name = table.cells["Name"][k]
            raise table.error(k, "Name", f"{name!r} is no maker with a model; correct the name")
    if len(set(names)) < len(names):
        first: dict[tuple[str, str], int] = {}
        k = next(k for k, name in enumerate(names) if first.setdefault(name, k) != k)
        name, earlier = table.cells["Name"][k], table.rows[first[names[k]]]
        raise table.error(k, "Name", f"{name!r} stands in row {earlier} too; take one of them out")
    return names


def _module_name(name: str, maker: str) -> tuple[str, str]:
    """Maker and model of "Maker Model"; the maker from its own column where the table has one."""
    if maker:
        name, maker = " ".join(name.split()), " ".join(maker.split())
        if name.startswith(maker + " "):
            return maker, name[len(maker) + 1 :]
    return split_maker(name)


def _inverter_name(name: str, _maker: str) -> tuple[str, str]:
    """Maker and model of "Maker: Model [240V]"; question marks at the end are what a faulty encoding left."""
    maker, _, model = name.partition(":")
    return " ".join(maker.split()), " ".join(model.split()).rstrip("?")


def _voltage_in_name(model: str, watts: float) -> float | None:
    """Nominal AC voltage that a model's name states: "[240V]", or one of the usual voltages by itself.

    Below 1 kW a number like 240 may be the power; with two voltages ("208-240") the name decides nothing.
    """
    bracket = re.search(r"\[(\d{2,5})V?\]", model)
    if bracket:
        return float(bracket[1])
    stated = [part for part in re.split(r"[-/\s]", model) if part in _NOMINAL_VAC]
    beyond_doubt = len(set(stated)) == 1 and f"-{stated[0]}" in model and watts >= 1000
    return float(stated[0]) if beyond_doubt else None


def _percent(slopes: Iterable[float | None], bases: Iterable[float]) -> list[float | None]:
    """Slopes per kelvin as percent of the STC values."""
    return [slope / base * 100 if slope is not None and base else None for slope, base in zip(slopes, bases)]


def _text(cell: str) -> str:
    if not cell:
        raise ValueError("is blank")
    return cell


def _whole(cell: str) -> int | None:
    value = number(cell)
    if value is not None and value != int(value):
        raise ValueError(f"{cell!r} is no whole number")
    return None if value is None else int(value)


def _flag(cell: str) -> bool:
    if cell not in ("0", "1"):
        raise ValueError(f"{cell!r} is neither 0 nor 1")
    return cell == "1"


def _volts(cell: str) -> float | None:
    """Nominal voltage; 0 and a range ("422-528") name none."""
    return None if re.fullmatch(r"\d+\s*-\s*\d+", cell) else number(cell) or None
