"""The grid of what is in stock on the terminal: blocks of inverters that fit the width, and what goes with nothing."""

from __future__ import annotations

from typing import TYPE_CHECKING

from cli.cautions import CAUTIONS
from cli.console import WIDTH, Column, print_table, say
from cli.grid_files import letter

if TYPE_CHECKING:
    from cli.grid_files import Shown
    from matcher.grid import GridPair
    from matcher.near import Rejection

_MODULE_WIDTH = 26


def show(shown: Shown) -> None:
    """Print question, grid, and what goes with nothing."""
    grid, r = shown.grid, shown.grid.fit.request
    site = r.site
    say(
        f"Which modules and inverters in stock go together at {site.design_low_c:g} to {site.design_high_c:g} degC,"
        f" {site.mounting}? One inverter, DC/AC {r.ratio[0]:.2f} to {r.ratio[1]:.2f}, rules {r.rules.name}."
    )
    say()
    number = len(grid.modules) * len(grid.inverters)
    say(f"{len(grid.pairs):,} of {number:,} pairs of {len(grid.modules):,} modules and {len(grid.inverters):,} inverters.")
    if grid.pairs:
        say(
            "F fits, C to confirm (a safety rating is not on record), then from how many to how many modules on one"
            " inverter, and the DC/AC ratio of the best arrangement."
        )
        _blocks(shown)
    for kind, lone in (("module", grid.lone_modules), ("inverter", grid.lone_inverters)):
        if lone:
            say()
            say(f"Go with nothing in stock ({kind}s), and what stops their nearest pair:")
            for own, other, reason in lone:
                say(lone_line(shown, kind, own, other, reason), indent=2)
    say()
    for line in shown.year.notes or (f"No clipping figure: {shown.year.why_not}.",):
        say(line)
    for line in CAUTIONS:
        say(line)


def lone_line(shown: Shown, kind: str, own: int, other: int, reason: Rejection) -> str:
    """Why a module or inverter goes with nothing."""
    records, others = shown.grid.modules, shown.grid.inverters
    if kind == "inverter":
        records, others = others, records
    name = f"{records[own].name} ({shown.pieces[records[own].id]:,})"
    if not reason.failed:
        return f"{name}: {reason.nearest}"
    return f"{name}: with {others[other].name} {', '.join(reason.failed)}: {reason.nearest}"


def _blocks(shown: Shown) -> None:
    grid = shown.grid
    rows = [m for m in range(len(grid.modules)) if any((m, i) in grid.pairs for i in range(len(grid.inverters)))]
    columns = [i for i in range(len(grid.inverters)) if any((m, i) in grid.pairs for m in rows)]
    width = max(len(_cell(p)) for p in grid.pairs.values())
    width = max(width, 11)
    each = max(1, (WIDTH - _MODULE_WIDTH - 9) // (width + 1))
    for first in range(0, len(columns), each):
        block = columns[first : first + each]
        say()
        heads = [
            Column(_folded(f"{grid.inverters[i].name} ({shown.pieces[grid.inverters[i].id]:,})", width)) for i in block
        ]
        print_table(
            [Column("module", fold=True, min_width=_MODULE_WIDTH), Column("pieces", number=True), *heads],
            [
                [
                    grid.modules[m].name,
                    f"{shown.pieces[grid.modules[m].id]:,}",
                    *(_cell(grid.pairs[m, i]) if (m, i) in grid.pairs else "-" for i in block),
                ]
                for m in rows
            ],
        )


def _folded(text: str, width: int) -> str:
    """Text in lines of a width."""
    import textwrap

    return "\n".join(textwrap.wrap(text, width))


def _cell(pair: GridPair) -> str:
    return f"{letter(pair.verdict)} {span(pair)} {pair.best.dc_ac_ratio:.2f}"


def span(pair: GridPair) -> str:
    """Module counts from the fewest to the most."""
    return f"{pair.fewest}" if pair.fewest == pair.most else f"{pair.fewest}-{pair.most}"
