"""The grid of what is in stock on one screen: what goes with nothing first, then a letter for every pair."""

from __future__ import annotations

from collections.abc import Sequence
from string import ascii_lowercase
from typing import TYPE_CHECKING

from cli.cautions import CAUTIONS
from cli.console import Column, console, counted, page_lines, paragraph, table_lines
from cli.grid_files import letter
from cli.grid_screen import in_short, lone_line, lonely, question
from matcher.checks import Verdict

if TYPE_CHECKING:
    from cli.grid_files import Shown

#: Modules, and things that go with nothing, that are shown in any case, however low the screen is.
_LEAST = 3

#: A blank at which no line is broken.
_BLANK = "\u00a0"


def show(shown: Shown) -> None:
    """Print no more than a screen: blank lines go, reasons become check names, rows go, until it is short enough."""
    # One line less than there is room for: the note that articles wait for a decision stands on the same screen.
    print("\n".join(lines(shown, page_lines() - 1)))


def lines(shown: Shown, room: int) -> list[str]:
    """The lines of the answer, at most ``room`` where that can be had."""
    rows, lone, reasons, blank = len(_paired(shown)), sum(len(some) for _, some in lonely(shown)), True, True
    found = _page(shown, rows, lone, reasons, blank)
    while len(found) > room:
        if blank:
            blank = False
        elif reasons and lone:
            reasons = False
        elif max(rows, lone) <= _LEAST:
            break
        elif rows >= lone:
            rows -= 1
        else:
            lone -= 1
        found = _page(shown, rows, lone, reasons, blank)
    return found


def _page(shown: Shown, rows: int, lone: int, reasons: bool, blank: bool) -> list[str]:
    """The answer with so many modules, and so many of what goes with nothing."""
    ways = "--all shows module counts, DC/AC ratios and all reasons; --out FILE.xlsx writes them to a file."
    blocks = [
        paragraph(question(shown)),
        _alone(shown, lone, reasons),
        [*paragraph(_verdicts(shown)), *(_table(shown, rows) if shown.grid.pairs else ())],
        [*paragraph(ways), *paragraph(" ".join(CAUTIONS))],
    ]
    found: list[str] = []
    for block in blocks:
        found += [""] * (blank and bool(found) and bool(block)) + block
    return found


def _alone(shown: Shown, number: int, reasons: bool) -> list[str]:
    """What goes with nothing, and what stops its nearest pair: in words, or by the names of the checks."""
    every = [(kind, *one) for kind, some in lonely(shown) for one in some]
    if not every:
        return []
    found = paragraph("Go with nothing in stock, and what stops their nearest pair:")
    for kind, own, other, reason in every[:number]:
        line = lone_line(shown, kind, own, other, reason, brief=not reasons)
        found += paragraph(line, indent=2)
    if len(every) > number:
        found += paragraph(f"... and {len(every) - number:,} more (--all shows them).", indent=2)
    return found


def _verdicts(shown: Shown) -> str:
    """How many pairs go together, and what their letters mean."""
    said = in_short(shown)
    if shown.grid.pairs:
        said += " F fits, C to confirm (a safety rating is not on record), - no; pieces in brackets."
    return said


def _paired(shown: Shown) -> list[int]:
    return sorted({m for m, _ in shown.grid.pairs})


def _legend(shown: Shown, inverters: Sequence[int]) -> list[str]:
    """Which letter is which inverter; no line ends inside a name."""
    called = (
        f"{key} {shown.grid.inverters[i].name} ({shown.pieces[shown.grid.inverters[i].id]:,})".replace(" ", _BLANK)
        for key, i in zip(ascii_lowercase, inverters, strict=False)
    )
    return [line.replace(_BLANK, " ") for line in paragraph("Inverters: " + ", ".join(called) + ".")]


def _table(shown: Shown, rows: int) -> list[str]:
    """A row per module: a letter per inverter, or where those are too many for the width, how many take it."""
    grid, modules = shown.grid, _paired(shown)
    names = [f"{grid.modules[m].name} ({shown.pieces[grid.modules[m].id]:,})" for m in modules[:rows]]
    inverters = sorted({i for _, i in grid.pairs})
    room = console().width - max((len(name) for name in names), default=0) - 1
    if len(inverters) <= len(ascii_lowercase) and 2 * len(inverters) <= room:
        columns = [Column(key) for key in ascii_lowercase[: len(inverters)]]
        cells = [[letter(grid.pairs[m, i].verdict) if (m, i) in grid.pairs else "-" for i in inverters] for m in modules]
        legend = _legend(shown, inverters)
    else:
        columns = [Column("fits on", number=True), Column("to confirm on", number=True)]
        verdicts = [[pair.verdict for (own, _), pair in grid.pairs.items() if own == m] for m in modules]
        cells = [[f"{some.count(v):,}" for v in (Verdict.FITS, Verdict.TO_CONFIRM)] for some in verdicts]
        legend = []
    found = [line.rstrip() for line in table_lines(
        [Column("module", fold=True), *columns], [[name, *own] for name, own in zip(names, cells, strict=False)]
    )]  # fmt: skip
    if len(modules) > rows:
        found.append(f"... and {counted(len(modules) - rows, 'module')} more (--all shows them).")
    return found + legend
