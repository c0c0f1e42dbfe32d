"""How the values of a module go together.

The bounds of what is usual were set so that they hold for about 99 % of the CEC module table of 2019 within
each technology, and widened for cells that came after it (higher voltage per cell, lower coefficients).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from catalog.plausible_columns import Columns, Rule
from catalog.records import SIX_PARAMETERS, Module

if TYPE_CHECKING:
    import numpy as np

# Vmp * Imp against Pmax. Rounding of Vmp to 0.1 V and of Imp to 0.01 A explains 1 %; the widest tolerance of
# power that datasheets print is 10 % (common practice, no source). Beyond twice that, the values are of
# different conditions or types: values at 800 W/m2 and NOCT, printed beside those at STC, make about 25 % less.
POWER_ODD, POWER_IMPOSSIBLE = 0.03, 0.20

# Fill factor of a straight line from Isc to Voc; the curve of a cell bulges outwards, so it cannot have less.
LEAST_FILL_FACTOR = 0.25

# Usual temperature coefficients in %/K, crystalline silicon and other cells. A negative coefficient of Isc is
# rare (223 rows of the CEC table) and worth a second look with either.
USUAL_COEFFICIENTS = {
    "voc_coef_pct": ((-0.45, -0.20), (-0.50, -0.15)),
    "isc_coef_pct": ((0.0, 0.15), (0.0, 0.20)),
    "pmax_coef_pct": ((-0.60, -0.22), (-0.60, -0.12)),
    "vmp_coef_pct": ((-0.65, -0.22), (-0.65, -0.12)),
}


def _usual(field: str, module: Module) -> tuple[float, float]:
    crystalline, other = USUAL_COEFFICIENTS[field]
    return crystalline if module.crystalline else other


def _coefficient_rule(field: str) -> Rule:
    (low, high), (other_low, other_high) = USUAL_COEFFICIENTS[field]

    def broken(c: Columns) -> np.ndarray:
        value, cr = getattr(c, field), c.crystalline == 1
        return (cr & ((value < low) | (value > high))) | (~cr & ((value < other_low) | (value > other_high)))

    def message(m: Module) -> str:
        usual = _usual(field, m)
        value = getattr(m, field)
        text = f"{field} {value:.4g} %/K is unusual for {m.technology} ({usual[0]:g} to {usual[1]:g} %/K)"
        base = {"voc": "voc_v", "vmp": "vmp_v", "isc": "isc_a"}.get(field.split("_")[0])
        if field == "isc_coef_pct" and value < 0:
            return f"{text}: Isc rises with temperature as a rule; check the sign"
        if base and abs(value) < min(abs(u) for u in usual if u):
            return f"{text}: a value in {base[-1].upper()}/K is to be divided by {base} and multiplied by 100"
        return text

    return Rule(field, "odd", broken, message)


def _power_gap(x: Columns | Module) -> np.ndarray | float:
    """Vmp * Imp / Pmax - 1."""
    return x.vmp_v * x.imp_a / x.pmax_w - 1.0


def _fill_factor(x: Columns | Module) -> np.ndarray | float:
    return x.vmp_v * x.imp_a / (x.voc_v * x.isc_a)


def _efficiency(x: Columns | Module) -> np.ndarray | float:
    return x.pmax_w / (x.length_m * x.width_m * 1000.0)


def _power_message(m: Module) -> str:
    product = m.vmp_v * m.imp_a
    return (
        f"vmp_v * imp_a is {product:.4g} W and pmax_w is {m.pmax_w:g} W, {100 * abs(_power_gap(m)):.1f} %"
        " apart:"
        " take all three from the STC column of one type"
    )


def _cells_message(m: Module) -> str:
    per_cell = m.voc_v / m.cells_in_series
    text = f"voc_v over cells_in_series is {per_cell:.3g} V per cell, for {m.technology} it is 0.5 to 0.78 V"
    if 0.25 <= per_cell <= 0.39:
        return f"{text}: of half-cell modules count the cells in series only ({m.cells_in_series // 2})"
    return f"{text}: count the cells in series, not strings in parallel"


def _parts_message(m: Module) -> str:
    missing = [name for name in SIX_PARAMETERS if getattr(m, name) is None]
    return (
        f"the single-diode parameters are incomplete, {', '.join(missing)} missing:"
        " they serve only together; enter all six or none"
    )


def _parameters_miss(c: Columns) -> np.ndarray:
    """Whether single-diode parameters miss Voc or the maximum power point of their row by more than 5 %."""
    import numpy as np

    def current(volt: np.ndarray, amp: np.ndarray) -> np.ndarray:
        diode_v = volt + amp * c.R_s
        return c.I_L_ref - c.I_o_ref * np.expm1(diode_v / c.a_ref) - diode_v / c.R_sh_ref

    at_voc = (
        current(c.voc_v, np.zeros_like(c.voc_v)) * c.a_ref / c.I_L_ref / c.voc_v
    )  # [1] of Voc, linearised
    at_mpp = (current(c.vmp_v, c.imp_a) - c.imp_a) / c.imp_a
    return (np.abs(at_voc) > 0.05) | (np.abs(at_mpp) > 0.05)


RULES: tuple[Rule, ...] = (
    Rule(
        "vmp_v",
        "impossible",
        lambda c: c.vmp_v >= c.voc_v,
        lambda m: f"vmp_v {m.vmp_v:g} V is not below voc_v {m.voc_v:g} V: see whether the two are swapped",
    ),
    Rule(
        "imp_a",
        "impossible",
        lambda c: c.imp_a >= c.isc_a,
        lambda m: f"imp_a {m.imp_a:g} A is not below isc_a {m.isc_a:g} A: see whether the two are swapped",
    ),
    Rule("pmax_w", "impossible", lambda c: abs(_power_gap(c)) > POWER_IMPOSSIBLE, _power_message),
    Rule(
        "pmax_w",
        "odd",
        lambda c: (abs(_power_gap(c)) > POWER_ODD) & (abs(_power_gap(c)) <= POWER_IMPOSSIBLE),
        _power_message,
    ),
    Rule(
        "voc_v",
        "impossible",
        lambda c: _fill_factor(c) < LEAST_FILL_FACTOR,
        lambda m: (
            f"vmp_v * imp_a over voc_v * isc_a is {_fill_factor(m):.2f}, less than a straight line from Isc"
            " to Voc"
            f" has ({LEAST_FILL_FACTOR:g}): check voc_v {m.voc_v:g} V and isc_a {m.isc_a:g} A"
        ),
    ),
    Rule(
        "voc_v",
        "odd",
        lambda c: (
            (c.vmp_v < c.voc_v)
            & (c.imp_a < c.isc_a)
            & (_fill_factor(c) >= LEAST_FILL_FACTOR)
            & (
                (_fill_factor(c) > 0.86)
                | ((c.crystalline == 1) & (_fill_factor(c) < 0.67))
                | (_fill_factor(c) < 0.53)
            )
        ),
        lambda m: (
            f"the fill factor is {_fill_factor(m):.2f}, usual for {m.technology} is"
            f" {'0.67' if m.crystalline else '0.53'} to 0.86: check voc_v, isc_a, vmp_v and imp_a"
        ),
    ),
    *(_coefficient_rule(field) for field in USUAL_COEFFICIENTS),
    Rule(
        "vmp_coef_pct",
        "odd",
        lambda c: c.vmp_coef_pct > c.voc_coef_pct,
        lambda m: (
            f"vmp_coef_pct {m.vmp_coef_pct:.4g} %/K is smaller in size than voc_coef_pct"
            f" {m.voc_coef_pct:.4g} %/K,"
            " in percent Vmp falls faster than Voc: check which is which"
        ),
    ),
    Rule(
        "noct_c",
        "odd",
        lambda c: (c.noct_c < 40) | (c.noct_c > 56),
        lambda m: (
            f"noct_c {m.noct_c:g} degC is unusual (40 to 56 degC): it is the cell's temperature at 800 W/m2"
            " and 20 degC"
        ),
    ),
    Rule(
        "cells_in_series",
        "odd",
        lambda c: (
            (c.crystalline == 1)
            & ((c.voc_v / c.cells_in_series < 0.5) | (c.voc_v / c.cells_in_series > 0.78))
        ),
        _cells_message,
    ),
    Rule(
        "bifaciality",
        "odd",
        lambda c: (c.bifacial == 0) & (c.bifaciality > 0),
        lambda m: (
            f"bifaciality {m.bifaciality:g} is stated, yet the module is not marked bifacial: check which"
            " is right"
        ),
    ),
    Rule(
        "bifaciality",
        "odd",
        lambda c: (c.bifacial == 1) & ((c.bifaciality < 0.4) | (c.bifaciality > 1.0)),
        lambda m: (
            f"bifaciality {m.bifaciality:g} is unusual (0.4 to 1.0): it is the rear side's power over the"
            " front's"
        ),
    ),
    Rule(
        "max_system_voltage_v",
        "impossible",
        lambda c: c.max_system_voltage_v < c.voc_v,
        lambda m: (
            f"max_system_voltage_v {m.max_system_voltage_v:g} V is below voc_v {m.voc_v:g} V of one module:"
            " it is the limit for a whole string"
        ),
    ),
    Rule(
        "max_system_voltage_v",
        "odd",
        lambda c: c.max_system_voltage_v > 1500,
        lambda m: (
            f"max_system_voltage_v {m.max_system_voltage_v:g} V is above 1500 V, where low voltage (DC) ends"
        ),
    ),
    Rule(
        "max_series_fuse_a",
        "odd",
        lambda c: c.max_series_fuse_a < c.isc_a,
        lambda m: (
            f"max_series_fuse_a {m.max_series_fuse_a:g} A is below isc_a {m.isc_a:g} A: such a fuse melts"
            " in sunshine"
        ),
    ),
    Rule(
        "length_m",
        "impossible",
        lambda c: _efficiency(c) > 0.5,
        lambda m: (
            f"pmax_w over length_m * width_m is {100 * _efficiency(m):.0f} % efficiency, more than any cell"
            " has:"
            " check pmax_w and both lengths"
        ),
    ),
    Rule(
        "length_m",
        "odd",
        lambda c: ((_efficiency(c) > 0.27) & (_efficiency(c) <= 0.5)) | (_efficiency(c) < 0.04),
        lambda m: (
            f"pmax_w over length_m * width_m is {100 * _efficiency(m):.1f} % efficiency, usual is 4 to 27 %:"
            " check pmax_w and both lengths"
        ),
    ),
    Rule("a_ref", "odd", lambda c: c.some_missing(SIX_PARAMETERS), _parts_message),
    *(
        Rule(
            name,
            "impossible",
            lambda c, name=name: getattr(c, name) == 0,
            lambda m, name=name: (
                f"{name} is 0, and the single-diode model needs it above 0: leave it blank where it is not"
                " known"
            ),
        )
        for name in ("a_ref", "I_L_ref", "I_o_ref", "R_sh_ref")
    ),
    Rule(
        "a_ref",
        "odd",
        _parameters_miss,
        lambda m: (
            "the single-diode parameters miss the module's own Voc or maximum power point by more than 5 %:"
            " see whether they belong to another type"
        ),
    ),
)
