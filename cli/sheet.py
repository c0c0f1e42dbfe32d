"""``ferrule sheet``: the records of the catalog."""

from __future__ import annotations

from cli import sheet_amend, sheet_backup, sheet_enter, sheet_export, sheet_find, sheet_history, sheet_load, sheet_show, sheet_twins
from cli.groups import Commands

app = Commands(help="The datasheets that are kept: load, find, show, amend, history, undo, enter, export, twins, backup, restore.")
app.command("load")(sheet_load.load)
app.command("find")(sheet_find.find)
app.command("show")(sheet_show.show)
app.command("amend")(sheet_amend.amend)
app.command("history")(sheet_history.history)
app.command("undo")(sheet_amend.undo)
app.command("enter")(sheet_enter.enter)
app.command("export")(sheet_export.export)
app.command("twins")(sheet_twins.twins)
app.command("backup")(sheet_backup.backup)
app.command("restore")(sheet_backup.restore)
