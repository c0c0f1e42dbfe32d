"""Whether a text and the name of a record have anything in common that may make the one mean the other."""

from __future__ import annotations

from catalog.namekeys import compact, digit_runs, squeezed, words
from catalog.tradewords import COMMON, is_in, is_trade

#: Shorter ones stand in any text: counts, sizes, and words such as "hall".
_DIGITS, _LETTERS, _MODEL = 3, 4, 5
#: Likeness in percent above which two words, or a model and a piece of the text, may be one with a typing error.
_ALIKE = 80


def has_in_common(text: str, maker: str, model: str) -> bool:
    """Whether a text shares a number or a telling word with a name, or holds something like its model."""
    from rapidfuzz import fuzz

    numbers = {run for run in digit_runs(text) if len(run) >= _DIGITS}
    if numbers & set(digit_runs(model)):
        return True
    if len(compact(model)) >= _MODEL and fuzz.partial_ratio(compact(model), compact(text)) >= _ALIKE:
        return True
    own = _telling(f"{maker} {model}")
    return any(fuzz.ratio(a, b) >= _ALIKE for a in _telling(text) for b in own)


def _telling(text: str) -> list[str]:
    """Words that say which maker or line is meant: no words of the trade, and none that many makers share."""
    found = (word for word in words(squeezed(text)) if len(word) >= _LETTERS and word.isalpha())
    return [word for word in found if not is_trade(word) and not is_in(word, COMMON)]
