"""The result of a search as a workbook: options, what to confirm, checks, and what the result rests on."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import IO, TYPE_CHECKING, Any

from catalog.errors import CatalogError
from cli import facts
from cli.cautions import CAUTIONS
from cli.console import on_terminal
from cli.fit_screen import MOST, answer, question
from cli.fit_short import in_short
from cli.worksheets import Column, Formats, Table, set_page

if TYPE_CHECKING:
    from xlsxwriter.workbook import Workbook

    from cli.years import SiteYear
    from matcher.fit import Fit, Option

#: Rows of one sheet (ISO/IEC 29500 sets no limit; every spreadsheet in use has this one).
ROWS_OF_A_SHEET = 1_048_576

#: Options whose checks and values to confirm are written out.
EXPLAINED = 1_000


def write_workbook(
    fit: Fit, stream: IO[bytes], year: SiteYear, *, with_checks: bool, why: bool = False, said: Sequence[str] = ()
) -> None:
    """Write the workbook; ``said`` are paragraphs that stand with the question.

    Checks and values to confirm are written for the first `EXPLAINED` options. The climate window and the
    values to confirm stand beside every option where there are no more than that, or with ``with_checks``;
    the records without option on a sheet of their own with ``why``.

    Raises
    ------
    CatalogError
        Where there are more options than a sheet has rows.
    """
    import xlsxwriter

    number = facts.number_of_options(fit)
    if number > ROWS_OF_A_SHEET - 1:
        raise CatalogError(
            f"{number:,} options are more than a sheet of a workbook holds ({ROWS_OF_A_SHEET - 1:,}): write"
            " them to a .csv file, or narrow the question with --ratio or --count"
        )
    options = {
        "constant_memory": True,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
        "nan_inf_to_errors": False,
    }
    book = xlsxwriter.Workbook(stream, options)
    book.set_properties({"title": question(fit), "comments": "Made by Ferrule. Ratings only: no design."})
    sheets = _Sheets(book, fit, year, with_checks or number <= EXPLAINED, number, said)
    sheets.fill()
    if why:
        sheets.fill_rejected()
    try:
        book.close()
    except xlsxwriter.exceptions.FileCreateError as error:
        raise error.args[0] from None  # the OSError behind it


class _Sheets:
    """The four sheets, filled in one pass over the options, which may be gone through only once."""

    def __init__(self, book: Workbook, fit: Fit, year: SiteYear, explain_all: bool, number: int,
                 said: Sequence[str]) -> None:  # fmt: skip
        self.fit, self.year, self.explain_all, self.number = fit, year, explain_all, number
        self.said, self.in_stock = said, facts.is_in_stock(fit)
        self.costed = fit.search.shelf.currency if fit.search.shelf else None
        self.formats = Formats(book)
        self.options = Table(book, "Options", self._option_columns(), self.formats, number)
        self.confirm = Table(book, "To confirm", _CONFIRM_COLUMNS, self.formats)
        self.checks = Table(book, "Checks", _CHECK_COLUMNS, self.formats)
        self.basis = book.add_worksheet("Assumptions")

    def fill(self) -> None:
        """Write everything."""
        first: list[Option] = []
        if self.number > EXPLAINED:
            note = f"Of {self.number:,} options, the checks of the first {EXPLAINED:,} are listed."
            self.checks.heading(note)
            self.confirm.heading(note.replace("checks", "values to confirm"))
        with on_terminal("Written", "options") as progress:
            for option in self._all():
                if option.rank <= MOST:
                    first.append(option)
                self.options.row(self._option_row(option))
                if option.rank <= EXPLAINED:
                    for values in self._check_rows(option):
                        self.checks.row(values)
                    self._fill_confirm(option)
                progress(option.rank, self.number)
        for table in (self.options, self.confirm, self.checks):
            table.close()
        self._fill_basis(first)

    def fill_rejected(self) -> None:
        """A sheet of the records without option, the nearest misses first."""
        records = self.fit.inverters if self.fit.lists_inverters else self.fit.modules
        table = Table(self.formats.book, "Without option", _REJECTED_COLUMNS, self.formats)
        for k, reason in self.fit.rejections()[: ROWS_OF_A_SHEET - 1]:
            table.row([records[k].maker, records[k].model, ", ".join(reason.failed), reason.nearest])
        table.close()

    def _all(self) -> Iterator[Option]:
        rank = 0
        for table in self.fit.ranked():
            for row in range(len(table)):
                rank += 1
                yield self.fit.option(table, row, rank, full=self.explain_all or rank <= EXPLAINED)

    def _option_columns(self) -> list[Column]:
        columns = [
            Column("rank", 6, 0),
            Column("verdict", 12),
            Column("module maker", 20),
            Column("module model", 22),
            Column("module power [W]", 9, 0),
            Column("inverter maker", 20),
            Column("inverter model", 26),
            Column("AC power of a unit [W]" if self.fit.request.several else "AC power [W]", 10, 0),
            Column("units", 6, 0),
            Column("modules", 9, 0),
            Column("arrangement", 20),
            Column("DC/AC ratio", 8, 3),
            Column("clipping loss [%]", 9, 2),
            Column("yearly energy, no clouds [kWh]" if self.year.clear_sky else "yearly energy [kWh]", 10, 0),
        ]
        if self.in_stock:
            columns.append(Column("in stock", 8, 0))
        if self.costed:
            columns.append(Column(f"cost [{self.costed}]", 11, 2))
        if self.explain_all:
            columns += [
                Column("holds down to [degC]", 10, 1),
                Column("holds up to [degC]", 10, 1),
                Column("to confirm", 60),
            ]
        return columns

    def _option_row(self, o: Option) -> list[Any]:
        module, inverter = self.fit.modules[o.module], self.fit.inverters[o.inverter]
        row = [
            o.rank,
            str(o.verdict),
            module.maker,
            module.model,
            module.pmax_w,
            inverter.maker,
            inverter.model,
            inverter.ac_power_w,
            o.units,
            o.modules,
            o.label,
            o.dc_ac_ratio,
            o.clipping_loss_pct,
            o.yearly_kwh,
        ]
        if self.in_stock:
            row.append(facts.pieces_in_stock(self.fit, o))
        if self.costed:
            row.append(o.cost)
        if self.explain_all:
            row += [facts.holds_from(o), facts.holds_to(o), facts.confirm_line(o) or None]
        return row

    def _check_rows(self, o: Option) -> Iterator[list[Any]]:
        module, inverter = self.fit.modules[o.module], self.fit.inverters[o.inverter]
        for c in o.checks:
            kind = "safety" if c.safety else "stop" if c.stop else "note"
            unit = None if c.unit == "1" else c.unit
            yield [
                o.rank,
                module.name,
                inverter.name,
                o.label,
                c.check,
                kind,
                c.value,
                c.limit,
                unit,
                c.margin_pct,
                str(c.verdict),
                c.rule,
                c.remark,
            ]

    def _fill_confirm(self, o: Option) -> None:
        for c in o.confirm:
            record = self.fit.modules[o.module] if c.record == "module" else self.fit.inverters[o.inverter]
            least = facts.at_least(c)
            line = self.confirm.row(
                [
                    o.rank,
                    c.record,
                    record.maker,
                    record.model,
                    facts.field_words(c),
                    least,
                    c.unit,
                    None,
                    None,
                ]
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
            *[("In short", line) for line in (*self.said, in_short(self.fit, first)) if line],
            *[("Rests on", line) for line in facts.rests_on(self.fit, self.year)],
            *[("Caution", line) for line in CAUTIONS],
            (
                "Verdicts",
                "fits: every check that can stop it holds by the ratings on record. to-confirm: nothing on record speaks"
                " against it, but a safety rating is not on record; the sheet To confirm names what"
                " settles it.",
            ),
        ]
        for k, (what, line) in enumerate(lines):
            sheet.write_string(k, 0, what if not k or lines[k - 1][0] != what else "", formats.label)
            sheet.write_string(k, 1, line, formats.wrapped)
            # Spreadsheets do not fit the height of a wrapped row by themselves when the file says nothing.
            sheet.set_row(k, 15.0 * (1 + len(line) // 112) + 3)
        set_page(sheet, "Assumptions")


_CONFIRM_COLUMNS = (
    Column("rank", 6, 0),
    Column("record", 10),
    Column("maker", 22),
    Column("model", 26),
    Column("value to read on the datasheet", 44),
    Column("at least", 10, 1),
    Column("unit", 6),
    Column("datasheet says", 12, 1),
    Column("settled?", 24),
)

_REJECTED_COLUMNS = (
    Column("maker", 22),
    Column("model", 28),
    Column("stopped by", 30),
    Column("nearest", 110),
)

_CHECK_COLUMNS = (
    Column("rank", 6, 0),
    Column("module", 28),
    Column("inverter", 34),
    Column("arrangement", 18),
    Column("check", 16),
    Column("kind", 8),
    Column("value", 10, 1),
    Column("limit", 10, 1),
    Column("unit", 6),
    Column("margin [%]", 9, 1),
    Column("verdict", 13),
    Column("rule", 48),
    Column("remark", 40),
)
