"""The name of a record, taken apart for comparison with free text."""

from __future__ import annotations

import re
from collections.abc import Sequence
from functools import cached_property

from catalog import namekeys

#: An AC voltage in brackets at the end of a model.
VOLTS_AT_END = re.compile(r"\s*[\[(]\s*(\d{3})\s*v(?:ac)?\s*[\])]\s*$")


class Shape:
    """The name of a record, taken apart for comparison.

    The core of a model is what must stand in a text that means it: all of the model but the AC voltage
    in brackets at its end, and the words without digits at its beginning (product lines, and
    what a table counts to the model though it belongs to the maker).
    """

    def __init__(self, maker: str, model: str) -> None:
        volts = VOLTS_AT_END.search(model)
        self.volts = volts.group(1) if volts else None
        self.maker_words = [namekeys.folded(w) for w in re.findall(r"[^\W_]+", maker)]
        self.verbatim, lines = core_of(model[: volts.start()] if volts else model, self.maker_words)
        self.line_words = [namekeys.folded(w) for w in lines]
        self.plain = namekeys.compact(self.verbatim)
        self.core = namekeys.folded(self.plain)

    @cached_property
    def chunks(self) -> list[str]:
        """Pieces of the core between separators, decimal numbers whole, longest first."""
        pieces = re.findall(r"[^\W_]+(?:(?<=\d)\.(?=\d)[^\W_]+)*", self.verbatim)
        return sorted((p.replace(".", "") for p in pieces), key=len, reverse=True)

    @cached_property
    def numbers(self) -> list[str]:
        """Numbers in the core, decimal points kept."""
        return re.findall(r"\d+(?:\.\d+)?", self.verbatim)


def core_of(model: str, maker_words: Sequence[str] = ()) -> tuple[str, list[str]]:
    """Split a squeezed model into its core and the words without digits before it."""
    lines: list[str] = []
    rest = model
    while True:
        first = re.match(r"[^\w]*([^\W\d_]+)(?:[^\w]*\s[^\w]*)(?=.*\d)", rest)
        if not first or (len(first.group(1)) < 4 and namekeys.folded(first.group(1)) not in maker_words):
            return rest, lines
        lines.append(first.group(1))
        rest = rest[first.end() :]
