"""The terminal: results on stdout, notes on stderr, tables that fit 100 columns and read well without colour."""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from rich.console import Console

WIDTH = 100


@dataclass(frozen=True, slots=True)
class Column:
    """A column of a table: its header with unit, whether it holds numbers, whether it may fold, its least width."""

    header: str
    number: bool = False
    fold: bool = False
    min_width: int | None = None


#: Asks for plain text on a terminal too, where it is set.
PLAIN = "FERRULE_PLAIN"


def console(stderr: bool = False) -> Console:
    """A console no wider than `WIDTH`; without bold and colour where it is no terminal, or plain text is asked for."""
    from rich.console import Console

    stream = sys.stderr if stderr else sys.stdout
    screen = Console(file=stream, highlight=False, soft_wrap=False, emoji=False, markup=False)
    width = min(screen.width, WIDTH) if stream.isatty() else WIDTH
    plain = bool(os.environ.get(PLAIN))
    return Console(
        file=stream, highlight=False, emoji=False, markup=False, width=width, color_system=None if plain else "auto"
    )


#: Width below which a column is not folded while others can still give way, and its width in the narrowest table.
_LEAST_FOLD, _NARROWEST = 12, 8

#: Rows up to which it is tried how to share the width out for the fewest lines.
_WEIGHED = 200


def print_table(columns: Sequence[Column], rows: Iterable[Sequence[str]]) -> None:
    """Print rows of text; numbers are set to the right and never wrapped."""
    for line in table_lines(columns, rows):
        print(line)


def table_lines(columns: Sequence[Column], rows: Iterable[Sequence[str]]) -> list[str]:
    """The lines of a table as `print_table` prints them: no wider than the screen, and no cell of numbers cut."""
    from rich.table import Table

    rows = list(rows)
    screen = console()
    headers, widths = _fitted(columns, rows, screen.width)
    table = Table(box=None, pad_edge=False, padding=(0, 1, 0, 0), header_style="bold", show_edge=False)
    for column, header, width in zip(columns, headers, widths, strict=True):
        table.add_column(
            header,
            justify="right" if column.number else "left",
            no_wrap=not column.fold,
            overflow="fold",
            vertical="top",
            width=width,
        )
    for row in rows:
        table.add_row(*(_folded(text, w) if c.fold else text for text, c, w in zip(row, columns, widths, strict=False)))
    # A line that is too long is better than a value that is cut off.
    screen.width = max(screen.width, sum(widths) + len(widths))
    with screen.capture() as captured:
        screen.print(table)
    return captured.get().splitlines()


def _fitted(columns: Sequence[Column], rows: Sequence[Sequence[str]], room: int) -> tuple[list[str], list[int]]:
    """Headers and widths of the columns: what must not fold keeps its width, and the others give way.

    Headers over two lines where the table cannot do without, or has fewer lines with them.
    """
    spare = room - (len(columns) - 1)
    cells = [max((_width(row[k]) for row in rows), default=0) for k in range(len(columns))]
    plain = [c.header for c in columns]
    narrow = [h if c.fold else _narrowed(h, cell) for c, h, cell in zip(columns, plain, cells, strict=True)]
    widths, narrow_widths = (_widths(columns, headers, rows, cells, spare) for headers in (plain, narrow))
    if sum(widths) > spare or _lines(columns, rows, narrow_widths) < _lines(columns, rows, widths):
        return narrow, narrow_widths
    return plain, widths


def _widths(
    columns: Sequence[Column], headers: Sequence[str], rows: Sequence[Sequence[str]], cells: Sequence[int], spare: int
) -> list[int]:
    """Widths with which the rows take the fewest lines, columns that may fold no narrower than their words if it can be."""
    words = [max((_width(w) for row in rows for w in row[k].replace("\n", " ").split(" ")), default=0) for k in range(len(columns))]
    whole = [max(_width(h), cell) for h, cell in zip(headers, cells, strict=True)]
    soft = [min(c.min_width or _LEAST_FOLD, w) if c.fold else w for c, w in zip(columns, whole, strict=True)]
    least = soft
    for least in (
        [min(w, max(s, word)) for s, w, word in zip(soft, whole, words, strict=True)],
        soft,
        [min(s, max(_NARROWEST, word)) if c.fold else s for c, s, word in zip(columns, soft, words, strict=True)],
        [min(s, _NARROWEST) if c.fold else s for c, s in zip(columns, soft, strict=True)],
    ):
        if sum(least) <= spare:
            break
    firsts = [None, *(k for k, c in enumerate(columns) if c.fold)] if len(rows) <= _WEIGHED else [None]
    shares = [_shared_out(least, whole, spare, k) for k in firsts]
    if len(shares) == 1 or sum(whole) <= spare:
        return shares[0]
    return min(shares, key=lambda widths: _lines(columns, rows, widths))


