"""How the values of an inverter go together.

The bounds of what is usual hold for the CEC inverter table of 2019.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from typing import TYPE_CHECKING

from catalog.plausible_columns import Columns, Rule
from catalog.records import SANDIA_PARAMETERS, Inputs, Inverter

if TYPE_CHECKING:
    import numpy as np


def odd_inputs(groups: Sequence[Inputs]) -> list[str]:
    """What is odd about groups of inputs, one sentence each."""
    found = []
    for group in groups:
        if (
            group.max_isc_a is not None
            and group.max_current_a is not None
            and group.max_isc_a < group.max_current_a
        ):
            found.append(
                f"max_isc_a {group.max_isc_a:g} A of a tracker is below its max_current_a"
                f" {group.max_current_a:g} A:"
                " see whether the two are swapped"
            )
    ratings = [(g.strings_per_tracker, g.max_current_a, g.max_isc_a, g.max_power_w) for g in groups]
    for rating, times in Counter(ratings).items():
        if times > 1:
            trackers = sum(g.trackers for g, own in zip(groups, ratings) if own == rating)
            found.append(
                f"{times} groups of inputs are alike: enter them as one group of {trackers} trackers"
            )
    return found


def _parts_message(i: Inverter) -> str:
    missing = [name for name in SANDIA_PARAMETERS if getattr(i, name) is None]
    return (
        f"the Sandia parameters are incomplete, {', '.join(missing)} missing:"
        " they serve only together; enter all or none"
    )


def _highest_efficiency(x: Columns | Inverter) -> np.ndarray | float:
    """AC over DC power at Vdco by the Sandia model, the highest of some loads."""
    import numpy as np

    def at(load: float) -> np.ndarray | float:
        above, span = load * x.Pdco - x.Pso, x.Pdco - x.Pso
        return ((x.Paco / span - x.C0 * span) * above + x.C0 * above**2) / (load * x.Pdco)

    return np.max([at(load) for load in (0.1, 0.2, 0.3, 0.5, 0.75, 1.0)], axis=0)


def _power_taken(inverter: Inverter) -> float | None:
    """DC power [W] that all trackers together can take; ``None`` where one of them states no limit."""
    total = 0.0
    for group in inverter.inputs:
        by_current = None if group.max_current_a is None else group.max_current_a * inverter.mppt_high_v
        limits = [limit for limit in (by_current, group.max_power_w) if limit is not None]
        if not limits:
            return None
        total += group.trackers * min(limits)
    return total


RULES: tuple[Rule, ...] = (
    Rule(
        "mppt_low_v",
        "impossible",
        lambda c: c.mppt_low_v >= c.mppt_high_v,
        lambda i: (
            f"mppt_low_v {i.mppt_low_v:g} V is not below mppt_high_v {i.mppt_high_v:g} V: see whether the"
            " two are swapped"
        ),
    ),
    Rule(
        "mppt_high_v",
        "impossible",
        lambda c: c.mppt_high_v > c.max_dc_voltage_v,
        lambda i: (
            f"mppt_high_v {i.mppt_high_v:g} V is above max_dc_voltage_v {i.max_dc_voltage_v:g} V:"
            " the MPPT window ends at the maximum DC voltage or below"
        ),
    ),
    Rule(
        "start_voltage_v",
        "impossible",
        lambda c: c.start_voltage_v > c.max_dc_voltage_v,
        lambda i: (
            f"start_voltage_v {i.start_voltage_v:g} V is above max_dc_voltage_v {i.max_dc_voltage_v:g} V:"
            " check both"
        ),
    ),
    Rule(
        "start_voltage_v",
        "odd",
        lambda c: (c.start_voltage_v > c.mppt_high_v) & ~(c.start_voltage_v > c.max_dc_voltage_v),
        lambda i: (
            f"start_voltage_v {i.start_voltage_v:g} V is above the MPPT window ({i.mppt_low_v:g} to"
            f" {i.mppt_high_v:g} V)"
        ),
    ),
    Rule(
        "max_dc_voltage_v",
        "odd",
        lambda c: c.max_dc_voltage_v > 1500,
        lambda i: f"max_dc_voltage_v {i.max_dc_voltage_v:g} V is above 1500 V, where low voltage (DC) ends",
    ),
    Rule(
        "max_array_power_w",
        "impossible",
        lambda c: c.max_array_power_w < 0.01 * c.ac_power_w,
        lambda i: (
            f"max_array_power_w {i.max_array_power_w:g} W is next to nothing against ac_power_w"
            f" {i.ac_power_w:g} W:"
            " both are in W, not kW"
        ),
    ),
    Rule(
        "max_array_power_w",
        "odd",
        lambda c: (
            ((c.max_array_power_w < c.ac_power_w) & (c.max_array_power_w >= 0.01 * c.ac_power_w))
            | (c.max_array_power_w > 3 * c.ac_power_w)
        ),
        lambda i: (
            f"max_array_power_w {i.max_array_power_w:g} W is unusual for ac_power_w {i.ac_power_w:g} W (1"
            " to 3 times as much)"
        ),
    ),
    Rule(
        "inputs",
        "odd",
        lambda c: c.each(_power_taken) < c.ac_power_w,
        lambda i: (
            f"all trackers together take {_power_taken(i):.0f} W at most, less than ac_power_w"
            f" {i.ac_power_w:g} W:"
            " check the number of trackers and their limits"
        ),
    ),
    Rule(
        "weighted_efficiency_pct",
        "odd",
        lambda c: (c.weighted_efficiency_pct < 85) | (c.weighted_efficiency_pct > 99.5),
        lambda i: f"weighted_efficiency_pct {i.weighted_efficiency_pct:g} % is unusual (85 to 99.5 %)",
    ),
    Rule(
        "night_w",
        "odd",
        lambda c: c.night_w > 0.05 * c.ac_power_w,
        lambda i: (
            f"night_w {i.night_w:g} W is more than 5 % of ac_power_w {i.ac_power_w:g} W: check its unit"
        ),
    ),
    Rule("Pso", "odd", lambda c: c.some_missing(SANDIA_PARAMETERS), _parts_message),
    Rule(
        "Paco",
        "impossible",
        lambda c: (c.Paco < 0.5 * c.ac_power_w) | (c.Paco > 2 * c.ac_power_w),
        lambda i: (
            f"Paco {i.Paco:g} W and ac_power_w {i.ac_power_w:g} W cannot be of one inverter:"
            " both are in W; see whether the Sandia parameters belong to another type"
        ),
    ),
    Rule(
        "Paco",
        "odd",
        lambda c: (
            (abs(c.Paco / c.ac_power_w - 1) > 0.02)
            & (c.Paco >= 0.5 * c.ac_power_w)
            & (c.Paco <= 2 * c.ac_power_w)
        ),
        lambda i: (
            f"Paco {i.Paco:g} W and ac_power_w {i.ac_power_w:g} W are"
            f" {100 * abs(i.Paco / i.ac_power_w - 1):.1f} % apart:"
            " see whether the Sandia parameters belong to another rating"
        ),
    ),
    Rule(
        "Pdco",
        "impossible",
        lambda c: c.Pdco <= c.Paco,
        lambda i: (
            f"Pdco {i.Pdco:g} W is not above Paco {i.Paco:g} W, so more would come out than goes in: check"
            " both"
        ),
    ),
    Rule(
        "Pdco",
        "odd",
        lambda c: c.Paco / c.Pdco < 0.8,
        lambda i: (
            f"Paco over Pdco is {100 * i.Paco / i.Pdco:.1f} % efficiency at rated power, usual is 80 % and"
            " more"
        ),
    ),
    Rule(
        "Pso",
        "impossible",
        lambda c: c.Pso >= c.Pdco,
        lambda i: (
            f"Pso {i.Pso:g} W is not below Pdco {i.Pdco:g} W: Pso is the small power at which inversion"
            " starts"
        ),
    ),
    Rule(
        "Pso",
        "odd",
        lambda c: (c.Pso > 0.1 * c.Pdco) & (c.Pso < c.Pdco),
        lambda i: (
            f"Pso {i.Pso:g} W is more than 10 % of Pdco {i.Pdco:g} W: it is the small power at which"
            " inversion starts"
        ),
    ),
    Rule(
        "Vdco",
        "impossible",
        lambda c: (c.Vdco > c.max_dc_voltage_v) | (c.Vdco == 0),
        lambda i: (
            f"Vdco {i.Vdco:g} V is no voltage that the inverter works at (MPPT window {i.mppt_low_v:g} to"
            f" {i.mppt_high_v:g} V)"
        ),
    ),
    Rule(
        "Vdco",
        "odd",
        lambda c: (
            (c.Vdco > 0)
            & ~(c.Vdco > c.max_dc_voltage_v)
            & ((c.Vdco < c.mppt_low_v * 0.999) | (c.Vdco > c.mppt_high_v * 1.001))
        ),
        lambda i: f"Vdco {i.Vdco:g} V is outside the MPPT window ({i.mppt_low_v:g} to {i.mppt_high_v:g} V)",
    ),
    Rule(
        "C0",
        "odd",
        lambda c: (_highest_efficiency(c) > 1) & (c.Pdco > c.Paco) & (c.Pso < c.Pdco),
        lambda i: (
            f"by the Sandia parameters the efficiency rises to {100 * _highest_efficiency(i):.1f} %,"
            " so more would come out than goes in: check C0, Pso, Paco and Pdco"
        ),
    ),
)
