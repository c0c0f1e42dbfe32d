"""``ferrule sweep``: the best option of every module on every inverter, to a file."""

from __future__ import annotations

import os
import sys
import time
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from cli.opening import CatalogOption, open_catalog
from cli.siting import (
    AzimuthOption, CapOption, HighOption, LatOption, LonOption, LowOption, MountingOption, RearOption,
    SiteOption, TiltOption, WeatherOption, site_of,
)  # fmt: skip

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from catalog.store import Catalog
    from cli.sweep_parts import Parts

NOTHING_FITS = 1

#: Seconds between two lines of progress where the output is no terminal.
_QUIET = 15.0


def sweep(
    out: Annotated[str, typer.Option(metavar="FILE", help="File to write, .csv or .parquet.")],
    modules: Annotated[str | None, typer.Option(metavar="WORDS", help="Only modules whose name holds all these words, or those named in a text file, one a line.")] = None,
    inverters: Annotated[str | None, typer.Option(metavar="WORDS", help="Only inverters whose name holds all these words, or those named in a text file, one a line.")] = None,
    ratio: Annotated[str, typer.Option(metavar="LOW..HIGH", help="Window of DC/AC ratios.")] = "0.8..1.5",
    clip_cap: Annotated[float, typer.Option(metavar="PCT", help="Clipping loss up to which a higher DC/AC ratio is better [%].")] = 2.0,
    rules: Annotated[str, typer.Option(metavar="NAME", help="Rule set: iec-62548, nec-690, or a file of your own, .toml.")] = "iec-62548",
    combiner: Annotated[bool, typer.Option("--combiner", help="Strings are paralleled in a combiner box: string inputs are waived.")] = False,
    jobs: Annotated[int | None, typer.Option(metavar="N", min=1, help="Processes; all cores if not given.")] = None,
    site: SiteOption = None,
    low: LowOption = None,
    high: HighOption = None,
    mounting: MountingOption = None,
    voltage_cap: CapOption = None,
    rear_share: RearOption = None,
    lat: LatOption = None,
    lon: LonOption = None,
    tilt: TiltOption = None,
    azimuth: AzimuthOption = None,
    weather: WeatherOption = None,
    catalog: CatalogOption = None,
) -> int:
    """The best option of every module on every inverter, to a file.

    One line for each pair that goes together, by module and inverter, in the order of the catalog. A sweep
    that was broken off goes on where it was: give the same command again. Exit status: 0 something fits,
    1 nothing fits, 2 bad input.

    Example: ferrule sweep --low -12 --high 37 --inverters viola --out pairs.csv
    """
    from cli.sweep_files import assemble, form_of

    form = form_of(out)
    with open_catalog(catalog) as opened:
        place = site_of(
            opened, site, low=low, high=high, mounting=mounting, voltage_cap=voltage_cap, rear_share=rear_share,
            lat=lat, lon=lon, tilt=tilt, azimuth=azimuth, weather=weather,
        )  # fmt: skip
        from cli.asking import request_of
        from cli.sweep_parts import Parts, Task, rows_of
        from cli.years import DC_LOSS_PCT, cold_plane, condensed_plane

        request = request_of(place, ratio, None, clip_cap, rules, combiner, "least-inverter", False)
        chosen = _chosen(opened, "module", modules)
        takers = tuple(_chosen(opened, "inverter", inverters))
        plane = condensed_plane(opened, place)
    task = Task(takers, request, plane.plane, cold_plane(request), DC_LOSS_PCT, form)
    parts = Parts(task, chosen, Path(out))
    if parts.open():
        _say("the parts kept beside the file are of another question: started afresh")
    _make(parts, jobs or os.cpu_count() or 1, len(takers))
    made = sorted(parts.made().items())
    assemble(form, [path for _, path in made], Path(out))
    rows = sum(rows_of(path) for _, path in made)
    parts.clear()

    from cli.cautions import CAUTIONS, HOURLY_MEANS
    from cli.console import note, say
    from matcher.order import in_words

    say(f"{rows:,} of {len(chosen) * len(takers):,} pairs go together; {out} holds the best option of each.")
    say(f"Best: {in_words(request.order, clip_cap, plane.plane is not None)}.")
    why_not = f"No clipping figure: {plane.why_not}."
    for line in (*plane.notes, HOURLY_MEANS if plane.why_not is None else why_not, *CAUTIONS):
        note(line)
    return 0 if rows else NOTHING_FITS


def _chosen(catalog: Catalog, kind: str, words: str | None) -> list[Module] | list[Inverter]:
    """The records of a kind that are meant: all, those with some words in their names, or those of a list."""
    from cli.kinds import all_names, of_kind

    known = all_names(catalog, (kind,))
    if words is None:
        return of_kind(catalog, kind, [id_ for _, id_ in known.records])
    if os.path.isfile(words):
        from cli.choosing import choose

        with open(words, encoding="utf-8") as lines:
            names = [line.strip() for line in lines if line.strip()]
        ids = [choose(catalog, name, (kind,))[1] for name in names]
    else:
        from catalog.namekeys import compact

        wanted = [compact(word) for word in words.split()]
        ids = [
            id_
            for named, (_, id_) in zip(known.names, known.records, strict=True)
            if all(word in compact(named.name) for word in wanted)
        ]
    if not ids:
        raise CatalogError(f"--{kind}s {words}: no {kind} has a name that holds these words")
    return of_kind(catalog, kind, sorted(set(ids)))


def _make(parts: Parts, jobs: int, inverters: int) -> None:
    """Make the parts, telling how far it is and how long it will take."""
    pairs = [len(modules) * inverters for modules in parts.modules]
    begun = time.monotonic()
    before = done = sum(pairs[number] for number in parts.made())
    terminal = sys.stderr.isatty()
    if before:
        _say(f"{before:,} of {sum(pairs):,} pairs are there already: going on with the rest")
    told = begun
    try:
        for number in parts.make(jobs):
            done += pairs[number]
            now = time.monotonic()
            if terminal or now - told > _QUIET or done == sum(pairs):
                told = now
                left = (now - begun) / (done - before) * (sum(pairs) - done)
                line = f"{done / sum(pairs):.0%} of {sum(pairs):,} pairs, {_duration(left)} left"
                _say(line, end="" if terminal and done < sum(pairs) else "\n", again=terminal)
    except KeyboardInterrupt:
        _say(f"{done:,} of {sum(pairs):,} pairs are kept in {parts.folder}: the same command goes on from there")
        raise


def _say(line: str, end: str = "\n", again: bool = False) -> None:
    print(f"\r\033[Kferrule: {line}" if again else f"ferrule: {line}", end=end, file=sys.stderr, flush=True)


def _duration(seconds: float) -> str:
    minutes, seconds = divmod(round(seconds), 60)
    return f"{minutes} min {seconds:02d} s" if minutes else f"{seconds} s"
