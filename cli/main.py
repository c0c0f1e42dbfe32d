"""The command `ferrule`: its commands, and the one place where errors become a line and an exit status."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache
from typing import Annotated, Any

import typer

from catalog.errors import CatalogError
from cli.console import PLAIN
from cli.groups import Commands
from matcher.errors import MatcherError

BAD_INPUT = 2
_PLAIN = "--plain"
INTERRUPTED = 130

app = Commands(
    name="ferrule",
    # Plain help: markup would take a unit such as [degC] for a tag and drop it.
    rich_markup_mode=None,
    context_settings={"help_option_names": ["--help", "-h"], "max_content_width": 100},
    pretty_exceptions_enable=False,
)


def _print_version(asked: bool) -> None:
    if asked:
        from importlib.metadata import PackageNotFoundError, version

        try:
            print(f"ferrule {version('ferrule')}")
        except PackageNotFoundError:
            print("ferrule, run from its source without being installed")
        raise typer.Exit


@app.callback()
def ferrule(
    version: Annotated[
        bool, typer.Option("--version", callback=_print_version, is_eager=True, help="Show the version and exit.")
    ] = False,
    plain: Annotated[bool, typer.Option("--plain", help="No bold and no colour, as in a pipe. May stand anywhere.")] = False,
) -> None:
    """Which PV modules and inverters go together, in which strings, how sure that is, and what it
    costs in clipping.

    \b
    First steps:
      ferrule demo                   an invented distributor's question, answered end to end
      ferrule sheet load cec         the public CEC tables, into a catalog of your own
      ferrule fit --module "canadian solar cs6k-275m" --low -12 --high 37
                                     the inverters that take this module, in which strings

    Every command has a help with an example: ferrule fit --help.
    """


def _register() -> None:
    from cli import demo, fit, rules, sheet, site, stock, swap, sweep, vet

    app.command("fit")(fit.fit)
    app.command("vet")(vet.vet)
    app.command("swap")(swap.swap)
    app.add_typer(sheet.app, name="sheet")
    app.add_typer(stock.app, name="stock")
    app.add_typer(site.app, name="site")
    app.command("sweep")(sweep.sweep)
    app.command("rules")(rules.rules)
    app.command("demo")(demo.demo)


_register()


@cache
def command() -> Any:
    """The command with all below it; made once, which takes nearly a tenth of a second."""
    return typer.main.get_command(app)


def main(arguments: list[str] | None = None) -> None:
    """Run the command and leave with its exit status: 0 something fits, 1 nothing fits, 2 bad input."""
    sys.exit(run(arguments))


def run(arguments: list[str] | None = None) -> int:
    """Run the command line and return its exit status; every error is one line on stderr."""
    arguments = list(sys.argv[1:] if arguments is None else arguments)
    if _PLAIN in arguments:
        # Taken here, so that it may stand before a command and behind it.
        with _plain():
            return run([word for word in arguments if word != _PLAIN])
    try:
        status = command().main(arguments, prog_name="ferrule", standalone_mode=False)
        if status == INTERRUPTED:
            # Typer has caught the KeyboardInterrupt and made this status of it.
            return _refused("interrupted; nothing was left half-written", INTERRUPTED)
        return status if isinstance(status, int) else 0
    except (CatalogError, MatcherError) as error:
        return _refused(str(error))
    except BrokenPipeError:
        # The reader of a pipe has seen enough (ferrule ... | head).
        sys.stdout = None  # type: ignore[assignment]
        return 0
    except OSError as error:
        where = f"{error.filename}: " if error.filename else ""
        return _refused(f"{where}{error.strerror or error}")
    except Exception as error:
        # Typing errors on the command line carry a message of their own.
        if not hasattr(error, "format_message"):
            raise
        message = error.format_message()
        if "\n" in message:
            # A command that does nothing by itself: its help, whole.
            print(message, file=sys.stderr)
            return BAD_INPUT
        context = getattr(error, "ctx", None)
        where = context.command_path if context else "ferrule"
        return _refused(f"{message} (see '{where} --help')")


@contextmanager
def _plain() -> Iterator[None]:
    """Plain text for as long as this lasts."""
    before = os.environ.get(PLAIN)
    os.environ[PLAIN] = "1"
    try:
        yield
    finally:
        if before is None:
            del os.environ[PLAIN]
        else:
            os.environ[PLAIN] = before


def _refused(line: str, status: int = BAD_INPUT) -> int:
    for one in line.split("\n"):
        # An indented line belongs to the one before.
        print(one if one.startswith(" ") else f"ferrule: {one}", file=sys.stderr)
    return status
