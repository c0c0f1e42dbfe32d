"""What is said of a vetted bundle, on screen and in files alike."""

from __future__ import annotations

from typing import TYPE_CHECKING

from cli.facts import COLDEST_ON_EARTH_C, FROM_HOURS, NO_LIMIT
from matcher.anyclimate import ORDINARY_C

if TYPE_CHECKING:
    from collections.abc import Sequence

    from catalog.records import Site
    from cli.vet_lists import Line
    from matcher.anyclimate import Window
    from matcher.mends import Mend
    from matcher.vet import Vetted

#: What is wrong, by the check that stops the nearest arrangement.
CAUSES = {
    "max-dc-voltage": "too long in the cold",
    "system-voltage": "too long in the cold",
    "voltage-cap": "too long in the cold",
    "mppt-low": "too short in the heat",
    "start": "too short in the heat",
    "mppt-high": "too long for tracking",
    "short-circuit": "too much current",
    "string-inputs": "too many strings",
    "array-power": "too much array",
    "module-count": "wrong count",
}


def cause(failed: tuple[str, ...]) -> str:
    """The cause in words: that of the check which stops the nearest arrangement, and what comes with it."""
    return ", ".join(dict.fromkeys(CAUSES[check] for check in failed))


def place_words(lines: Sequence[Line]) -> list[str]:
    """For which places the verdicts hold: design temperatures, mounting, and what else a site says."""
    judged = [line.vetted for line in lines if line.vetted is not None]
    sites = list(dict.fromkeys(v.site for v in judged if not v.solved))
    found = []
    if sites:
        named = [f"{'the site' if s.name == 'as given' else s.name} ({site_words(s)})" for s in sites]
        found.append(f"Judged at {', '.join(named)}.")
    solved = next((v.site for v in judged if v.solved), None)
    if solved is not None:
        low, high = ORDINARY_C
        more = "".join(f", {words}" for words in (solved.mounting, *_more_of(solved)))
        found.append(
            f"{'Others, without a site' if sites else 'Without a site'}: in which climates they are sound, within"
            f" {low:g} to {high:g} degC in the air{more}."
        )
    return found


def site_words(site: Site) -> str:
    """What of a site decides what is sound: "-12 to 37 degC, gap-roof"."""
    temperatures = f"{site.design_low_c:g} to {site.design_high_c:g} degC"
    return ", ".join([temperatures, site.mounting, *_more_of(site)])


def _more_of(site: Site) -> list[str]:
    more = [] if site.voltage_cap_v is None else [f"voltage cap {site.voltage_cap_v:,.0f} V"]
    return more + ([] if site.rear_share is None else [f"rear irradiance {100 * site.rear_share:g} %"])


def window_words(window: Window | None) -> str:
    """A climate window as a sentence without its end; an end that a value to confirm may bound is told so."""
    if window is None:
        return "sound in no climate"
    low, high = _ends(window)
    if window.by_hours:
        heat = f", where the highest temperature on record is {high} degC or cooler" if high is not None else ""
        return f"sound in the cold of the weather file{heat}"
    parts = []
    if low is not None:
        parts.append(f"the lowest temperature on record is {low} degC or milder")
    if high is not None:
        parts.append(f"the highest {'temperature on record ' if low is None else ''}is {high} degC or cooler")
    waits = [
        words for end, is_open, words in (
            (low, window.cold_open, "how cold it may get"), (high, window.hot_open, "how hot it may get"),
        ) if is_open and end is None
    ]  # fmt: skip
    said = "sound where " + " and ".join(parts) if parts else "sound in any climate"
    if waits:
        said = said if parts else "sound as far as is known"
        return f"{said}; {' and '.join(waits)} waits for a value to confirm"
    return said + (", once confirmed" if window.cold_open or window.hot_open else "")


def window_short(window: Window | None) -> str:
    """A climate window for a column: coldest to hottest [degC]; ``?`` where a value to confirm would bound it."""
    if window is None:
        return "nowhere"
    low, high = _ends(window)
    if low is None and high is None and not (window.cold_open or window.hot_open or window.by_hours):
        return NO_LIMIT
    ends = ((FROM_HOURS if window.by_hours else low, window.cold_open), (high, window.hot_open))
    return " to ".join(str(end) if end is not None else "?" if is_open else NO_LIMIT for end, is_open in ends)


