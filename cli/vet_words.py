"""What is said of a vetted bundle, on screen and in files alike."""

from __future__ import annotations

from typing import TYPE_CHECKING

from cli.facts import COLDEST_ON_EARTH_C, FROM_HOURS, NO_LIMIT

if TYPE_CHECKING:
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
        more = vetted.remarks[0].partition(":")[0] if vetted.remarks else ""
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
        "count": f"{mend.modules} modules would do",
        "strings": f"{mend.label} would do",
        "units": f"{mend.units} inverters would do",
        "inverter": f"{vetted.inverters[mend.inverter].name} would do",
    }[mend.kind]
    return f"{CAUSES[vetted.failed[0]]}; {change}" + (", to confirm" if mend.verdict == "to-confirm" else "")
