"""What a workbook and a report both say of a result, besides the options themselves."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from cli.cautions import HOURLY_MEANS
from cli.fit_screen import assumptions

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.checks import Confirm
    from matcher.fit import Fit, Option

#: Nowhere on Earth is the air colder (Vostok, 1983: -89.2 degC).
COLDEST_ON_EARTH_C = -90.0

_FIELDS = {
    "max_dc_voltage_v": "maximum DC voltage",
    "max_system_voltage_v": "maximum system voltage",
    "max_isc_a": "maximum short-circuit current of one tracker",
    "max_series_fuse_a": "maximum series fuse rating",
    "voc_coef_pct": "temperature coefficient of Voc",
}


def number_of_options(fit: Fit) -> int:
    """Options that the result holds, known before they are gone through."""
    return fit.totals.arrangements if fit.lazy else len(fit.table)


def field_words(confirm: Confirm) -> str:
    """The value to confirm in words, with its group of inputs where it is not the first."""
    group = f" (inputs {confirm.inputs + 1})" if confirm.inputs else ""
    return _FIELDS.get(confirm.field, confirm.field) + group


def at_least(confirm: Confirm) -> float | None:
    """The least value that settles the check, rounded up to a tenth: rounded down it would settle nothing."""
    return None if confirm.at_least is None else math.ceil(confirm.at_least * 10 - 1e-6) / 10


def confirm_words(confirm: Confirm) -> str:
    """Like "maximum DC voltage of at least 561.3 V"."""
    least = at_least(confirm)
    return field_words(confirm) if least is None else f"{field_words(confirm)} of at least {least:.1f} {confirm.unit}"


def confirm_line(option: Option) -> str:
    """All that is to be confirmed of one option; empty where nothing is."""
    return "; ".join(f"{c.record}: {confirm_words(c)}" for c in option.confirm)


def coldest(option: Option) -> float | None:
    """Coldest ambient temperature at which the option holds [degC]; ``None`` where no place is too cold."""
    return None if option.coldest_c is None or option.coldest_c < COLDEST_ON_EARTH_C else option.coldest_c


def rests_on(fit: Fit, year: SiteYear) -> list[str]:
    """What the result rests on: design values, weather, and defaults that stand in for values not on record."""
    r, site = fit.request, fit.request.site
    hot = "the hot cell is at 1000 W/m2"
    if len(fit.modules) == 1:
        hot = f"the hot cell at {fit.module_points(0).cell_hot_c:.1f} degC (1000 W/m2, {site.mounting})"
    lines = [
        f"Design temperatures: {site.design_low_c:g} and {site.design_high_c:g} degC in the air; the cold cell is at"
        f" the air's temperature, {hot}.",
        f"Rule set {r.rules.name}: the design short-circuit current is {r.rules.isc_factor:g} times Isc.",
    ]
    if r.combiner:
        lines.append("Strings are paralleled in a combiner box: the inverter's string inputs are waived.")
    if len(fit.modules) == 1 and fit.modules[0].voc_coef_pct is None:
        lines.append("The record states no temperature coefficient of Voc: NEC Table 690.7(A) stands in.")
    lines += year.notes or (f"No clipping figure: {year.why_not}.",)
    if year.year is not None:
        lines.append(HOURLY_MEANS)
    return [*lines, *assumptions(fit)]
