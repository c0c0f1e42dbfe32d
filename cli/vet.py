"""``ferrule vet``: whether bundles are sound, and what to change where they are not."""

from __future__ import annotations

from dataclasses import replace
from functools import partial
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from cli.opening import CatalogOption, open_catalog
from cli.siting import (
    AzimuthOption, CapOption, HighOption, LatOption, LonOption, LowOption, MountingOption, RearOption,
    SiteOption, TiltOption, WeatherOption, site_of,
)  # fmt: skip

if TYPE_CHECKING:
    from catalog.records import Inverter, Site
    from catalog.store import Catalog
    from matcher.vet import Bundle

UNSOUND = 1


def vet(
    bundles: Annotated[str | None, typer.Argument(metavar="LIST", help="A list of bundles, .csv or .xlsx: a row for each.")] = None,
    module: Annotated[str | None, typer.Option("--module", "-m", metavar="NAME", help="The module of one bundle.")] = None,
    count: Annotated[int | None, typer.Option(metavar="N", min=1, help="Modules of the bundle.")] = None,
    inverter: Annotated[str | None, typer.Option("--inverter", "-i", metavar="NAME", help="The inverter of the bundle.")] = None,
    units: Annotated[int, typer.Option(metavar="K", min=1, help="Inverters of the bundle.")] = 1,
    strings: Annotated[str | None, typer.Option(metavar="LIST", help="The wiring, where it is decided: 2x11,1x12 spreads these strings over the trackers as goes best; 2x11|1x12 says what each tracker of one inverter carries.")] = None,
    rules: Annotated[str, typer.Option(metavar="NAME", help="Rule set: iec-62548, nec-690, or a file of your own, .toml.")] = "iec-62548",
    combiner: Annotated[bool, typer.Option("--combiner", help="Strings are paralleled in a combiner box: string inputs are waived.")] = False,
    in_stock: Annotated[bool, typer.Option("--in-stock", help="Offer only inverters that are in stock in the place of one that does not fit.")] = False,
    checks: Annotated[bool, typer.Option("--checks", help="Show the clause or practice behind each check.")] = False,
    everything: Annotated[bool, typer.Option("--all", help="Show all lines of a list, not one screen of them.")] = False,
    json: Annotated[bool, typer.Option("--json", help="Print the document ferrule.vet/1 instead of tables.")] = False,
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
    """Judge bundles: N modules of one type and K inverters of one type, sold as one article.

    One bundle by its options, or a whole list. Without a site it tells in which climates a bundle is sound.
    Exit status: 0 all are sound (fits or to-confirm), 1 some are not or could not be judged, 2 bad input.

    Example: ferrule vet --module "klassik 275p" --count 14 --inverter "fiddle 3"
    """
    if (bundles is None) == (module is None and inverter is None and count is None and strings is None):
        raise CatalogError(
            "name one bundle (--module NAME --count N --inverter NAME), or a list of them (ferrule vet LIST.csv)"
        )
    from cli.asking import rule_set

    rule = rule_set(rules)
    with open_catalog(catalog) as opened:
        given = dict(mounting=mounting, voltage_cap=voltage_cap, rear_share=rear_share, lat=lat, lon=lon, tilt=tilt,
                     azimuth=azimuth, weather=weather)  # fmt: skip
        place, like = place_of(opened, site, low, high, given)
        if bundles is not None:
            return _list(opened, bundles, place, like, rule, combiner, in_stock, everything, json, out)
        from cli.choosing import choose_inverter, choose_module
        from matcher.vet import Vetter

        if module is None or inverter is None or (count is None and strings is None):
            raise CatalogError("a bundle needs --module, --inverter, and --count (or --strings)")
        chosen, other = choose_module(opened, module), choose_inverter(opened, inverter)
        inverters = opened.inverters()
        k = next(k for k, record in enumerate(inverters) if record.id == other.id)
        vetter = Vetter(inverters, rule, combiner, _available(opened, inverters, in_stock))
        bundle = bundle_of(chosen, k, count, units, strings)
        year = plane = None
        if place is not None:
            from cli.years import cold_plane, site_year
            from matcher.request import Request

            year = site_year(opened, place, chosen)
            plane = cold_plane(Request(place, rule))
        vetted = vetter.vet(bundle, place, year=year.year if year else None, plane=plane, like=like)
        fit = vetter.bench(chosen, vetted.site, plane).fit
    from cli import table_files, vet_files, vet_report
    from cli.bundle_lists import BundleRow
    from cli.console import print_json
    from cli.vet_lists import Line
    from cli.vet_screen import show, year_lines

    row = BundleRow(1, "", chosen.name, str(bundle.modules), other.name, str(units), strings or "", site or "")
    line = Line(row, vetted.verdict, vetted)
    if out is not None:
        page = partial(vet_report.write_bundle, vetted, fit, year)
        table_files.write(vet_files.forms([line], rule, page, year_lines(year)), out)
    if json:
        print_json(vet_files.document([line], rule))
    elif out is None:
        show(vetted, year, checks)
    return 0 if vetted.sound else UNSOUND


def bundle_of(module, inverter: int, count: int | None, units: int, strings: str | None) -> Bundle:
    """A bundle from the command line's words."""
    from cli.ranges import strings_of
    from matcher.vet import Bundle

    if strings is None:
        assert count is not None
        return Bundle(module, inverter, count, units)
    if "|" in strings:
        loads = loads_of(strings)
        return Bundle(module, inverter, count or units * sum(s * n for s, n in loads), units, loads=loads)
    pairs = strings_of(strings)
    return Bundle(module, inverter, count or sum(n * s for n, s in pairs), units, strings=pairs)


def loads_of(text: str) -> tuple[tuple[int, int], ...]:
    """What each tracker carries, ``2x11|1x12``: (strings, modules in series).

    Raises
    ------
    CatalogError
        Where a part is not of this form.
    """
    from cli.ranges import strings_of

    found = []
    for part in text.split("|"):
        pairs = strings_of(part)
        if len(pairs) != 1:
            raise CatalogError(f"--strings {text}: a tracker takes strings of one length; write 2x11|1x12")
        (length, strings), = pairs
        found.append((strings, length))
    return tuple(found)


def place_of(catalog: Catalog, site: str | None, low: float | None, high: float | None, given: dict) -> tuple[Site | None, Site]:
    """The site that is meant, if any, and what is known of the place besides its temperatures."""
    from matcher.vet import ANYWHERE

    if site is not None or (low is not None and high is not None):
        place = site_of(catalog, site, low=low, high=high, **given)
        return place, place
    if low is not None or high is not None:
        raise CatalogError("give both design temperatures, --low and --high, or neither to be told the climates")
    if given["weather"] is not None or given["lat"] is not None:
        raise CatalogError("a place needs its design temperatures too: --low and --high in degC")
    from catalog.sites import checked

    names = {"mounting": "mounting", "voltage_cap": "voltage_cap_v", "rear_share": "rear_share"}
    known = {field: given[option] for option, field in names.items() if given[option] is not None}
    return None, checked(replace(ANYWHERE, **known))


def _available(catalog: Catalog, inverters: list[Inverter], in_stock: bool) -> list[bool] | None:
    """Whether each inverter may take another's place; all may, where the stock does not matter."""
    if not in_stock:
        return None
    from cli.in_stock import held

    there = held(catalog, "inverter")
    return [there.get(record.id, 0) > 0 for record in inverters]


def _list(
    catalog: Catalog, path: str, site: Site | None, like: Site, rules, combiner: bool, in_stock: bool,
    everything: bool, json: bool, out: str | None,
) -> int:  # fmt: skip
    from cli.bundle_lists import read_bundles
    from cli.console import note, on_terminal
    from cli import table_files, vet_files, vet_report
    from cli.console import print_json
    from cli.vet_lists import vet_rows
    from cli.vet_screen import show_list, summary, year_words

    read = read_bundles(path)
    for line in read.mapping:
        note(line)
    if not read.rows:
        raise CatalogError(f"{path}: no bundle stands below the heading")
    available = _available(catalog, catalog.inverters(), in_stock) if in_stock else None
    with on_terminal("Vetted", "bundles") as progress:
        vetted = vet_rows(catalog, read.rows, site, like, rules, combiner, available, progress)
    lines = vetted.lines
    if out is not None:
        page = partial(vet_report.write_list, vetted, rules, path)
        table_files.write(vet_files.forms(lines, rules, page, year_words(vetted)), out)
        note(f"{summary(lines)} Written to {out}.")
    if json:
        print_json(vet_files.document(lines, rules))
    elif out is None:
        show_list(vetted, everything)
    return 0 if all(line.vetted is not None and line.vetted.sound for line in lines) else UNSOUND
