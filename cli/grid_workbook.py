"""The grid of what is in stock as a workbook: the grid itself, its pairs as a list, and what goes with nothing."""

from __future__ import annotations

from typing import IO, TYPE_CHECKING

from cli.cautions import CAUTIONS
from cli.grid_files import HEADERS, letter, rows
from cli.grid_screen import span
from cli.worksheets import Column, Formats, Table, set_page

if TYPE_CHECKING:
    from xlsxwriter.workbook import Workbook

    from cli.grid_files import Shown

_DIGITS = {"best_dc_ac_ratio": 3, "best_clipping_loss_pct": 2}
_TEXTS = ("maker", "model", "verdict", "arrangement", "stopped_by", "nearest")


def write_workbook(shown: Shown, stream: IO[bytes]) -> None:
    """Write the workbook."""
    import xlsxwriter

    book = xlsxwriter.Workbook(
        stream, {"strings_to_formulas": False, "strings_to_urls": False, "strings_to_numbers": False}
    )
    formats = Formats(book)
    _fill_grid(shown, book, formats)
    table = Table(book, "Pairs", [_column(name) for name in HEADERS], formats)
    for row in rows(shown):
        table.row(row)
    table.close()
    book.close()


def _column(name: str) -> Column:
    if name.endswith(_TEXTS):
        width = 90 if name == "nearest" else 24
        return Column(name.replace("_", " "), width)
    return Column(name.replace("_", " ").replace(" pct", " [%]"), 10, _DIGITS.get(name, 0))


def _fill_grid(shown: Shown, book: Workbook, formats: Formats) -> None:
    grid = shown.grid
    sheet = book.add_worksheet("Grid")
    sheet.set_column(0, 0, 34)
    sheet.set_column(1, 1, 9)
    sheet.set_column(2, 1 + len(grid.inverters), 13)
    sheet.set_row(0, 62)
    for k, head in enumerate(("module", "pieces")):
        sheet.write_string(0, k, head, formats.header)
    for i, inverter in enumerate(grid.inverters):
        sheet.write_string(0, 2 + i, f"{inverter.name} ({shown.pieces[inverter.id]:,})", formats.header)
    for m, module in enumerate(grid.modules):
        sheet.write_string(1 + m, 0, module.name, formats.label)
        sheet.write_number(1 + m, 1, shown.pieces[module.id], formats.numbers[0])
        for i in range(len(grid.inverters)):
            pair = grid.pairs.get((m, i))
            if pair is None:
                sheet.write_string(1 + m, 2 + i, "-")
            else:
                sheet.write_string(1 + m, 2 + i, f"{letter(pair.verdict)} {span(pair)}", formats.verdicts[str(pair.verdict)])
    sheet.freeze_panes(1, 2)
    below = len(grid.modules) + 2
    legend = "F fits, C to confirm (a safety rating is not on record), - no; then from how many to how many modules on one inverter."
    for k, line in enumerate((legend, *shown.year.notes, *CAUTIONS)):
        sheet.write_string(below + k, 0, line, formats.note)
    set_page(sheet, "Grid")
