"""The order in which options are listed.

Verdict first, always: `fits` before `to-confirm`. Ties end with fewer different string lengths, the larger
cold-voltage margin, maker and model.
"""

from __future__ import annotations

from enum import StrEnum

import numpy as np

from matcher.limits import TOLERANCE
from matcher.options import Options


class Order(StrEnum):
    """What decides between options of the same verdict."""

    LEAST_INVERTER = "least-inverter"
    RATIO = "ratio"
    CLIPPING = "clipping"
    MARGIN = "margin"
    ENERGY = "energy"
    COST = "cost"


def in_words(order: Order, clip_cap_pct: float, has_losses: bool) -> str:
    """The order as a sentence, for above the table."""
    first = "what fits before what is to be confirmed"
    ties = "ties by fewer string lengths, then by the larger cold-voltage margin"
    if order is Order.LEAST_INVERTER and has_losses:
        return (
            f"{first}; then by falling DC/AC ratio while no more than {clip_cap_pct:g} % is clipped,"
            f" then by rising clipping loss; {ties}"
        )
    words = {
        Order.LEAST_INVERTER: "by falling DC/AC ratio (no clipping figure)",
        Order.RATIO: "by falling DC/AC ratio",
        Order.CLIPPING: "by rising clipping loss",
        Order.MARGIN: "by falling cold-voltage margin",
        Order.ENERGY: "by falling yearly energy",
        Order.COST: "by rising cost of modules and inverters",
    }
    return f"{first}; then {words[order]}; {ties}"


def phase(clipping_pct: np.ndarray, clip_cap_pct: float) -> np.ndarray:
    """0 within the cap, 1 where the loss is unknown (NaN), 2 over the cap."""
    over = clipping_pct > clip_cap_pct * (1.0 + TOLERANCE)
    return np.where(np.isnan(clipping_pct), 1, np.where(over, 2, 0))


def leading_keys(
    order: Order, clip_cap_pct: float, ratio: np.ndarray, clipping_pct: np.ndarray, margin_pct: np.ndarray,
    yearly_kwh: np.ndarray, cost: np.ndarray,
) -> list[np.ndarray]:  # fmt: skip
    """Sort keys that follow the verdict, most important first, all ascending; arrays (n,)."""
    # Rounded, so that sums taken in another order tie and the next key decides.
    clipping = np.round(np.nan_to_num(clipping_pct, nan=np.inf), 9)
    yearly_kwh = np.round(yearly_kwh, 6)
    if order is Order.RATIO:
        return [-ratio]
    if order is Order.CLIPPING:
        return [clipping, -ratio]
    if order is Order.MARGIN:
        return [-margin_pct, -ratio]
    if order is Order.ENERGY:
        return [-np.nan_to_num(yearly_kwh, nan=-np.inf), -ratio]
    if order is Order.COST:
        return [np.round(np.nan_to_num(cost, nan=np.inf), 6), -ratio]
    stage = phase(clipping_pct, clip_cap_pct)
    return [stage, np.where(stage == 2, clipping, -ratio)]


def sort_keys(
    options: Options, order: Order, clip_cap_pct: float, name_rank: np.ndarray, cost: np.ndarray
) -> list[np.ndarray]:
    """All sort keys of options, most important first.

    ``name_rank`` (n,) ranks by maker and model; ``cost`` (n,) is NaN where it is not known.
    """
    leading = leading_keys(
        order, clip_cap_pct, options.ratio, options.clipping_pct, options.margin_pct, options.yearly_kwh, cost
    )
    return [options.to_confirm, *leading, options.lengths, -options.margin_pct, name_rank]


def ranked(
    options: Options, order: Order, clip_cap_pct: float, name_rank: np.ndarray, cost: np.ndarray
) -> np.ndarray:
    """Positions of the options in their order, shape (n,); a stable sort. Parameters as of `sort_keys`."""
    return np.lexsort(sort_keys(options, order, clip_cap_pct, name_rank, cost)[::-1])
