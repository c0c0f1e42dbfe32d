"""How a typed name can answer to a record: as it stands, in part, or with small typing errors in its letters.

Digits must agree in full, everywhere.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from catalog import namekeys

if TYPE_CHECKING:
    from catalog.names import NameIndex


def exact(typed: str, text: str, key: str, index: NameIndex) -> Iterable[list[int]]:
    """Rows whose full name, then whose model is the query, ever more loosely."""
    for i, name in enumerate(index.full):
        if name == text and " ".join(index.names[i].name.split()) == typed:
            yield [i]
    yield [i for i, name in enumerate(index.full) if name == text]
    yield [i for i, k in enumerate(index.full_keys) if k == key and _digits_agree(text, index.full[i])]
    rows = [i for i, name in enumerate(index.models) if name == text]
    same_case = [i for i in rows if " ".join(index.names[i].model.split()) == typed]
    # With a full name that differs in case only there are still two records, but the one as typed is meant.
    yield same_case or rows
    yield [i for i, k in enumerate(index.model_keys) if k == key and _digits_agree(text, index.models[i])]


def _digits_agree(text: str, name: str) -> bool:
    """Whether no decimal point is lost or won: "6.0" may be typed "6 0" or "6,0"; "60" is another number."""
    return re.search(pattern(text), name) is not None or re.search(pattern(name), text) is not None


def pattern(word: str, *, unfinished: bool = False) -> str:
    """Pattern that finds a typed word in a squeezed name.

    Separators may stand anywhere in the name and be missing in the word, but digits with a decimal point or
    comma between them are another number than the same digits without. A number is found whole, and letters
    from the beginning of a run of letters on; ``unfinished`` words, still being typed, may begin inside a run
    and their last number may go on.
    """
    parts = []
    for i, char in enumerate(word):
        if not (char.isalnum() or char == "+"):
            continue
        if parts:
            before = word[i - 1]
            if char.isdigit() and before.isdigit():
                parts.append(r"[^\w.,+]*")
            elif char.isdigit() and before in ".," and word[i - 2 : i - 1].isdigit():
                parts.append(r"(?:[^\w+]|_)+")
            else:
                parts.append(r"(?:[^\w+]|_)*")
        parts.append(re.escape(char))
    if word[:1].isdigit():
        begin = r"(?<!\d)"
    else:
        begin = "" if unfinished else r"(?<![^\W\d_])"
    end = r"(?!\d)" if word[-1:].isdigit() and not unfinished else ""
    return begin + "".join(parts) + end


def holding(text: str, key: str, index: NameIndex, *, unfinished: bool = False) -> list[int]:
    """Rows whose full name holds the query in one piece, or else all its words."""
    whole = re.compile(pattern(text, unfinished=unfinished))
    rows = [i for i, k in enumerate(index.full_keys) if key in k and whole.search(index.full[i])]
    if rows and not unfinished:
        return rows
    parts = namekeys.words(text)
    if len(parts) < 2:
        return rows
    known = set(rows)
    left: Iterable[int] = [i for i in range(len(index)) if i not in known]
    for n, part in enumerate(parts):
        part_key = namekeys.compact(part)
        wanted = re.compile(pattern(part, unfinished=unfinished and n == len(parts) - 1))
        left = [i for i in left if part_key in index.full_keys[i] and wanted.search(index.full[i])]
    return rows + list(left)


def is_model_with_part_of_maker(text: str, row: int, index: NameIndex) -> bool:
    """Whether the query is the whole model and otherwise only words, or beginnings of words, of the maker."""
    found = re.search(pattern(index.models[row]), text)
    if not found:
        return False
    maker = namekeys.words(index.makers[row])
    rest = namekeys.words(text[: found.start()]) + namekeys.words(text[found.end() :])
    return all(any(m.startswith(word) for m in maker) for word in rest)


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

    A run of one letter must be the same (it tells types apart). In a run of two or three, two neighbours may
    be turned ("fa" for "af"); in longer ones one slip of any kind, from eight letters on two.
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
