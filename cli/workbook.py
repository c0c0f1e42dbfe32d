"""The result of a search as a workbook: options, what to confirm, checks, and what the result rests on."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import IO, TYPE_CHECKING, Any

from catalog.errors import CatalogError
from cli import facts
from cli.cautions import CAUTIONS
from cli.fit_screen import answer, question

if TYPE_CHECKING:
    from xlsxwriter.format import Format
    from xlsxwriter.workbook import Workbook
    from xlsxwriter.worksheet import Worksheet

    from cli.years import SiteYear
    from matcher.fit import Fit, Option

#: Rows of one sheet (ISO/IEC 29500 sets no limit; every spreadsheet in use has this one).
ROWS_OF_A_SHEET = 1_048_576

#: Options whose checks and values to confirm are written out.
EXPLAINED = 1_000

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


def write_workbook(fit: Fit, stream: IO[bytes], year: SiteYear, *, with_checks: bool) -> None:
    """Write the workbook.

    Checks and values to confirm are written for the first `EXPLAINED` options. The climate window and the
    values to confirm stand beside every option where there are no more than that, or with ``with_checks``.

    Raises
    ------
    CatalogError
        Where there are more options than a sheet has rows.
    """
    import xlsxwriter

    number = facts.number_of_options(fit)
    if number > ROWS_OF_A_SHEET - 1:
        raise CatalogError(
            f"{number:,} options are more than a sheet of a workbook holds ({ROWS_OF_A_SHEET - 1:,}): write them to"
            " a .csv file, or narrow the question with --ratio or --count"
        )
    options = {"constant_memory": True, "strings_to_formulas": False, "strings_to_urls": False,
               "strings_to_numbers": False, "nan_inf_to_errors": False}  # fmt: skip
    book = xlsxwriter.Workbook(stream, options)
    book.set_properties({"title": question(fit), "comments": "Made by Ferrule. Ratings only: no design."})
    _Sheets(book, fit, year, with_checks or number <= EXPLAINED, number).fill()
    try:
        book.close()
    except xlsxwriter.exceptions.FileCreateError as error:
        raise error.args[0] from None  # the OSError behind it


class _Sheets:
    """The four sheets, filled in one pass over the options, which may be gone through only once."""

    def __init__(self, book: Workbook, fit: Fit, year: SiteYear, explain_all: bool, number: int) -> None:
        self.fit, self.year, self.explain_all, self.number = fit, year, explain_all, number
        self.formats = _Formats(book)
        self.options = _Table(book, "Options", self._option_columns(), self.formats, number)
        self.confirm = _Table(book, "To confirm", _CONFIRM_COLUMNS, self.formats)
        self.checks = _Table(book, "Checks", _CHECK_COLUMNS, self.formats)
        self.basis = book.add_worksheet("Assumptions")

    def fill(self) -> None:
        """Write everything."""
        first: list[Option] = []
        if self.number > EXPLAINED:
            note = f"Of {self.number:,} options, the checks of the first {EXPLAINED:,} are listed."
            self.checks.heading(note)
            self.confirm.heading(note.replace("checks", "values to confirm"))
        for option in self._all():
            first = first or [option]
            self.options.row(self._option_row(option))
            if option.rank <= EXPLAINED:
                for values in self._check_rows(option):
                    self.checks.row(values)
                self._fill_confirm(option)
        for table in (self.options, self.confirm, self.checks):
            table.close()
        self._fill_basis(first)

    def _all(self) -> Iterator[Option]:
        rank = 0
        for table in self.fit.ranked():
            for row in range(len(table)):
                rank += 1
                yield self.fit.option(table, row, rank, full=self.explain_all or rank <= EXPLAINED)

    def _option_columns(self) -> list[Column]:
        columns = [
            Column("rank", 6, 0), Column("verdict", 12), Column("module maker", 20), Column("module model", 22),
            Column("module power [W]", 9, 0), Column("inverter maker", 20), Column("inverter model", 26),
            Column("AC power [W]", 10, 0), Column("units", 6, 0), Column("modules", 9, 0), Column("arrangement", 20),
            Column("DC/AC ratio", 8, 3), Column("clipping loss [%]", 9, 2), Column("yearly energy [kWh]", 10, 0),
        ]  # fmt: skip
        if self.explain_all:
            columns += [
                Column("holds down to [degC]", 10, 1), Column("holds up to [degC]", 10, 1), Column("to confirm", 60),
            ]  # fmt: skip
        return columns

    def _option_row(self, o: Option) -> list[Any]:
        module, inverter = self.fit.modules[o.module], self.fit.inverters[o.inverter]
        row = [
            o.rank, str(o.verdict), module.maker, module.model, module.pmax_w, inverter.maker, inverter.model,
            inverter.ac_power_w, o.units, o.modules, o.label, o.dc_ac_ratio, o.clipping_loss_pct, o.yearly_kwh,
        ]  # fmt: skip
        if self.explain_all:
            row += [facts.coldest(o), o.hottest_c, facts.confirm_line(o) or None]
        return row

    def _check_rows(self, o: Option) -> Iterator[list[Any]]:
        module, inverter = self.fit.modules[o.module], self.fit.inverters[o.inverter]
        for c in o.checks:
            kind = "safety" if c.safety else "stop" if c.stop else "note"
            unit = None if c.unit == "1" else c.unit
            yield [o.rank, module.name, inverter.name, o.label, c.check, kind, c.value, c.limit, unit,
                   c.margin_pct, str(c.verdict), c.rule, c.remark]  # fmt: skip

    def _fill_confirm(self, o: Option) -> None:
        for c in o.confirm:
            record = self.fit.modules[o.module] if c.record == "module" else self.fit.inverters[o.inverter]
            least = facts.at_least(c)
            line = self.confirm.row(
                [o.rank, c.record, record.maker, record.model, facts.field_words(c), least, c.unit, None, None]
            )
            self.confirm.to_enter(line, 7)
            if least is not None:
                formula = f'=IF(H{line}="","",IF(H{line}>=F{line},"settled","too low: does not fit"))'
                self.confirm.formula(line, 8, formula)

    def _fill_basis(self, first: list[Option]) -> None:
        sheet, formats = self.basis, self.formats
        sheet.set_column(0, 0, 16)
        sheet.set_column(1, 1, 110)
        sheet.hide_gridlines(2)
        lines = [
            ("Question", question(self.fit)),
            ("Answer", answer(self.fit, first)),
            ("Order", f"{self.fit.order}."),
            *[("Rests on", line) for line in facts.rests_on(self.fit, self.year)],
            *[("Caution", line) for line in CAUTIONS],
            ("Verdicts", "fits: every rating is on record and holds. to-confirm: nothing on record speaks against it,"
             " but a safety rating is not on record; the sheet To confirm names the value that settles it."),
        ]  # fmt: skip
        for k, (what, line) in enumerate(lines):
            sheet.write_string(k, 0, what if not k or lines[k - 1][0] != what else "", formats.label)
            sheet.write_string(k, 1, line, formats.wrapped)
            # Spreadsheets do not fit the height of a wrapped row by themselves when the file says nothing.
            sheet.set_row(k, 15.0 * (1 + len(line) // 112) + 3)
        _page(sheet, "Assumptions")


_CONFIRM_COLUMNS = (
    Column("rank", 6, 0), Column("record", 10), Column("maker", 22), Column("model", 26),
    Column("value to read on the datasheet", 44), Column("at least", 10, 1), Column("unit", 6),
    Column("datasheet says", 12, 1), Column("settled?", 24),
)  # fmt: skip

_CHECK_COLUMNS = (
    Column("rank", 6, 0), Column("module", 28), Column("inverter", 34), Column("arrangement", 18),
    Column("check", 16), Column("kind", 8), Column("value", 10, 1), Column("limit", 10, 1), Column("unit", 6),
    Column("margin [%]", 9, 1), Column("verdict", 13), Column("rule", 48), Column("remark", 40),
)  # fmt: skip


class _Formats:
    """Cell formats of a workbook, made once."""

    def __init__(self, book: Workbook) -> None:
        self.header = book.add_format(
            {"bold": True, "text_wrap": True, "valign": "top", "bottom": 1, "bg_color": "#F1EFE9"}
        )
        self.label = book.add_format({"bold": True, "valign": "top"})
        self.wrapped = book.add_format({"text_wrap": True, "valign": "top"})
        self.note = book.add_format({"italic": True})
        self.entry = book.add_format({"bg_color": "#FFFFFF", "border": 4, "num_format": "0.0"})
        # The quote prefix keeps text that begins like a formula text also when somebody edits the cell.
        self.quoted = book.add_format({"quote_prefix": True})
        self.verdicts = {word: book.add_format(shade) for word, shade in _SHADES.items()}
        digits = {0: "#,##0", 1: "#,##0.0", 2: "#,##0.00", 3: "0.000"}
        self.numbers = {n: book.add_format({"num_format": form}) for n, form in digits.items()}


class _Table:
    """A sheet with one table: frozen header, filters, real numbers; rows are written once, from the top."""

    def __init__(
        self, book: Workbook, name: str, columns: Sequence[Column], formats: _Formats, rows: int | None = None
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
        """A formula of our own in the row that was written last; its result is empty until something is entered."""
        self.sheet.write_formula(line - 1, column, formula, None, "")

    def close(self) -> None:
        """Filters over what was written, and how it prints."""
        if not self._opened:
            self._open()
        self.sheet.autofilter(self._head, 0, max(self._next - 1, self._head), len(self.columns) - 1)
        self.sheet.repeat_rows(0, self._head)
        _page(self.sheet, self.name)

    def _writer(self, column: Column) -> Callable[[int, int, Any], Any]:
        sheet, formats = self.sheet, self.formats
        if column.digits is not None:
            form = formats.numbers[column.digits]
            return lambda row, k, value: sheet.write_number(row, k, value, form)
        if column.header == "verdict":
            return lambda row, k, value: sheet.write_string(row, k, value, formats.verdicts[value])
        return lambda row, k, value: sheet.write_string(row, k, value, _text_format(value, formats))


def _text_format(value: str, formats: _Formats) -> Format | None:
    return formats.quoted if value[:1] in ("=", "+", "-", "@", "\t", "\r") else None


def _page(sheet: Worksheet, name: str) -> None:
    sheet.set_landscape()
    sheet.fit_to_pages(1, 0)
    sheet.set_margins(0.4, 0.4, 0.6, 0.6)
    sheet.set_footer(f"&L{name}&CFerrule checks ratings; a qualified person decides&R&P / &N")
