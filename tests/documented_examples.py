"""The examples of the documents: found, run in this process, compared with what is shown, and refreshed.

A fenced block ``console`` holds commands (``$ ...``), each followed by what it prints; a line ``...`` stands
for any number of lines. A fenced block with a file name behind its language, such as ``csv mine.csv``, is a
file that the reader writes; ``cp`` takes one from pvlib's data folder. The blocks of one document run one
after the other in one folder.
"""

from __future__ import annotations

import contextlib
import io
import os
import re
import shlex
import shutil
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

import pvlib

ROOT = Path(__file__).parent.parent
ELISION = "..."

_FENCE = re.compile(r"```(\w+)(?: (\S+))?\s*$")
#: What differs from run to run: seconds that something took, and the time of day.
_TIMES = re.compile(r"\b\d+\.\d s\b|\b20\d\d-\d\d-\d\d \d\d:\d\d\b")


@dataclass(frozen=True)
class File:
    """A file that the reader is told to write."""

    line: int
    name: str
    text: str


@dataclass(frozen=True)
class Command:
    """A command, the number of the line it stands in (from 0), and what the document shows of its output."""

    line: int
    typed: str
    shown: list[str] = field(default_factory=list)


def documents() -> list[Path]:
    """Documents that may hold examples."""
    return [ROOT / "README.md", ROOT / "DEVELOPERS.md", *sorted((ROOT / "docs").glob("*.md"))]


def steps(text: str) -> Iterator[File | Command]:
    """What a document has the reader do, in order."""
    lines = text.splitlines()
    number = 0
    while number < len(lines):
        fence = _FENCE.match(lines[number])
        if not fence:
            number += 1
            continue
        end = next(k for k in range(number + 1, len(lines)) if lines[k].startswith("```"))
        body = lines[number + 1 : end]
        if fence[1] == "console":
            yield from _commands(body, number + 1)
        elif fence[2]:
            yield File(number, fence[2], "\n".join(body) + "\n")
        number = end + 1


def _commands(body: list[str], first: int) -> Iterator[Command]:
    starts = [k for k, line in enumerate(body) if line.startswith("$ ")]
    for start, end in zip(starts, [*starts[1:], len(body)], strict=True):
        yield Command(first + start, body[start].removeprefix("$ "), _trimmed(body[start + 1 : end]))


def _trimmed(lines: list[str]) -> list[str]:
    """Lines without blanks at their ends, and without blank lines at the end."""
    lines = [line.rstrip() for line in lines]
    while lines and not lines[-1]:
        lines.pop()
    return lines


class Reader:
    """A reader at work in a folder of their own: files, environment, status of the last command."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        (folder / "seed_catalog").symlink_to(ROOT / "seed_catalog")  # a reader is in a clone
        self.environment = {"XDG_DATA_HOME": str(folder / "data")}
        self.status = 0

    def do(self, step: File | Command) -> list[str]:
        """Write the file or run the command, and return what a terminal would show."""
        if isinstance(step, File):
            (self.folder / step.name).write_text(step.text, encoding="utf-8")
            return []
        words = shlex.split(step.typed)
        if words[0] == "export":
            self.environment |= dict(word.split("=", 1) for word in words[1:])
            return []
        if words == ["echo", "$?"]:
            return [str(self.status)]
        if words[0] == "cp" and "/pvlib/data/" in words[1]:
            shutil.copy(Path(pvlib.__file__).parent / "data" / Path(words[1]).name, self.folder)
            return []
        if words[0] == "cat":
            return _trimmed((self.folder / words[1]).read_text(encoding="utf-8").splitlines())
        assert words[0] == "ferrule", f"{words[0]}: examples run ferrule, export, cp, cat and echo $?"
        return self._ferrule(words[1:])

    def _ferrule(self, arguments: list[str]) -> list[str]:
        from cli.main import run

        screen = io.StringIO()
        before = dict(os.environ)
        os.environ.pop("FERRULE_CATALOG", None)
        os.environ.update(self.environment)
        try:
            with (
                contextlib.chdir(self.folder),
                contextlib.redirect_stdout(screen),
                contextlib.redirect_stderr(screen),
            ):
                self.status = run(arguments)
        finally:
            os.environ.clear()
            os.environ.update(before)
        return _trimmed(screen.getvalue().replace(f"{self.folder}{os.sep}", "").splitlines())


def agree(shown: list[str], printed: list[str]) -> bool:
    """Whether a document shows what was printed, but for elisions and times."""
    parts = []
    for line in shown:
        exact = re.escape(_TIMES.sub("?", line)) + "\n"
        parts.append("(?:.*\n)*?" if line == ELISION else exact)
    pattern = "".join(parts)
    return re.fullmatch(pattern, "".join(_TIMES.sub("?", line) + "\n" for line in printed)) is not None


def renewed(shown: list[str], printed: list[str]) -> list[str]:
    """What the document should show now: as many lines of each part as before, elisions where they were."""
    if agree(shown, printed):
        return shown
    if ELISION not in shown:
        return printed
    cuts = [k for k, line in enumerate(shown) if line == ELISION]
    head = printed[: cuts[0]]
    tail = printed[len(printed) - (len(shown) - cuts[-1] - 1) :]
    middle: list[str] = []
    for start, end in zip(cuts, cuts[1:], strict=False):
        part = shown[start + 1 : end]
        first = next((k for k, line in enumerate(printed) if line.split()[:1] == part[0].split()[:1]), 0)
        middle += [ELISION, *printed[first : first + len(part)]]
    return [*head, *middle, ELISION, *tail]
