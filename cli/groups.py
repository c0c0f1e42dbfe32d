"""Groups of commands and their helps: nothing cut short, no jargon, and the right place of a command typed elsewhere."""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Any

import typer
from typer.core import TyperCommand, TyperGroup

#: Longer than any first sentence of a help.
_WHOLE = 1000


class Commands(typer.Typer):
    """A group of commands; alone, it prints its help."""

    def __init__(self, **settings: Any) -> None:
        super().__init__(cls=Group, no_args_is_help=True, **settings)

    def command(self, name: str | None = None, **settings: Any) -> Any:
        """Register a command, as the library does it."""
        return super().command(name, cls=Command, **settings)


class Command(TyperCommand):
    """A command whose help names arguments in plain words: no types of the programming language, no brackets in brackets."""

    def collect_usage_pieces(self, ctx: Any) -> list[str]:
        """Pieces of the line of usage."""
        return [_plain(piece) for piece in super().collect_usage_pieces(ctx)]

    def format_options(self, ctx: Any, formatter: Any) -> None:
        """List the arguments, then the options."""
        parameters = self.get_params(ctx)
        for title in ("Arguments", "Options"):
            records = [p.get_help_record(ctx) for p in parameters if title.lower().startswith(p.param_type_name)]
            rows = [(re.sub(r" <[^ ]+>$", "", record[0]), record[1]) for record in records if record]
            if rows:
                with formatter.section(title):
                    formatter.write_dl(rows)


class Group(TyperGroup):
    """A group whose help lists its commands whole, and which knows those of other groups."""

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


def _plain(piece: str) -> str:
    """``{NAME}`` as ``NAME``, ``[[WORDS...]]...`` as ``[WORDS...]``."""
    piece = piece.replace("{", "").replace("}", "").replace("[[", "[").replace("]]", "]")
    return re.sub(r"(\.\.\.\]?)\.\.\.$", r"\1", piece)