#: Stands for an end of the climate window which a value to confirm may bound.
TO_CONFIRM = "to confirm"


def window_cells(window: Window | None) -> tuple[float | str, float | str]:
    """Both ends of a climate window for the cells of a file [degC]; words where no number stands for an end."""
    if window is None:
        return "nowhere", "nowhere"
    cold, hot = window.coldest_c, window.hottest_c
    if cold is not None and cold < COLDEST_ON_EARTH_C:
        cold = None
    if window.by_hours:
        return FROM_HOURS, hot if hot is not None else TO_CONFIRM if window.hot_open else NO_LIMIT
    return (
        cold if cold is not None else TO_CONFIRM if window.cold_open else NO_LIMIT,
        hot if hot is not None else TO_CONFIRM if window.hot_open else NO_LIMIT,
    )


def _ends(window: Window) -> tuple[int | None, int | None]:
    """Both ends in whole degrees on the safe side; ``None`` where nothing on record bounds the window on Earth."""
    cold, hot = window.coldest_c, window.hottest_c
    return None if cold is None or cold < COLDEST_ON_EARTH_C else _up(cold), None if hot is None else _down(hot)


def _up(value: float) -> int:
    """Whole degrees on the safe side of a coldest temperature."""
    return -int(-(value - 1e-9) // 1)


def _down(value: float) -> int:
    return int((value + 1e-9) // 1)


def mend_words(mend: Mend, vetted: Vetted) -> str:
    """One change in words: "13 modules instead of 14 (1x13)"."""
    bundle, inverters = vetted.bundle, vetted.inverters
    what = {
        "count": f"{mend.modules} modules instead of {bundle.modules}",
        "strings": "other strings",
        "units": f"{mend.units} inverter{'s' if mend.units > 1 else ''} instead of {bundle.units}",
        "inverter": inverters[mend.inverter].name,
    }[mend.kind]
    doubt = ", to confirm" if mend.verdict == "to-confirm" else ""
    return f"{what} ({mend.label}{doubt})"


#: What a note of the checks comes to, for one line of a table.
_NOTES = {
    "cold-tracking": "leaves the MPPT window in the cold",
    "input-current": "the trackers limit the current",
    "string-fuse": "needs string fuses",
}


def _remark_short(remark: str) -> str:
    """A remark for one line of a table."""
    check, colon, _ = remark.partition(":")
    return _NOTES.get(check, check) if colon else remark


def assumed(vetted: Vetted) -> list[str]:
    """Values that a default stands in for."""
    from matcher.electrical import ASSUMED_NOCT_C

    lines = []
    if vetted.bundle.module.noct_c is None:
        lines.append(f"Assumed: NOCT {ASSUMED_NOCT_C:g} degC, which the module's record does not state.")
    if vetted.inverter.origin("inputs") == "assumed":
        lines.append("Assumed: one tracker, as the inverter's source says nothing of trackers.")
    return lines


def short(vetted: Vetted) -> str:
    """The wiring and what to ask or know, or what is wrong and the smallest change, for one line of a table."""
    if vetted.option is not None:
        more = _remark_short(vetted.remarks[0]) if vetted.remarks else ""
        if vetted.option.confirm:
            from cli.facts import confirm_short

            more = "ask: " + confirm_short(vetted.option).replace("≥\u00a0", ">= ").replace("\u00a0", " ")
        return vetted.option.label + (f"; {more}" if more else "")
    if not vetted.failed:
        return vetted.reason.partition("cannot be matched: ")[2] or vetted.reason
    if not vetted.mends:
        return CAUSES[vetted.failed[0]]
    mend = vetted.mends[0]
    change = {
        "count": f"{mend.modules:,} would do",
        "strings": f"{mend.label} would do",
        "units": f"{mend.units} inverters would do",
        "inverter": f"{vetted.inverters[mend.inverter].model} would do",
    }[mend.kind]
    return f"{CAUSES[vetted.failed[0]]}; {change}" + (", to confirm" if mend.verdict == "to-confirm" else "")
