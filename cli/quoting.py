"""Command lines to print: a person pastes them into a shell."""

from __future__ import annotations

import shlex
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from matcher.checks import Confirm


def amend_command(record: Module | Inverter, confirm: Confirm) -> str:
    """The command that enters the value which a ``to-confirm`` verdict asked for.

    Parameters
    ----------
    record : Module or Inverter
        The record that lacks it.
    confirm : Confirm
        What is asked for.

    Returns
    -------
    str
        With ``VALUE`` and ``DOCUMENT`` to be filled in.
    """
    values = [f"{confirm.field}=VALUE"]
    if confirm.inputs is not None:
        values = [f"inputs[{confirm.inputs + 1}].{confirm.field}=VALUE"]
        if record.origin("inputs") == "assumed":
            # How many trackers there are is assumed too, so that is asked for with it.
            values.insert(0, f"inputs[{confirm.inputs + 1}].trackers=VALUE")
    quoted = [f'"{value}"' if "[" in value else value for value in values]
    return f"ferrule sheet amend {shlex.quote(record.name)} {' '.join(quoted)} --source DOCUMENT"
