"""A supplier's free text, taken apart: its words, their places without separators, what they measure."""

from __future__ import annotations

import re
from dataclasses import dataclass

from catalog import namekeys, tradewords

_WORD = re.compile(r"(?:[^\W_]|(?<=\w)\||\|(?=\w))+")
_WATTS = re.compile(r"(\d+(?:[.,]\d+)?) ?(kwp?|kva|kwac|wp?|watts?|wc)(?![^\W_])")
_VOLTS = re.compile(r"(?<![^\W_])(\d{3}) ?v(?:ac|olts?)?(?![^\W_])")

#: Nominal AC voltages of grids and their common readings [V]; other voltages in a text are DC limits.
AC_VOLTS = frozenset(
    {"110", "115", "120", "127", "208", "220", "230", "240", "277", "347", "380", "400", "415", "480"}
)


@dataclass(frozen=True, slots=True)
class Word:
    """One word: as written (case folded), folded, its place in the joined text, and how it stands there."""

    raw: str
    folded: str
    start: int
    end: int
    gap: str  # what stands between it and the word before
    remark: bool  # a trade word or a measure: it may be part of a name, or be a remark about it

    @property
    def apart(self) -> bool:
        """Whether it begins a new item: after white space, or a mark that parts items of a list."""
        return _is_apart(self.gap)


class SupplierText:
    """A free text and what can be read off it without knowing any record."""

    def __init__(self, text: str) -> None:
        self.squeezed = namekeys.squeezed(text)
        self.key = namekeys.compact(text)
        self.words = _words(self.squeezed)
        #: All words folded and joined.
        self.joined = "".join(w.folded for w in self.words)
        #: The same, not folded.
        self.joined_raw = "".join(w.raw for w in self.words)
        self.starts = {w.start for w in self.words}
        self.ends = {w.end for w in self.words}
        #: Places inside words where letters and digits meet.
        self.seams = {
            i
            for i in range(1, len(self.joined_raw))
            if self.joined_raw[i].isdigit() != self.joined_raw[i - 1].isdigit()
        }
        self.remarks = 0
        #: Places of bare numbers that can be AC voltages.
        self.bare_volts = 0
        for w in self.words:
            if w.remark:
                self.remarks |= mask(w.start, w.end)
            elif w.apart and w.raw in AC_VOLTS:
                self.bare_volts |= mask(w.start, w.end)

    @property
    def watts(self) -> list[float]:
        """Powers that the text states [W]."""
        found = []
        for number, unit in _WATTS.findall(_digits_mended(self.squeezed)):
            value = float(number.replace(",", "."))
            found.append(value * 1000 if unit.startswith("k") else value)
        return found

    @property
    def ac_volts(self) -> set[str]:
        """AC voltages that the text states [V], as written."""
        return {v for v in _VOLTS.findall(_digits_mended(self.squeezed)) if v in AC_VOLTS}

    def previous(self, word: Word) -> Word | None:
        """The word before."""
        n = self.words.index(word)
        return self.words[n - 1] if n else None

    def following(self, word: Word) -> Word | None:
        """The word after."""
        n = self.words.index(word) + 1
        return self.words[n] if n < len(self.words) else None

    def word_after(self, places: int) -> str:
        """The remark, as written, that comes right after the marked places; empty if there is none."""
        end = places.bit_length()
        word = next((w.raw for w in self.words if w.start == end and w.remark), "")
        return "" if word.isdigit() or tradewords.is_measure(word) else word


def mask(start: int, end: int) -> int:
    """Places from start to end as bits of a number."""
    return (1 << end) - (1 << start)


def _digits_mended(squeezed: str) -> str:
    """The text with scanner's letters among digits turned back: "27owp" is "270wp"."""
    return re.sub(r"(?<=\d)[oilsb|]+(?=\d|w|kw|v)|(?<![^\W_])[oilsb|]+(?=\d)", _as_digits, squeezed)


def _as_digits(match: re.Match[str]) -> str:
    return match.group().translate(namekeys.SCANNER_DIGITS)


def _words(squeezed: str) -> list[Word]:
    found = list(_WORD.finditer(squeezed))
    raws = [m.group() for m in found]
    folds = [namekeys.folded(raw) for raw in raws]
    gaps = [" "] + [_gap(squeezed, a.end(), b.start()) for a, b in zip(found, found[1:], strict=False)]
    out: list[Word] = []
    place = 0
    for n, raw in enumerate(raws):
        apart = _is_apart(gaps[n])
        remark = apart and (
            tradewords.is_trade(raw) or tradewords.is_measure(raw) or _is_count(n, raws, gaps)
        )
        remark = remark or (raw in ("a", "b") and n > 0 and raws[n - 1] in ("class", "grade", "klasse"))
        if not apart and gaps[n] in (".", ",") and raw[0].isdigit():  # the decimals of a measure
            remark = out[-1].remark
        out.append(Word(raw, folds[n], place, place + len(folds[n]), gaps[n], remark))
        place += len(folds[n])
    return out


def _gap(squeezed: str, start: int, end: int) -> str:
    """What stands between two words; a comma that is no decimal comma counts as a list's."""
    gap = squeezed[start:end]
    if gap == "," and not (squeezed[start - 1].isdigit() and squeezed[end].isdigit()):
        return ", "
    return gap


def _is_apart(gap: str) -> bool:
    return not gap or any(c in " ;:|" for c in gap) or (len(gap) > 1 and "," in gap)


def _is_count(n: int, raws: list[str], gaps: list[str]) -> bool:
    """Whether the word is a number that a word beside it makes a measure, a count or a price."""
    if not raws[n].isdigit():
        return False
    if n and tradewords.is_in(raws[n - 1], tradewords.ANNOUNCING):
        return True
    after = n + 1
    if after < len(raws) and gaps[after] in (".", ","):
        if tradewords.is_measure(raws[after]):
            return True
        if raws[after].isdigit():
            after += 1
    return after < len(raws) and tradewords.is_in(raws[after], tradewords.COUNTED) and gaps[after] == " "
