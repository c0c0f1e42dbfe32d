"""Command lines to print: a person pastes them into a shell."""

from __future__ import annotations

import shlex
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from matcher.checks import Confirm


#: Longer command lines are parted as a shell understands it.
_WIDTH = 96


def quoted(word: str) -> str:
    """A word as it is typed: in double quotes, which every shell knows, where it is not plain."""
    if shlex.quote(word) == word:
        return word
    return shlex.quote(word) if any(mark in word for mark in '"$`\\!') else f'"{word}"'


def amend_command(record: Module | Inverter, *confirms: Confirm) -> str:
    """The command that enters the values which a ``to-confirm`` verdict asked for.

    Parameters
    ----------
    record : Module or Inverter
        The record that lacks them.
    *confirms : Confirm
        What is asked for of it.

    Returns
    -------
    str
        With ``VALUE`` and ``DOCUMENT`` to be filled in.
    """
    values = []
    for confirm in confirms:
        if confirm.inputs is None:
            values.append(f"{confirm.field}=VALUE")
            continue
        group = f"inputs[{confirm.inputs + 1}]"
        if record.origin("inputs") == "assumed":
            # How many trackers there are is assumed too, so that is asked for with it.
            values.append(f"{group}.trackers=VALUE")
        values.append(f"{group}.{confirm.field}=VALUE")
    typed = [quoted(value) for value in dict.fromkeys(values)]
    words = [f"ferrule sheet amend {quoted(record.name)}", *typed, "--source DOCUMENT"]
    line = " ".join(words)
    return line if len(line) <= _WIDTH else " \\\n    ".join([words[0], " ".join(words[1:])])
