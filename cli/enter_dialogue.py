"""The dialogue that types in a datasheet: a field at a time, then the whole record, then it is kept."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING

from catalog.errors import CatalogError
from cli.entering import EXAMPLES, Entering, asked_fields

if TYPE_CHECKING:
    from catalog.records import FieldSpec
    from catalog.store import Catalog

LEFT = 1
_KEY = "said/draft/"


class _Left(Exception):
    """The person leaves; what was answered stays as a draft."""


class _Back(Exception):
    """The person goes back to the field before."""


def enter_record(catalog: Catalog, kind: str, *, fresh: bool) -> int:
    """Ask for a record and keep it, or a draft of it; returns the exit status.

    Parameters
    ----------
    catalog : Catalog
        Where it is kept.
    kind : {"module", "inverter"}
    fresh : bool
        Forget the draft that was left before.
    """
    draft = Entering.from_bytes(kind, None if fresh else catalog.kept(_KEY + kind))
    try:
        _fill(catalog, draft)
        return _confirm(catalog, draft)
    except (_Left, EOFError, KeyboardInterrupt):
        return _left(catalog, draft)


def _fill(catalog: Catalog, draft: Entering) -> None:
    """Ask for every field that has no answer yet."""
    fields = asked_fields(draft.kind)
    answered = sum(spec.name in draft.answers for spec in fields)
    if answered:
        name = (
            f"{draft.answers.get('maker', '')} {draft.answers.get('model', '')}".strip()
            or f"the {draft.kind}"
        )
        _tell(f"Going on with {name}: {answered} of {len(fields)} answered. (--fresh begins anew.)")
    else:
        _tell("Blank: not known. back: the field before. later (or Ctrl-D): leave, and go on another time.")
    place = next((k for k, spec in enumerate(fields) if spec.name not in draft.answers), len(fields))
    while place < len(fields):
        if draft.pointless(fields[place]):
            draft.answers[fields[place].name] = ""
            place += 1
            continue
        try:
            _ask(catalog, draft, fields[place], f"{place + 1}/{len(fields)}")
            place += 1
        except _Back:
            place = max(place - 1, 0)
            while place and draft.pointless(fields[place]):
                place -= 1


def _ask(catalog: Catalog, draft: Entering, spec: FieldSpec, count: str = "") -> None:
    """Ask for one field until its answer can be; the draft is kept after each."""
    unit = f" [{spec.unit}]" if spec.unit not in ("", "1") else ""
    need = "" if spec.required else ", blank if not known"
    prompt = f"{count} {spec.name}{unit}: {spec.meaning} (like {EXAMPLES[draft.kind][spec.name]}{need})"
    if draft.answers.get(spec.name):
        prompt += f", now {draft.answers[spec.name]}"
    while True:
        text = _line(f"{prompt.strip()}\n> ")
        try:
            remarks = draft.answer(spec, text)
            if spec.name == "model":
                _free(catalog, draft)
        except CatalogError as problem:
            _tell(f"  {problem}")
            continue
        for remark in remarks:
            _tell(f"  unusual: {remark}; taken as it is ('back' changes it)")
        catalog.keep(_KEY + draft.kind, draft.to_bytes())
        return


def _free(catalog: Catalog, draft: Entering) -> None:
    """Refuse a name that is taken, before the rest is typed."""
    name = f"{draft.answers['maker']} {draft.answers['model']}"
    if any(f"{n.maker} {n.model}".casefold() == name.casefold() for n in catalog.names(draft.kind)):
        del draft.answers["model"]
        raise CatalogError(f"{name} is in the catalog already: change it with 'ferrule sheet amend'")


def _confirm(catalog: Catalog, draft: Entering) -> int:
    """Show the whole record, and keep it if that is wanted."""
    from catalog.plausibility import findings
    from cli.console import say
    from cli.stock_review import say_matched
    from cli.sheet_show import print_record

    known = {spec.name: spec for spec in asked_fields(draft.kind)}
    while True:
        record = draft.record()
        print_record(draft.kind, record, record.revision, findings(record))
        answer = _line("Keep this record? yes, later, or the name of a field to change it\n> ").strip()
        if answer.casefold() in ("y", "yes"):
            kept = catalog.enter(record)
            catalog.keep(_KEY + draft.kind, b"")
            say(f"Kept: {kept.name}, from {kept.source}.")
            say_matched(catalog)
            return 0
        if answer in known:
            try:
                _ask(catalog, draft, known[answer])
            except _Back:
                continue
        elif answer.casefold() in ("n", "no"):
            raise _Left
        else:
            _tell(f"  {answer!r} is neither yes nor a field; fields are {', '.join(known)}")


def _left(catalog: Catalog, draft: Entering) -> int:
    if not draft.answers:
        _tell("\nNothing was entered.")
    elif catalog.keep(_KEY + draft.kind, draft.to_bytes()):
        _tell(f"\nLeft as a draft: 'ferrule sheet enter {draft.kind}' goes on from here.")
    else:
        _tell("\nThe catalog cannot be written to, so nothing was kept.")
    return LEFT


def _line(prompt: str) -> str:
    """A line that the person types.

    Raises
    ------
    _Left, _Back, EOFError
    """
    if sys.stdin.isatty():
        # Its import gives line editing.
        import readline  # noqa: F401

        text = input(prompt)
    else:
        sys.stderr.write(prompt)
        text = sys.stdin.readline()
        if not text:
            raise EOFError
        sys.stderr.write("\n")
    word = text.strip().casefold()
    if word == "later":
        raise _Left
    if word == "back":
        raise _Back
    return text


def _tell(text: str) -> None:
    print(text, file=sys.stderr)
