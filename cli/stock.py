"""``ferrule stock``: what is on the shelf, at what price; which pairs of it go together."""

from __future__ import annotations

from cli import stock_grid, stock_list, stock_load, stock_review
from cli.groups import Commands

app = Commands(help="What is on the shelf, at what price: load, review, decide, list, grid.")
app.command("load")(stock_load.load)
app.command("review")(stock_review.review)
app.command("decide")(stock_review.decide)
app.command("list")(stock_list.list_)
app.command("grid")(stock_grid.grid)
