"""Normal forms of maker and model names.

Three forms, from fine to coarse:

* *squeezed*: case folded, accents dropped, every run of white space one space; punctuation stays;
* *compact*: squeezed, then letters, digits and ``+`` only ("AF6K-270P" and "af6k 270p" are ``af6k270p``);
* *folded*: compact without ``+``, and the letters that a scanner takes for digits written as those digits.

All work on whole lists at once: the names are joined to one text, changed there, and split again, which
takes some 20 ms for 25,000 names where a call per name takes ten times that.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Sequence

#: Letters that scanned text confuses with digits (case folded): O, I, l, S, B; ``|`` stands for I or l.
SCANNER_DIGITS = str.maketrans("oilsb|", "011581")

_DROP_ASCII = {i: None for i in range(128) if not chr(i).isalnum() and chr(i) not in "+\n"}
_NOT_COMPACT = re.compile(r"[^\w+\n]|_")
_ACCENTS = re.compile(r"[\u0300-\u036f]")
_WORD = re.compile(r"\d+(?:[.,]\d+)+|[^\W_]+\+?")
_RUN = re.compile(r"\d+|[^\W\d_]+|\+")


def squeezed(text: str) -> str:
    """Text case folded, without accents, with single spaces."""
    return _unaccented(" ".join(text.split())).casefold()


def squeezed_all(texts: Iterable[str]) -> list[str]:
    """`squeezed` of every text."""
    return "\n".join([_unaccented(" ".join(text.split())) for text in texts]).casefold().split("\n")


def compact(text: str) -> str:
    """Letters, digits and ``+`` of the text, case folded."""
    return compact_all([squeezed(text)])[0]


def compact_all(texts: Sequence[str]) -> list[str]:
    """`compact` of every squeezed text."""
    joined = "\n".join(texts)
    if joined.isascii():
        return joined.translate(_DROP_ASCII).split("\n")
    return _NOT_COMPACT.sub("", joined).split("\n")


def folded(compact_text: str) -> str:
    """Compact text with the letters that look like digits written as digits."""
    return compact_text.replace("+", "").translate(SCANNER_DIGITS)


def words(squeezed_text: str) -> list[str]:
    """Words of a squeezed text: runs of letters and digits, numbers with a decimal point or comma whole."""
    return _WORD.findall(squeezed_text)


def runs(text: str) -> list[str]:
    """Runs of digits and runs of letters, in order: ``af6k270p`` is af, 6, k, 270, p."""
    return _RUN.findall(text)


def digit_runs(text: str) -> list[str]:
    """Runs of digits, in order."""
    return re.findall(r"\d+", text)


def _unaccented(text: str) -> str:
    if text.isascii():
        return text
    return _ACCENTS.sub("", unicodedata.normalize("NFKD", text))
