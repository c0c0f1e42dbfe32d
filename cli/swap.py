"""``ferrule swap``: a module or an inverter cannot be had; what takes its place with the wiring unchanged."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated, TypeAlias

import typer

from catalog.errors import CatalogError
from cli.opening import CatalogOption, open_catalog
from cli.siting import (
    AzimuthOption, CapOption, HighOption, LatOption, LonOption, LowOption, MountingOption, RearOption,
    SiteOption, TiltOption, WeatherOption,
)  # fmt: skip
from cli.vet import place_of

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from catalog.records import Inverter, Module, Site
    from catalog.stock import StockItem
    from catalog.store import Catalog
    from cli.years import SiteYear
    from matcher.fit import Fit, Option
    from matcher.options import Unit
    from matcher.rules import RuleSet
    from matcher.swap import Swaps
    from matcher.vet import Vetted, Vetter

#: Candidates worked out in full, each with what it was worked out in.
Full: TypeAlias = "list[tuple[Fit, Option]]"

NOTHING_TAKES_ITS_PLACE = 1

#: Candidates that are worked out in full (checks, clipping, climate) for files and documents.
EXPLAINED = 100


class Unsound(Exception):
    """The array itself is not sound, so that nothing can take a place in it."""


@dataclass(eq=False)
class Question:
    """What was asked and what came out, for the screen and for files."""

    module: Module
    inverter: Inverter
    site: Site
    rules: RuleSet
    combiner: bool
    vetted: Vetted
    wired: tuple[Unit, ...]
    replaces_inverter: bool
    stock: Mapping[int, Sequence[StockItem]] | None
    part: int | None
    records: Sequence[Module] | Sequence[Inverter]
    swaps: Swaps
    old_year: SiteYear | None
    within_pct: float

    @property
    def within(self) -> int:
        """Candidates whose power differs by no more than `within_pct`."""
        if self.part is not None:
            return 0
        return int((abs(self.swaps.changes["power"]) <= self.within_pct + 1e-9).sum())

    @property
    def name(self) -> str:
        """Name of what cannot be had."""
        return self.inverter.name if self.replaces_inverter else self.module.name


def swap(
    module: Annotated[str, typer.Option("--module", "-m", metavar="NAME", help="The module of the array.")],
    inverter: Annotated[str, typer.Option("--inverter", "-i", metavar="NAME", help="The inverter of the array.")],
    strings: Annotated[str | None, typer.Option(metavar="LIST", help="How one inverter is wired: 2x11|1x12 says what each tracker carries; 2x11,1x12 spreads these strings as goes best.")] = None,
    count: Annotated[int | None, typer.Option(metavar="N", min=1, help="Modules, where the wiring is not decided: the best way to wire them is then kept.")] = None,
    units: Annotated[int, typer.Option(metavar="K", min=1, help="Inverters of the array.")] = 1,
    replaced: Annotated[str, typer.Option("--replace", metavar="WHAT", help="What cannot be had: module or inverter.")] = "module",
    part: Annotated[int | None, typer.Option(metavar="K", min=1, help="Only so many modules are replaced: the others stay, and unlike modules are wired together.")] = None,
    in_stock: Annotated[bool, typer.Option("--in-stock", help="Only what is in stock in sufficient number.")] = False,
    rules: Annotated[str, typer.Option(metavar="NAME", help="Rule set: iec-62548, nec-690, or a file of your own, .toml.")] = "iec-62548",
    combiner: Annotated[bool, typer.Option("--combiner", help="Strings are paralleled in a combiner box: string inputs are waived.")] = False,
    within: Annotated[float, typer.Option(metavar="PCT", min=0.0, help="How far the power of a like replacement may differ [%]; it is counted and bounds nothing.")] = 5.0,
    limit: Annotated[int, typer.Option(metavar="N", min=1, help="Candidates shown on screen.")] = 10,
    json: Annotated[bool, typer.Option("--json", help="Print the document ferrule.swap/1 instead of tables.")] = False,
    out: Annotated[str | None, typer.Option(metavar="FILE", help="Write the result to a file; its ending decides the form: .csv, .xlsx, .json or .html.")] = None,
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
    """Find what takes the place of a module (or an inverter) that cannot be had, with the wiring unchanged.

    Without a site a candidate must hold in every climate that the array itself holds in. With --part, only some modules are replaced; then it tells what unlike modules in one string, and unlike
    strings on one tracker, cost. Exit status: 0 something takes its place, 1 nothing does, 2 bad input.

    Example: ferrule swap -m "klassik 270p" -i "viola 5" --strings "1x11|1x11" --low -12 --high 37
    """
    if replaced not in ("module", "inverter"):
        raise CatalogError(f"--replace {replaced}: it is module or inverter")
    if part is not None and replaced == "inverter":
        raise CatalogError("--part is about modules: leave --replace inverter away")
    if strings is not None and count is not None:
        raise CatalogError("give --strings or --count, not both: --count wires the modules the best way, --strings says the wiring")
    if strings is None and count is None:
        raise CatalogError("say how the array is wired: --strings 2x11|1x12, or --count N for the best way")
    with open_catalog(catalog) as opened:
        given = dict(mounting=mounting, voltage_cap=voltage_cap, rear_share=rear_share, lat=lat, lon=lon, tilt=tilt,
                     azimuth=azimuth, weather=weather)  # fmt: skip
        place, like = place_of(opened, site, low, high, given)
        from cli import swap_files, swap_screen, table_files
        from cli.console import note, print_json, say

        try:
            question = _asked(
                opened, place, like, module, inverter, strings, count, units, replaced, part, in_stock, rules, combiner,
                within,
            )  # fmt: skip
        except Unsound as found:
            # An answer and no bad input; it has no document.
            (note if json or out is not None else say)(f"Nothing: {found}")
            return NOTHING_TAKES_ITS_PLACE

        shown = EXPLAINED if out is not None or json else limit
        full = explained(opened, question, shown)
    if out is not None:
        table_files.write(swap_files.forms(question, full), out)
    if json:
        print_json(swap_files.document(question, full))
    elif out is None:
        swap_screen.show(question, full, limit)
    return 0 if len(question.swaps) else NOTHING_TAKES_ITS_PLACE


def _asked(
    catalog: Catalog, site: Site | None, like: Site, module: str, inverter: str, strings: str | None, count: int | None, units: int,
    replaced: str, part: int | None, in_stock: bool, rules: str, combiner: bool, within: float,
) -> Question:  # fmt: skip
    from cli.asking import rule_set
    from cli.choosing import choose_inverter, choose_module
    from cli.in_stock import held_lots, pieces_of
    from cli.vet import bundle_of
    from cli.years import cold_plane, site_year
    from matcher.request import Request
    from matcher.swap import swap_inverter, swap_module
    from matcher.vet import Vetter

    rule = rule_set(rules)
    old, own = choose_module(catalog, module), choose_inverter(catalog, inverter)
    year = None if site is None else site_year(catalog, site, old)
    plane = None if site is None else cold_plane(Request(site, rule))
    vetter: Vetter = Vetter([own], rule, combiner)
    # The strings are those of one inverter here, and all are wired alike.
    bundle = bundle_of(old, 0, count, 1 if strings is not None else units, strings)
    vetted = vetter.vet(bundle, site, year=year and year.year, plane=plane, mending=False, like=like)
    if site is None:
        if not vetted.sound:
            raise Unsound(
                f"this wiring is sound in no climate with {old.name} itself; 'ferrule vet' says what would mend it."
            )
        site = vetted.site
    if not vetted.wired or (count is not None and sum(u.copies * u.modules for u in vetted.wired) != count):
        raise Unsound(
            f"this wiring cannot be kept, it is not sound with {old.name} itself: {vetted.reason or vetted.verdict};"
            " 'ferrule vet' says what would mend it."
        )
    from matcher.options import Unit

    wired = vetted.wired if strings is None else tuple(Unit(units * u.copies, u.trackers) for u in vetted.wired)
    total = sum(u.copies * u.modules for u in wired)
    if part is not None and part >= total:
        raise CatalogError(f"--part {part}: the array has {total} modules; leave --part away to replace them all")
    stock = None
    records: Sequence = catalog.inverters() if replaced == "inverter" else catalog.modules()
    if in_stock:
        needed = sum(u.copies for u in wired) if replaced == "inverter" else part or total
        stock = held_lots(catalog, replaced)
        records = [r for r in records if pieces_of(stock.get(r.id, ())) >= needed]
    if replaced == "inverter":
        swaps = swap_inverter(old, own, wired, records, site, rule, combiner, plane)
    elif part is None:
        swaps = swap_module(old, own, wired, records, site, rule, combiner, plane)
    else:
        from matcher.partswap import swap_part

        swaps = swap_part(old, own, wired, part, records, site, rule, combiner, plane)
    return Question(
        old, own, site, rule, combiner, vetted, wired, replaced == "inverter", stock, part, records, swaps, year,
        within,
    )  # fmt: skip


def explained(catalog: Catalog, question: Question, limit: int) -> Full:
    """The first candidates of a whole replacement in full: checks, climate window and, where a year is known, clipping."""
    if question.part is not None:
        return []
    from cli.years import cold_plane, site_year
    from matcher.bench import Bench
    from matcher.checks import Verdict
    from matcher.columns import InverterColumns
    from matcher.request import Request

    swaps, site = question.swaps, question.site
    index = swaps.index[:limit].tolist()
    plane = cold_plane(Request(site, question.rules))
    found = []
    for k, record in enumerate(question.records[j] for j in index):
        module = question.module if question.replaces_inverter else record
        inverter = record if question.replaces_inverter else question.inverter
        year = site_year(catalog, site, module)
        bench = Bench.of(
            module, InverterColumns.of([inverter]), site, question.rules, question.combiner, year.year, plane,
        )  # fmt: skip
        outcome = Verdict.TO_CONFIRM if swaps.to_confirm[k] else Verdict.FITS
        wired = swaps.wired[k] if question.replaces_inverter else question.wired
        found.append((bench.fit, bench.option_of(0, wired, outcome)))
    return found
