"""What a workbook and a report both say of a result, besides the options themselves."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from catalog.records import Inputs, Inverter, Module, specs
from cli.cautions import HOURLY_MEANS

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.checks import Confirm
    from matcher.fit import Fit, Option

#: Nowhere on Earth is the air colder (Vostok, 1983: -89.2 degC).
COLDEST_ON_EARTH_C = -90.0

#: Stands for an end of the climate window that no place on Earth reaches.
NO_LIMIT = "no limit"

#: Stands for the cold end of the climate window where the cold voltage comes from hourly weather.
FROM_HOURS = "file"

_VOLTAGE_MAXIMA = ("max_dc_voltage_v", "max_system_voltage_v")


def year_words(year: SiteYear | None) -> str:
    """What stands over a yearly energy."""
    return "a year without clouds" if year is not None and year.clear_sky else "a year"


def number_of_options(fit: Fit) -> int:
    """Options that the result holds, known before they are gone through."""
    return fit.totals.arrangements if fit.lazy else len(fit.table)


def is_in_stock(fit: Fit) -> bool:
    """Whether only what is in stock was looked at, in the numbers that are there."""
    return any(n is not None for n in _bounds(fit))


def pieces_in_stock(fit: Fit, option: Option) -> int | None:
    """Pieces in stock of an option's listed record; ``None`` where nothing bounds them."""
    bounds = _bounds(fit)
    return bounds[option.inverter if fit.lists_inverters else option.module] if bounds else None


def _bounds(fit: Fit) -> list[int | None]:
    from matcher.limits import UNLIMITED

    shelf = fit.search.shelf
    if shelf is None:
        return []
    most = shelf.inverters_at_most if fit.lists_inverters else shelf.modules_at_most
    return [None if n >= UNLIMITED else n for n in most.tolist()]


def field_words(confirm: Confirm) -> str:
    """The value to confirm in words, with its group of inputs where it is not the first."""
    if confirm.field in specs(Inputs):
        group = f", inputs {confirm.inputs + 1}" if confirm.inputs else ""
        return f"{specs(Inputs)[confirm.field].meaning}{group}"
    return specs(Module if confirm.record == "module" else Inverter)[confirm.field].meaning


def at_least(confirm: Confirm) -> float | None:
    """The least value that settles the check, rounded up to a tenth: rounded down it would settle nothing."""
    return None if confirm.at_least is None else math.ceil(confirm.at_least * 10 - 1e-6) / 10


def confirm_words(confirm: Confirm) -> str:
    """Like "maximum DC voltage of at least 561.3 V"."""
    least = at_least(confirm)
    return (
        field_words(confirm)
        if least is None
        else f"{field_words(confirm)} of at least {least:,.1f} {confirm.unit}"
    )


_SHORT = {
    "max_dc_voltage_v": "DC voltage",
    "max_system_voltage_v": "system voltage",
    "max_isc_a": "Isc of a tracker",
    "voc_coef_pct": "coefficient of Voc",
}


def confirm_short(option: Option) -> str:
    """All that is to be confirmed of one option, short enough for a column of a table."""
    by_record: dict[str, list[str]] = {}
    for c in option.confirm:
        least = at_least(c)
        words = _SHORT.get(c.field, field_words(c)) + (f" (inputs {c.inputs + 1})" if c.inputs else "")
        limit = "" if least is None else f" ≥\u00a0{least:,.1f}\u00a0{c.unit}"
        by_record.setdefault(c.record, []).append(words + limit)
    return "; ".join(f"{record}: {', '.join(values)}" for record, values in by_record.items())


def confirm_line(option: Option) -> str:
    """All that is to be confirmed of one option; empty where nothing is."""
    return "; ".join(f"{c.record}: {confirm_words(c)}" for c in option.confirm)


def holds_from(option: Option) -> float | str | None:
    """Coldest air temperature at which the option holds [degC]; `NO_LIMIT` where no place on Earth is colder.

    ``None`` while a voltage maximum is to be confirmed: what is not known bounds it. `FROM_HOURS` where the
    cold voltage is that of the hours of a weather file, which no single temperature stands for.
    """
    if any(c.field in _VOLTAGE_MAXIMA for c in option.confirm):
        return None
    if option.cold_by_hours:
        return FROM_HOURS
    return NO_LIMIT if option.coldest_c is None or option.coldest_c < COLDEST_ON_EARTH_C else option.coldest_c


def holds_to(option: Option) -> float | str | None:
    """Hottest air temperature at which the option holds [degC], `NO_LIMIT`, or ``None`` as for `holds_from`."""
    if any(c.field == "voc_coef_pct" for c in option.confirm):
        return None
    return NO_LIMIT if option.hottest_c is None else option.hottest_c


def climate_words(option: Option, low_c: float, high_c: float) -> str:
    """The climate window in words; where a value to confirm bounds it, the design temperatures stand in."""
    low, high = holds_from(option), holds_to(option)
    waits = ", once confirmed" if low is None or high is None else ""
    if low == high == NO_LIMIT:
        return "any temperature"
    coldest = "the cold of the weather file" if low == FROM_HOURS else whole(low_c if low is None else low, cold=True)
    if high == NO_LIMIT:
        return f"{coldest}{'' if low == FROM_HOURS else ' °C'} or warmer{waits}"
    hottest = f"{whole(high_c if high is None else high, cold=False)} °C"
    return f"{hottest} or cooler{waits}" if low == NO_LIMIT else f"{coldest} to {hottest}{waits}"


def whole(end: float | str, cold: bool) -> str:
    """One end of a climate window in whole degrees, on the safe side; words as they are."""
    if isinstance(end, str):
        return end
    return str(math.ceil(end - 1e-6) if cold else math.floor(end + 1e-6))


def rests_on(fit: Fit, year: SiteYear) -> list[str]:
    """What the result rests on: design values, weather, and defaults for values not on record."""
    r, site = fit.request, fit.request.site
    hot = "the hot cell is at 1000 W/m2"
    if len(fit.modules) == 1:
        hot = f"the hot cell at {fit.module_points(0).cell_hot_c:.1f} degC (1000 W/m2, {site.mounting})"
    lines = [
        f"Design temperatures: {site.design_low_c:g} and {site.design_high_c:g} degC in the air; the"
        f" cold cell is at the air's temperature, {hot}.",
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


def assumptions(fit: Fit) -> list[str]:
    """Values that a default stands in for, said wherever a result rests on them."""
    from matcher.electrical import ASSUMED_NOCT_C

    lines = []
    rules = fit.request.rules
    if rules.cold_voltage == "hourly":
        lines.append(
            f"Cold voltage: the highest modelled Voc of the weather file's sunlit hours and {rules.cold_margin_pct:g} %"
            f" margin, as rule set {rules.name} says; it rests on that file and not on the design low."
        )
    elif rules.cold_voltage == "table":
        lines.append(f"Cold voltage: by NEC Table 690.7(A) for crystalline silicon, as rule set {rules.name} says.")
    if any(m.noct_c is None for m in fit.modules[:1]) and len(fit.modules) == 1:
        lines.append(f"Assumed: NOCT {ASSUMED_NOCT_C:g} degC, which the module's record does not state.")
    assumed = sum(1 for i in fit.inverters if i.origin("inputs") == "assumed")
    if assumed:
        lines.append(
            f"Assumed: one tracker, for {assumed:,} of {len(fit.inverters):,} inverters whose source says nothing of trackers."
        )
    return lines
