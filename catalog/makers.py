"""Tell maker and model of a module apart where a table writes "Maker Model" with no mark between them."""

from __future__ import annotations

import re
import tomllib
from functools import cache, lru_cache
from importlib.resources import files
from typing import NamedTuple

_NUMBERED = re.compile(r" [^ \d]*\d")  # a word with a digit, and not the first of the name
_CODE = re.compile(r"[A-Z]{1,4}(-[A-Z]{1,2})?")  # "SLX", "SLA-X": part of a model where a number follows
_DOTTED = re.compile(r"[A-Za-z]+\.[A-Za-z]{2,}(-[A-Za-z]+)*")  # "Q.PEAK"


class _Words(NamedTuple):
    legal_forms: frozenset[str]
    company_words: frozenset[str]
    product_lines: tuple[list[str], ...]
    makers: tuple[list[str], ...]


@cache
def _words() -> _Words:
    data = tomllib.loads(files("catalog").joinpath("makers.toml").read_text(encoding="utf-8").casefold())
    return _Words(
        legal_forms=frozenset(data["legal_forms"]),
        company_words=frozenset(data["company_words"]),
        product_lines=tuple(line.split() for line in data["product_lines"]),
        makers=tuple(maker.split() for maker in data["makers"]),
    )


def split_maker(name: str) -> tuple[str, str]:
    """Split a module's full name into maker and model.

    The model begins at the first word with a digit, and earlier where the words before it show that they are
    no part of a company's name: after a legal form ("Co._ Ltd."), at a repetition of the maker's first word
    ("Conergy Conergy P 170M"), at a dotted name ("Q.PEAK L-G4.2 370"), at a product line (a list, in
    ``makers.toml``), and at a short code just before the number ("Solar Liberty SLX 235").

    Parameters
    ----------
    name : str
        Full name, "Maker Model"; runs of blanks count as one.

    Returns
    -------
    tuple of str
        Maker and model; joined by a blank they are ``name`` again. The model is empty where ``name`` is one
        word.
    """
    name = " ".join(name.split())
    number = _NUMBERED.search(name)
    maker = _maker(name[: number.start()], True) if number else _maker(name, False)
    return maker, name[len(maker) + 1 :]


# A table has some 40 rows for each different head.
@lru_cache(maxsize=4096)
def _maker(head: str, numbered: bool) -> str:
    """Maker at the start of ``head``; ``numbered`` where a word with a digit follows it."""
    words = head.split()
    return " ".join(words[: _model_start(words, numbered)])


def _model_start(words: list[str], numbered: bool) -> int:
    known = _words()
    lower = [word.casefold() for word in words]
    for maker in known.makers:
        if lower[: len(maker)] == maker:
            return len(maker)
    for k in range(1, len(words)):
        if (
            _closes_company(lower, k - 1)
            or lower[k] == lower[0]
            or (_DOTTED.fullmatch(words[k]) and not _is_legal_form(lower[k]))
            or any(lower[k : k + len(line)] == line for line in known.product_lines)
        ):
            return k
    start = len(words)
    while start > 1 and _is_code(words[start - 1]):
        start -= 1
    # With neither a number nor a code, the last word is all that can be the model.
    return start if numbered or start < len(words) else max(1, start - 1)


def _is_legal_form(word: str) -> bool:
    return re.sub("[,_()]", "", word).removesuffix(".") in _words().legal_forms


def _closes_company(lower: list[str], k: int) -> bool:
    """Whether word ``k`` is a legal form that closes the company's name."""
    after = lower[k + 1]
    carries_on = after == "of" or after.startswith("(") or _is_legal_form(after)
    return k > 0 and _is_legal_form(lower[k]) and not carries_on


def _is_code(word: str) -> bool:
    """Whether a word before the number is a code ("SLX") or in small letters ("c-Si"), no company word."""
    if word.casefold() in _words().company_words or _is_legal_form(word.casefold()):
        return False
    return word == "-" or bool(_CODE.fullmatch(word)) or word[0].islower()
