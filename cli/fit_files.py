"""The result of a search as a file or a document; the ending of the file decides the form."""

from __future__ import annotations

import csv
import os
import sys
import tempfile
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any

from catalog.errors import CatalogError
from cli.console import note, on_terminal
from cli.documents import inverter_key, module_key, write_fit
from cli.facts import number_of_options
from matcher.options import Options, join

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.fit import Fit

FORMS = (".csv", ".json", ".xlsx", ".html", ".parquet")


def write(
    fit: Fit, out: str, year: SiteYear, *, with_checks: bool, why: bool, extra: Mapping[str, Any] | None = None,
    said: Sequence[str] = (),
) -> None:  # fmt: skip
    """Write all options to a file; ``extra`` are further entries of the document.

    ``said`` are paragraphs about the question as a whole, for the forms that are read as they are.

    Raises
    ------
    CatalogError
        Where the ending names no form, or the file cannot be written; a file of that name is then as before.
    """
    path = Path(out)
    form = path.suffix.lower()
    if form not in FORMS:
        raise CatalogError(f"--out {out}: the ending decides the form, {', '.join(FORMS[:-1])} or {FORMS[-1]}")
    if form == ".parquet":
        from cli import parquet

        parquet.required(out)
    with replacing(path, binary=form in (".xlsx", ".parquet")) as stream:
        if form == ".parquet":
            parquet.write_fit(fit, stream)
        elif form == ".xlsx":
            from cli.workbook import write_workbook

            write_workbook(fit, stream, year, with_checks=with_checks, why=why, said=said)
        elif form == ".html":
            from cli.report import write_report

            write_report(fit, stream, year, why=why, said=said)
        elif form == ".json":
            rejected = _rejected(fit, why)
            write_fit(fit, stream, weather=year.weather, with_checks=with_checks, rejected=rejected, extra=extra)
        else:
            write_csv(fit, stream)


def print_document(
    fit: Fit, weather: str | None, *, with_checks: bool, why: bool, extra: Mapping[str, Any] | None = None
) -> None:
    """Print the document on stdout; ``extra`` are further entries of it."""
    rejected = _rejected(fit, why)
    write_fit(fit, sys.stdout, weather=weather, with_checks=with_checks, rejected=rejected, extra=extra)


@contextmanager
def replacing(path: Path, binary: bool = False) -> Iterator[IO[Any]]:
    """A file of UTF-8 text (or bytes) that takes the place of ``path`` only once it is whole.

    A file that was there is kept beside it, with a ``~`` behind its name: nobody's work is written over.
    """
    folder = path.parent if str(path.parent) else Path()
    try:
        handle, name = tempfile.mkstemp(dir=folder, prefix=f".{path.name}.", suffix=".part")
    except OSError as error:
        raise CatalogError(f"{path}: {error.strerror}; choose another place with --out") from None
    try:
        with os.fdopen(handle, "wb") if binary else os.fdopen(handle, "w", encoding="utf-8", newline="") as stream:
            yield stream
        os.chmod(name, 0o666 & ~_umask())
        if path.is_file():
            before = path.with_name(f"{path.name}~")
            os.replace(path, before)
            note(f"{path} was there before; it is kept as {before}.")
        os.replace(name, path)
    except OSError as error:
        Path(name).unlink(missing_ok=True)
        raise CatalogError(f"{path}: {error.strerror}; nothing was written") from None
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


def _rejected(fit: Fit, why: bool) -> list[dict[str, Any]] | None:
    if not why:
        return None
    side, key = ("inverter", inverter_key) if fit.lists_inverters else ("module", module_key)
    records = fit.inverters if fit.lists_inverters else fit.modules
    return [
        {side: key(fit, k), "maker": records[k].maker, "model": records[k].model,
         "failed": list(r.failed), "nearest": r.nearest}
        for k, r in fit.rejections()
    ]  # fmt: skip


#: Columns of the CSV form: header with unit, and the values of a table of options.
_COLUMNS: tuple[tuple[str, Callable[[Fit, Options], list[Any]]], ...] = (
    ("verdict", lambda f, t: ["to-confirm" if unsure else "fits" for unsure in t.to_confirm.tolist()]),
    ("module_maker", lambda f, t: [safe(f.modules[m].maker) for m in t.module.tolist()]),
    ("module_model", lambda f, t: [safe(f.modules[m].model) for m in t.module.tolist()]),
    ("inverter_maker", lambda f, t: [safe(f.inverters[i].maker) for i in t.inverter.tolist()]),
    ("inverter_model", lambda f, t: [safe(f.inverters[i].model) for i in t.inverter.tolist()]),
    ("units", lambda f, t: t.units.tolist()),
    ("modules", lambda f, t: t.modules.tolist()),
    ("arrangement", lambda f, t: _labels(t)),
    ("dc_ac_ratio", lambda f, t: [f"{ratio:.6g}" for ratio in t.ratio.tolist()]),
    ("clipping_loss_pct", lambda f, t: list(map(blank, t.clipping_pct.tolist()))),
    ("yearly_kwh", lambda f, t: list(map(blank, t.yearly_kwh.tolist()))),
    ("cold_voltage_margin_pct", lambda f, t: list(map(blank, t.margin_pct.tolist()))),
    ("string_lengths", lambda f, t: t.lengths.tolist()),
    ("rules", lambda f, t: [safe(f.request.rules.name)] * len(t)),
)

#: Options that are put into words at once.
_PART = 20_000


def write_csv(fit: Fit, stream: IO[str]) -> None:
    """Write all options as CSV, in order; with cost and currency where stock or prices were asked for."""
    writer = csv.writer(stream)
    shelf = fit.search.shelf
    writer.writerow(["rank", *(header for header, _ in _COLUMNS), *(["cost", "currency"] if shelf else [])])
    rank, total = 0, number_of_options(fit)
    with on_terminal("Written", "options") as progress:
        for t in _parts(fit):
            columns = [range(rank + 1, rank + len(t) + 1), *(values(fit, t) for _, values in _COLUMNS)]
            if shelf:
                costs = fit.search.cost(t).tolist()
                columns += [["" if c != c else f"{c:.2f}" for c in costs], ["" if c != c else shelf.currency for c in costs]]
            writer.writerows(zip(*columns, strict=True))
            rank += len(t)
            progress(rank, total)


def _parts(fit: Fit) -> Iterator[Options]:
    """All options in order, in tables of about one size."""
    for table in gathered(fit.ranked(), _PART):
        for first in range(0, len(table), _PART):
            yield table.take(slice(first, first + _PART))


def gathered(tables: Iterable[Options], rows: int) -> Iterator[Options]:
    """The same tables in fewer and larger ones, of so many rows at least but the last."""
    held: list[Options] = []
    number = 0
    for table in tables:
        held.append(table)
        number += len(table)
        if number >= rows:
            yield join(held)
            held, number = [], 0
    if held:
        yield join(held)


def _labels(options: Options) -> list[str]:
    from cli.sweep_files import labels

    words, which = labels(options)
    return [words[k] for k in which.tolist()]


def blank(value: float) -> str:
    """A number for a cell; blank where it is not known."""
    return "" if value != value else f"{value:.7g}"


def safe(text: str) -> str:
    """Text for a cell that no spreadsheet takes for a formula."""
    return f"'{text}" if text[:1] in ("=", "+", "-", "@", "\t", "\r") else text
