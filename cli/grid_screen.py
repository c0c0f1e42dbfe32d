"""The grid of what is in stock on the terminal: blocks of inverters that fit the width, and what goes with nothing."""

from __future__ import annotations

from typing import TYPE_CHECKING

from cli.cautions import CAUTIONS
from cli.console import WIDTH, Column, counted, print_table, say
from cli.grid_files import letter

if TYPE_CHECKING:
    from cli.grid_files import Shown
    from matcher.grid import GridPair
    from matcher.near import Rejection

_MODULE_WIDTH = 24
_INVERTER_WIDTH = 12


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
    kinds = f"{counted(len(grid.modules), 'module')} and {counted(len(grid.inverters), 'inverter')}"
    say(f"{len(grid.pairs):,} of {counted(number, 'pair')} of {kinds}.")
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
    rows = sorted({m for m, _ in grid.pairs})
    names = [_folded(grid.modules[m].name, _MODULE_WIDTH) for m in rows]
    columns = []
    for i in sorted({i for _, i in grid.pairs}):
        cells = [_cell(grid.pairs[m, i]) if (m, i) in grid.pairs else "-" for m in rows]
        width = max(_INVERTER_WIDTH, *(len(cell) for cell in cells))
        inverter = grid.inverters[i]
        columns.append((width, _folded(f"{inverter.name} ({shown.pieces[inverter.id]:,})", width), cells))
    while columns:
        room, block = WIDTH - _MODULE_WIDTH - 8, []
        while columns and (not block or columns[0][0] < room):
            room -= columns[0][0] + 1
            block.append(columns.pop(0))
        say()
        print_table(
            [Column("module"), Column("pieces", number=True), *(Column(head) for _, head, _ in block)],
            [
                [name, f"{shown.pieces[grid.modules[m].id]:,}", *(cells[k] for _, _, cells in block)]
                for k, (m, name) in enumerate(zip(rows, names, strict=True))
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
    return f"{pair.fewest:,}" if pair.fewest == pair.most else f"{pair.fewest:,}-{pair.most:,}"