def _lines(columns: Sequence[Column], rows: Sequence[Sequence[str]], widths: Sequence[int]) -> int:
    """Lines of the rows of a table."""
    return sum(
        max((_folded(text, w).count("\n") + 1 for text, c, w in zip(row, columns, widths, strict=False) if c.fold), default=1)
        for row in rows
    )


def _shared_out(least: Sequence[int], whole: Sequence[int], spare: int, first: int | None = None) -> list[int]:
    """Widths from the least to the whole; what is there to share goes to the ``first``, then to those that lack most."""
    widths = list(least)
    left = max(0, spare - sum(widths))
    if first is not None:
        given = min(left, whole[first] - widths[first])
        widths[first] += given
        left -= given
    for _ in range(left):
        lacking = [w - now for w, now in zip(whole, widths, strict=True)]
        most = max(lacking, default=0)
        if most <= 0:
            break
        widths[lacking.index(most)] += 1
    return widths


def _width(text: str) -> int:
    """Columns of a screen that a text takes, of its longest line."""
    from rich.cells import cell_len

    return max(map(cell_len, text.split("\n")))


def _folded(text: str, width: int) -> str:
    """A text over several lines, where a no-break space does not break."""
    import textwrap

    if len(text) <= width and "\n" not in text:
        return text.replace("\u00a0", " ")
    lines = [some for line in text.split("\n") for some in textwrap.wrap(line, max(width, 1), break_on_hyphens=False) or [""]]
    return "\n".join(lines).replace("\u00a0", " ")


def _narrowed(header: str, width: int) -> str:
    """A header over two lines at most, no wider than its cells where its words allow."""
    import textwrap

    for wide in range(max(width, 1), len(header) + 1):
        lines = textwrap.wrap(header, wide, break_long_words=False, break_on_hyphens=False)
        if len(lines) <= 2 and max(map(len, lines)) <= wide:
            return "\n".join(lines)
    return header


def say(text: str = "", indent: int = 0) -> None:
    """Print a paragraph of the result, wrapped at the width."""
    _wrapped(text, indent, stderr=False)


def note(text: str) -> None:
    """Print a note on stderr."""
    _wrapped(text, 0, stderr=True)


def _wrapped(text: str, indent: int, stderr: bool) -> None:
    for line in paragraph(text, indent, stderr):
        print(line, file=sys.stderr if stderr else sys.stdout)


def paragraph(text: str, indent: int = 0, stderr: bool = False) -> list[str]:
    """The lines of a paragraph as `say` prints them."""
    import textwrap

    pad = " " * indent
    return textwrap.wrap(text, console(stderr).width, initial_indent=pad, subsequent_indent=pad,
                         break_long_words=False, break_on_hyphens=False) or [""]  # fmt: skip


#: Lines of a short answer where no terminal says how high it is, and the least that a terminal is taken for.
_PAGE, _LEAST_PAGE = 40, 30


def page_lines() -> int:
    """Lines that a short answer may have: a terminal holds them and the prompt that follows."""
    import shutil

    return max(shutil.get_terminal_size().lines, _LEAST_PAGE) - 1 if sys.stdout.isatty() else _PAGE


@contextmanager
def on_terminal(done_word: str, things: str) -> Iterator[Callable[[int, int], None]]:
    """Progress of a long task, as one line that is written anew and goes when it is over; silent in a pipe."""
    if not sys.stderr.isatty():
        yield lambda done, of: None
        return
    begin = last = time.monotonic()

    def progress(done: int, of: int) -> None:
        nonlocal last
        now = time.monotonic()
        if now - last >= 0.5:
            last = now
            left = (now - begin) * (of - done) / done
            line = f"{done_word} {done:,} of {of:,} {things}, about {left:,.0f} s left"
            print(f"\r{line:<70}", end="", file=sys.stderr, flush=True)

    try:
        yield progress
    finally:
        if last > begin:
            print(f"\r{'':<70}\r", end="", file=sys.stderr, flush=True)


def print_json(document: Any) -> None:
    """Print a document on stdout; what is not finite has no place in it."""
    import json

    print(json.dumps(document, allow_nan=False, indent=1))


def number(value: float | None, digits: int = 0) -> str:
    """A number as text; blank where it is not known."""
    return "" if value is None else f"{value:,.{digits}f}"


def counted(number: int, what: str, many: str | None = None) -> str:
    """How many of something: "1 module", "2 modules", "1,200 entries" (``many`` is its plural, where no s makes it)."""
    return f"{number:,} {what if number == 1 else many or what + 's'}"
