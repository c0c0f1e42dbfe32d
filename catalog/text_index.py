"""All names, prepared for free text: their cores, and which of them hold which groups of three characters."""

from __future__ import annotations

import re
from bisect import bisect_left
from collections.abc import Iterable
from typing import TYPE_CHECKING

from catalog import namekeys, tradewords
from catalog.name_shape import VOLTS_AT_END, Shape, core_of

if TYPE_CHECKING:
    import numpy as np

    from catalog.names import NameIndex


class TextIndex:
    """What `resolve_text` needs of all names; built once, kept by the `NameIndex`."""

    def __init__(self, index: NameIndex) -> None:
        self.index = index
        self._shapes: dict[int, Shape] = {}
        self.by_full = _rows_by(index.full_keys)
        self.by_model = _rows_by(index.model_keys)
        maker_words = {m: {namekeys.folded(w) for w in re.findall(r"[^\W_]+", m)} for m in set(index.makers)}
        cores = [
            core_of(VOLTS_AT_END.sub("", model), maker_words[maker])[0]
            if " " in model or "[" in model
            else model
            for maker, model in zip(index.makers, index.models, strict=True)
        ]
        cores = namekeys.compact_all(cores)
        self.families = set(_sizeless("\n".join(cores)).split("\n"))
        cores = [namekeys.folded(c) for c in cores]
        self.by_core = _rows_by(cores)
        self.sorted_cores = sorted(self.by_core)
        self.longest = max(map(len, cores), default=0)
        self.maker_vocabulary = set().union(*maker_words.values()) - tradewords.HOLLOW - tradewords.CODES
        self.grams = _Grams([namekeys.folded(k) for k in index.full_keys])

    def shape(self, row: int) -> Shape:
        """The name of one record, taken apart."""
        found = self._shapes.get(row)
        if found is None:
            found = self._shapes[row] = Shape(self.index.makers[row], self.index.models[row])
        return found

    def is_suffix(self, shape: Shape, word: str) -> bool:
        """Whether types of this family end with this word ("-270P BLK" where "-260P BLK" is known)."""
        return bool(word) and any(
            _sizeless(shape.plain + w) in self.families for w in (word, tradewords.as_letters(word))
        )

    def is_alone(self, row: int, text: str) -> bool:
        """Whether no other model has the same core (with another voltage, say), or the text is the name."""
        named = self.index.names[row]
        return len(self.by_core[self.shape(row).core]) == 1 or " ".join(text.split()) in (
            named.name,
            named.model,
        )

    def has_longer(self, core: str) -> bool:
        """Whether another model goes on with letters after this core ("AF6K-270P" after "AF6K-270")."""
        at = bisect_left(self.sorted_cores, core)
        following = self.sorted_cores[at + 1 : at + 40]
        return any(c.startswith(core) and not c[len(core)].isdigit() for c in following)


class _Grams:
    """Which records hold which groups of three characters."""

    def __init__(self, keys: list[str]) -> None:
        import numpy as np

        self._np = np
        self.count = len(keys)
        codes, rows = self._codes("\n".join(keys))
        pairs = np.sort(codes.astype(np.int64) * max(self.count, 1) + rows)
        pairs = pairs[np.diff(pairs, prepend=-1) > 0]
        codes, self.rows = np.divmod(pairs, max(self.count, 1))
        size = np.bincount(codes, minlength=37**3)
        self.begin = np.concatenate([[0], np.cumsum(size)])
        self.weight = np.log1p(self.count / np.maximum(size, 1))
        self.total = np.bincount(self.rows, weights=self.weight[codes], minlength=self.count)

    def _codes(self, joined: str) -> tuple[np.ndarray, np.ndarray]:
        """Codes of all groups inside lines, and the lines they are in."""
        np = self._np
        chars = np.frombuffer(joined.encode("latin-1", "replace"), np.uint8)
        table = np.full(256, 36, np.int32)
        table[48:58] = np.arange(10)
        table[97:123] = np.arange(10, 36)
        ends = chars == 10
        line = np.cumsum(ends)
        c = table[chars]
        codes = c[:-2] * 37 * 37 + c[1:-1] * 37 + c[2:]
        inside = ~(ends[:-2] | ends[1:-1] | ends[2:])
        return codes[inside], line[:-2][inside]

    def nearest(self, joined: str, count: int) -> list[tuple[int, float]]:
        """Rows that share most with a folded text, with their likeness from 0 to 1."""
        np = self._np
        if len(joined) < 3 or not self.count:
            return []
        codes = np.unique(self._codes(joined)[0])
        parts = [self.rows[self.begin[c] : self.begin[c + 1]] for c in codes]
        shared = np.bincount(
            np.concatenate(parts),
            weights=np.repeat(self.weight[codes], [len(p) for p in parts]),
            minlength=self.count,
        )
        likeness = (
            shared
            / np.maximum(self.total, 1e-9)
            * np.minimum(1.0, shared / (0.35 * self.weight[codes].sum()))
        )
        count = min(count, self.count)
        top = np.argpartition(likeness, -count)[-count:]
        return [(int(i), float(likeness[i])) for i in top if shared[i] > 0]


def _sizeless(plain: str) -> str:
    """Compact names with every digit the same."""
    return re.sub(r"\d", "#", plain)


def _rows_by(keys: Iterable[str]) -> dict[str, list[int]]:
    out: dict[str, list[int]] = {}
    for i, key in enumerate(keys):
        out.setdefault(key, []).append(i)
    return out
