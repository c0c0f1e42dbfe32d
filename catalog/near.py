"""The names that come near to one that is not known."""

from __future__ import annotations

from collections.abc import Iterable


def nearest(text: str, names: Iterable[str], limit: int = 3) -> str:
    """The end of an error line: "; near to it: a, b", or what there is where nothing is near.

    Parameters
    ----------
    text : str
        What was asked for.
    names : iterable of str
        What there is.
    limit : int
        How many at most.
    """
    from rapidfuzz import fuzz, process, utils

    names = list(names)
    alike = process.extract(
        text, names, scorer=fuzz.WRatio, processor=utils.default_process, limit=None, score_cutoff=60
    )
    found = sorted((name for name, _, _ in alike), key=lambda name: -fuzz.ratio(text, name))[:limit]
    if found:
        return "; near to it: " + ", ".join(found)
    if not names:
        return ""
    return "; there is " + ", ".join(names[:10]) + (", ..." if len(names) > 10 else "")
