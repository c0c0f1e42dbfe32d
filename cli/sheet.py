"""``ferrule sheet``: the records of the catalog."""

from __future__ import annotations

import typer

from cli import sheet_find, sheet_load, sheet_show

app = typer.Typer(no_args_is_help=True, help="The datasheets that are kept: load, find, show.")
app.command("load")(sheet_load.load)
app.command("find")(sheet_find.find)
app.command("show")(sheet_show.show)
