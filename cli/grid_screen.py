"""The grid of what is in stock on the terminal, whole: what goes with nothing, and blocks of inverters that fit the width."""

from __future__ import annotations

from typing import TYPE_CHECKING

from cli.cautions import CAUTIONS
from cli.console import Column, console, counted, print_table, say
from cli.grid_files import letter

if TYPE_CHECKING:
    from cli.grid_files import Shown
    from matcher.grid import GridPair
    from matcher.near import Rejection

_MODULE_WIDTH = 24
_INVERTER_WIDTH = 12


def show(shown: Shown) -> None:
    """Print the whole: question, what goes with nothing, the grid with counts and ratios."""
    grid = shown.grid
    say(question(shown))
    for kind, lone in lonely(shown):
        say()
        say(f"Go with nothing in stock ({kind}s), and what stops their nearest pair:")
        for own, other, reason in lone:
            say(lone_line(shown, kind, own, other, reason), indent=2)
    say()
    say(in_short(shown))
    if grid.pairs:
        say(
            "F fits, C to confirm (a safety rating is not on record), then from how many to how many modules on one"
            " inverter, and the DC/AC ratio of the best arrangement."
        )
        _blocks(shown)
    say()
    for line in shown.year.notes or (f"No clipping figure: {shown.year.why_not}.",):
        say(line)
    for line in CAUTIONS:
        say(line)


def question(shown: Shown) -> str:
    """The question as a sentence."""
    r = shown.grid.fit.request
    site = r.site
    return (
        f"Which modules and inverters in stock go together at {site.design_low_c:g} to {site.design_high_c:g} degC,"
        f" {site.mounting}? One inverter, DC/AC {r.ratio[0]:.2f} to {r.ratio[1]:.2f}, rules {r.rules.name}."
    )


def in_short(shown: Shown) -> str:
    """How many pairs go together, of how many."""
    grid = shown.grid
    number = len(grid.modules) * len(grid.inverters)
    kinds = f"{counted(len(grid.modules), 'module')} and {counted(len(grid.inverters), 'inverter')}"
    return f"{len(grid.pairs):,} of {counted(number, 'pair')} of {kinds} go together."


def lonely(shown: Shown) -> list[tuple[str, list[tuple[int, int, Rejection]]]]:
    """What goes with nothing, by kind: own place, place of the nearest of the other kind, reason."""
    found = (("module", shown.grid.lone_modules), ("inverter", shown.grid.lone_inverters))
    return [(kind, list(lone)) for kind, lone in found if lone]


def lone_line(shown: Shown, kind: str, own: int, other: int, reason: Rejection, brief: bool = False) -> str:
    """Why a module or inverter goes with nothing; ``brief`` names the checks only, where there are any."""
    records, others = shown.grid.modules, shown.grid.inverters
    if kind == "inverter":
        records, others = others, records
    name = f"{records[own].name} ({shown.pieces[records[own].id]:,})"
    if not reason.failed:
        return f"{name}: {reason.nearest}"
    stopped = f"{name}: with {others[other].name} {', '.join(reason.failed)}"
    return stopped if brief else f"{stopped}: {reason.nearest}"


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
        room, block = console().width - _MODULE_WIDTH - 8, []
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
