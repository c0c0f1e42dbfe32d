"""The terminal: results on stdout, notes on stderr, tables that fit 100 columns and read well without colour."""

from __future__ import annotations

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


def console(stderr: bool = False) -> Console:
    """A console no wider than `WIDTH`; without colour where it is no terminal."""
    from rich.console import Console

    stream = sys.stderr if stderr else sys.stdout
    screen = Console(file=stream, highlight=False, soft_wrap=False, emoji=False, markup=False)
    width = min(screen.width, WIDTH) if stream.isatty() else WIDTH
    return Console(file=stream, highlight=False, emoji=False, markup=False, width=width)


#: Width below which a column is not folded further.
_LEAST_FOLD = 12


def print_table(columns: Sequence[Column], rows: Iterable[Sequence[str]]) -> None:
    """Print rows of text; numbers are set to the right and never wrapped."""
    for line in table_lines(columns, rows):
        print(line)


def table_lines(columns: Sequence[Column], rows: Iterable[Sequence[str]]) -> list[str]:
    """The lines of a table as `print_table` prints them."""
    from rich.table import Table

    rows = list(rows)
    table = Table(box=None, pad_edge=False, padding=(0, 1, 0, 0), header_style="bold", show_edge=False)
    needed = 0
    for k, column in enumerate(columns):
        # What must not fold keeps its width; the columns that may fold give way.
        whole = max(len(line) for text in (column.header, *(row[k] for row in rows)) for line in text.split("\n"))
        least = min(column.min_width or _LEAST_FOLD, whole) if column.fold else whole
        needed += least + 1
        table.add_column(
            column.header,
            justify="right" if column.number else "left",
            no_wrap=not column.fold,
            overflow="fold",
            vertical="top",
            min_width=least,
        )
    for row in rows:
        table.add_row(*row)
    screen = console()
    # A line that is too long is better than a value that is cut off.
    screen.width = max(screen.width, needed)
    with screen.capture() as captured:
        screen.print(table)
    return captured.get().splitlines()


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
