"""Names with small typing errors in their letters. Digits must agree in full."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from catalog import namekeys

if TYPE_CHECKING:
    from catalog.names import NameIndex


def slips(text: str, index: NameIndex) -> list[int]:
    """Rows whose name differs from the squeezed text by small typing errors in letters only.

    The model must be there whole, with exactly its digits; words that are left must be words of the
    maker's name, beginnings of them, or slips of them.
    """
    digits = namekeys.digit_runs(text)
    if not digits:
        return []
    joined = "".join(digits)
    parts = namekeys.words(text)
    letters = set(text)
    rows = []
    for i, key in enumerate(index.model_keys):
        if not all(run in index.full_keys[i] for run in digits):
            continue
        if len(letters.intersection(key)) * 2 < len(set(key)):
            continue
        own = "".join(c for c in key if c.isdigit())
        if own and own in joined and _is_slip(parts, joined, key, index.makers[i]):
            rows.append(i)
    return rows


def _is_slip(parts: Sequence[str], digits: str, model_key: str, maker: str) -> bool:
    """Whether some run of the words is the model with slips and the others belong to the maker."""
    maker_words = namekeys.words(maker)
    of_maker = [any(w.startswith(p) or same_but_for_slips(p, w) for w in maker_words) for p in parts]
    for begin in range(len(parts)):
        if not all(of_maker[:begin]):
            break
        for end in range(len(parts), begin, -1):
            if not all(of_maker[end:]):
                break
            if same_but_for_slips(namekeys.compact("".join(parts[begin:end])), model_key):
                return True
    return False


def same_but_for_slips(typed: str, meant: str) -> bool:
    """Whether two compact words differ at most by small slips in their runs of letters, digits being equal.

    A run of one letter must be the same (it tells types apart); in a run of two, or three, one slip of
    order or number is allowed ("fa" for "af"); in longer ones one slip of any kind, from eight letters on two.
    """
    from rapidfuzz.distance import OSA

    if typed == meant:
        return True
    typed_runs, meant_runs = namekeys.runs(typed), namekeys.runs(meant)
    if len(typed_runs) != len(meant_runs):
        return False
    for a, b in zip(typed_runs, meant_runs, strict=True):
        if a == b:
            continue
        if a[0].isdigit() or b[0].isdigit() or "+" in (a, b):
            return False
        if len(b) < 2 or len(a) < 2:
            return False
        allowed = 2 if len(b) >= 8 else 1
        if OSA.distance(a, b, score_cutoff=allowed) > allowed:
            return False
        if len(b) < 4 and sorted(a) != sorted(b):
            return False
    return True
