"""What is to be confirmed of the options on the screen, grouped by value, and the commands that put it on record."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

from cli.facts import at_least, confirm_words, field_words
from cli.quoting import amend_command

if TYPE_CHECKING:
    from matcher.checks import Confirm
    from matcher.fit import Fit, Option

#: Values of one field that are told apart; more are given as a range.
_TOLD_APART = 8

#: The same where the screen is small.
_TOLD_APART_BRIEFLY = 3


def confirm_lines(fit: Fit, options: Sequence[Option], brief: bool) -> list[str]:
    """What to read on which datasheet, a line for each field; ``brief``: values that differ as a range.

    A record that all options share is asked for the largest value that any of them needs.
    """
    waiting = [o for o in options if o.confirm]
    own = "inverter" if fit.lists_inverters else "module"
    return [*_of_the_shared(fit, waiting, own), *_of_their_own(waiting, own, brief)]


def _of_the_shared(fit: Fit, waiting: Sequence[Option], own: str) -> Iterator[str]:
    need: dict[str, Confirm] = {}
    for c in (c for o in waiting for c in o.confirm if c.record != own):
        if c.field not in need or (c.at_least or 0.0) > (need[c.field].at_least or 0.0):
            need[c.field] = c
    name = (fit.modules if own == "inverter" else fit.inverters)[0].name
    yield from (f"{name}: {confirm_words(c)} (for all of the above)" for c in need.values())


def _of_their_own(waiting: Sequence[Option], own: str, brief: bool) -> Iterator[str]:
    """The values of each field, the largest first, each with the ranks of the options that need it."""
    fields: dict[str, dict[float | None, list[int]]] = {}
    units: dict[str, str] = {}
    for o in waiting:
        for c in (c for c in o.confirm if c.record == own):
            words, least = field_words(c), at_least(c)
            fields.setdefault(words, {}).setdefault(least, []).append(o.rank)
            units[words] = c.unit
    for words, values in fields.items():
        known = sorted((v for v in values if v is not None), reverse=True)
        ranks = sorted({rank for some in values.values() for rank in some})
        if not known:
            yield f"{own}: {words} ({ranks_words(ranks)})"
        elif len(known) > (_TOLD_APART_BRIEFLY if brief else _TOLD_APART):
            span = f"{known[-1]:,.1f} to {known[0]:,.1f} {units[words]}"
            yield f"{own}: {words} of at least {span} ({ranks_words(ranks)})"
        else:
            each = ", ".join(f"{v:,.1f} {units[words]} ({ranks_words(values[v])})" for v in known)
            yield f"{own}: {words} of at least {each}"


def ranks_words(ranks: Sequence[int]) -> str:
    """Ranks that follow each other as one: "#2, #4-9"."""
    runs: list[list[int]] = []
    for rank in ranks:
        if runs and rank == runs[-1][-1] + 1:
            runs[-1].append(rank)
        else:
            runs.append([rank])
    return ", ".join(f"#{run[0]}" + (f"-{run[-1]}" if len(run) > 1 else "") for run in runs)


def not_on_record(options: Sequence[Option]) -> str:
    """What is not on record of the checks that stop nothing; empty where the options leave none open."""
    fields = dict.fromkeys(
        field_words(replace(c.confirm, inputs=None))
        for o in options
        for c in o.checks
        if not c.stop and c.confirm is not None
    )
    if not fields:
        return ""
    return f"Not on record, and no reason to stop: {'; '.join(fields)} (--checks shows what rests on it)."


def amend_commands(fit: Fit, option: Option) -> list[str]:
    """Commands that enter what an option waits for, one per record."""
    records = {"module": fit.modules[option.module], "inverter": fit.inverters[option.inverter]}
    asked = {kind: [c for c in option.confirm if c.record == kind] for kind in records}
    return [amend_command(records[kind], *some) for kind, some in asked.items() if some]
