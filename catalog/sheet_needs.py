"""What a datasheet must state: told where it is missing, with the options that say it for all rows at once."""

from __future__ import annotations

from collections.abc import Sequence

from catalog.records import TECHNOLOGIES, FieldSpec
from catalog.sheet_reading import Entry

#: A kind with its article.
AN = {"module": "a module", "inverter": "an inverter"}
_SUCH_AS = {"technology": TECHNOLOGIES[0], "bifacial": "no"}


def what_is_needed(spec: FieldSpec) -> str:
    """What a field holds, for someone who is asked for it."""
    if spec.name == "technology":
        return f"{spec.meaning}, such as {', '.join(TECHNOLOGIES[:-1])} or {TECHNOLOGIES[-1]}"
    if spec.type is bool:
        return "yes or no"
    return f"{spec.meaning} in {spec.unit}" if spec.unit not in ("", "1") else spec.meaning


def set_option(spec: FieldSpec) -> str | None:
    """The option that gives a field for all rows at once; ``None`` for what like rows never share."""
    if spec.name == "model" or spec.type not in (str, bool):
        return None
    return f"--set {spec.name}={_SUCH_AS.get(spec.name, '...')}"


def stand_ins(missing: Sequence[FieldSpec]) -> dict[str, str] | None:
    """Values by which a table may be read on although fields are missing, to find its other faults; never kept.

    ``None`` where a field is missing for which nothing can stand in: a number would not go with the others.
    """
    found = {spec.name: _SUCH_AS.get(spec.name, "?") for spec in missing if set_option(spec)}
    return found if len(found) == len(missing) else None


def needed(entry: Entry, spec: FieldSpec) -> str:
    """The fault of an entry that lacks one field."""
    what = f"{AN[entry.kind]} needs it ({what_is_needed(spec)})"
    if spec.name in entry.meant:
        return f"is missing, {what}; is {entry.meant[spec.name]!r} meant? then rename it to {spec.name}"
    option = set_option(spec)
    if option:
        what += f"; for all rows at once: {option}"
    return f"is blank, {what}" if spec.name in entry.cells else f"is missing, {what}"


def all_needed(entry: Entry, missing: Sequence[FieldSpec]) -> str:
    """The fault of an entry that lacks several fields."""
    said = []
    for spec in missing:
        meant = f"; is {entry.meant[spec.name]!r} meant?" if spec.name in entry.meant else ""
        holds = what_is_needed(spec)
        about = meant if holds == spec.name else f"{holds}{meant}"
        said.append(f"{spec.name} ({about.removeprefix('; ')})" if about else spec.name)
    options = " ".join(filter(None, map(set_option, missing)))
    mend = f"; for all rows at once, with what is true of them: {options}" if options else ""
    return f"{AN[entry.kind]} needs also {', '.join(said[:-1])} and {said[-1]}{mend}"
