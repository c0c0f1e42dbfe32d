"""Sheets of a workbook with one table each: frozen header, filters, real numbers, text that stays text."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from xlsxwriter.format import Format
    from xlsxwriter.workbook import Workbook
    from xlsxwriter.worksheet import Worksheet

#: Fill and font of a verdict; the word stands in the cell, the shade only helps to find it. Light blue, amber
#: and vermilion are told apart also without red-green vision (Okabe and Ito 2008).
_SHADES = {
    "fits": {"bg_color": "#D3E6F5"},
    "to-confirm": {"bg_color": "#FFE8B0", "italic": True},
    "does-not-fit": {"bg_color": "#F6C9B5", "bold": True},
    "note": {"bg_color": "#E6E6E6"},
}


@dataclass(frozen=True, slots=True)
class Column:
    """A column of a sheet: header with unit, width in characters, digits after the point (None: text)."""

    header: str
    width: int
    digits: int | None = None


class Formats:
    """Cell formats of a workbook, made once."""

    def __init__(self, book: Workbook) -> None:
        self.book = book
        self.header = book.add_format(
            {"bold": True, "text_wrap": True, "valign": "top", "bottom": 1, "bg_color": "#F1EFE9"}
        )
        self.label = book.add_format({"bold": True, "valign": "top"})
        self.wrapped = book.add_format({"text_wrap": True, "valign": "top"})
        self.right = book.add_format({"align": "right"})
        self.note = book.add_format({"italic": True})
        self.entry = book.add_format({"bg_color": "#FFFFFF", "border": 4, "num_format": "0.0"})
        # The quote prefix keeps text that begins like a formula text also when somebody edits the cell.
        self.quoted = book.add_format({"quote_prefix": True})
        self.verdicts = {word: book.add_format(shade) for word, shade in _SHADES.items()}
        digits = {0: "#,##0", 1: "#,##0.0", 2: "#,##0.00", 3: "0.000"}
        self.numbers = {n: book.add_format({"num_format": form}) for n, form in digits.items()}


class Table:
    """A sheet with one table: frozen header, filters, real numbers; rows are written once, from the top."""

    def __init__(
        self, book: Workbook, name: str, columns: Sequence[Column], formats: Formats, rows: int | None = None
    ) -> None:
        self.name, self.columns, self.formats = name, columns, formats
        self.sheet: Worksheet = book.add_worksheet(name)
        self._next, self._head, self._opened = 0, 0, False
        self._writers = [self._writer(c) for c in columns]
        for k, column in enumerate(columns):
            self.sheet.set_column(k, k, column.width)
        if rows is not None:
            self._open()

    def heading(self, text: str) -> None:
        """A line above the header."""
        self.sheet.write_string(0, 0, text, self.formats.note)
        self._next = 1

    def row(self, values: Sequence[Any]) -> int:
        """Write a row; blank where a value is ``None``. Returns its number as people count it, from 1."""
        if not self._opened:
            self._open()
        for k, (value, write) in enumerate(zip(values, self._writers, strict=True)):
            if value is not None:
                write(self._next, k, value)
        self._next += 1
        return self._next

    def _open(self) -> None:
        self._opened, self._head = True, self._next
        self.sheet.set_row(self._head, 32)
        for k, column in enumerate(self.columns):
            self.sheet.write_string(self._head, k, column.header, self.formats.header)
        self.sheet.freeze_panes(self._head + 1, 1)
        self._next += 1

    def to_enter(self, line: int, column: int) -> None:
        """Mark a cell of the row that was written last as one to be filled in."""
        self.sheet.write_blank(line - 1, column, None, self.formats.entry)

    def formula(self, line: int, column: int, formula: str) -> None:
        """A formula of our own in the row that was written last; empty until something is entered."""
        self.sheet.write_formula(line - 1, column, formula, None, "")

    def close(self) -> None:
        """Filters over what was written, and how it prints."""
        if not self._opened:
            self._open()
        self.sheet.autofilter(self._head, 0, max(self._next - 1, self._head), len(self.columns) - 1)
        self.sheet.repeat_rows(0, self._head)
        set_page(self.sheet, self.name)

    def _writer(self, column: Column) -> Callable[[int, int, Any], Any]:
        sheet, formats = self.sheet, self.formats
        if column.digits is not None:
            form = formats.numbers[column.digits]

            def write_value(row: int, k: int, value: float | str) -> None:
                if isinstance(value, str):
                    sheet.write_string(row, k, value, formats.right)
                else:
                    sheet.write_number(row, k, value, form)

            return write_value
        if column.header == "verdict":
            return lambda row, k, value: sheet.write_string(row, k, value, formats.verdicts[value])
        return lambda row, k, value: sheet.write_string(row, k, value, _text_format(value, formats))


def _text_format(value: str, formats: Formats) -> Format | None:
    return formats.quoted if value[:1] in ("=", "+", "-", "@", "\t", "\r") else None


def set_page(sheet: Worksheet, name: str) -> None:
    """Paper: landscape, all columns on one page's width, the name and page number below."""
    sheet.set_landscape()
    sheet.fit_to_pages(1, 0)
    sheet.set_margins(0.4, 0.4, 0.6, 0.6)
    sheet.set_footer(f"&L{name}&CFerrule checks ratings; a qualified person decides&R&P / &N")
