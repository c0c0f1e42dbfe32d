"""Groups of commands: a help that cuts no command's line short, and the right place of a command typed elsewhere."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from typer.core import TyperGroup

#: Longer than any first sentence of a help.
_WHOLE = 1000


class Group(TyperGroup):
    """A group as the library makes them, but for the lines of its commands and for commands of other groups."""

    def format_commands(self, ctx: Any, formatter: Any) -> None:
        """List the commands, each with the first sentence of its help: folded where it is long, never cut."""
        rows = [(name, command.get_short_help_str(_WHOLE)) for name, command in self.commands.items()]
        with formatter.section("Commands"):
            formatter.write_dl(rows)

    def resolve_command(self, ctx: Any, args: list[str]) -> Any:
        """Find the command that a word names; where it is one of another group, say so."""
        if args[0] not in self.commands and not ctx.resilient_parsing:
            root = ctx.find_root()
            meant = [repr(path) for path in _paths(root.command, root.info_name) if path.endswith(f" {args[0]}")]
            if meant:
                ctx.fail(f"No such command {args[0]!r}. Did you mean {' or '.join(meant)}?")
        return super().resolve_command(ctx, args)


def _paths(command: Any, words: str) -> Iterator[str]:
    """The words of every command of a group."""
    yield words
    for name, sub in getattr(command, "commands", {}).items():
        yield from _paths(sub, f"{words} {name}")
