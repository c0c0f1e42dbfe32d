"""The cautions that stand on screen, in reports and in the README."""

from __future__ import annotations

CAUTIONS: tuple[str, ...] = (
    "DC arrays cannot be switched off in daylight, strings reach lethal voltages, and DC arcs do not extinguish"
    " by themselves.",
    "Ferrule checks ratings. It designs no protection and replaces no licensed practice: local codes, the makers'"
    " instructions and a qualified person decide.",
)

HOURLY_MEANS = "Hourly means hide short peaks: true clipping is somewhat higher at high DC/AC ratios."
