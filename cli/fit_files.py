"""The result of a search as a file or a document; the ending of the file decides the form."""

from __future__ import annotations

import csv
import os
import sys
import tempfile
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any

from catalog.errors import CatalogError
from cli.console import note
from cli.documents import inverter_key, module_key, write_fit
from matcher.options import label

if TYPE_CHECKING:
    from cli.years import SiteYear
    from matcher.fit import Fit
    from matcher.options import Options

FORMS = (".csv", ".json", ".xlsx", ".html", ".parquet")


def write(
    fit: Fit, out: str, year: SiteYear, *, with_checks: bool, why: bool, extra: Mapping[str, Any] | None = None
) -> None:
    """Write all options to a file; ``extra`` are further entries of the document.

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

            write_workbook(fit, stream, year, with_checks=with_checks, why=why)
        elif form == ".html":
            from cli.report import write_report

            write_report(fit, stream, year, why=why)
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


#: Columns of the CSV form: header with unit, and the value of row k of a table of options.
_COLUMNS: tuple[tuple[str, Callable[[Fit, Options, int], Any]], ...] = (
    ("verdict", lambda f, t, k: "to-confirm" if t.to_confirm[k] else "fits"),
    ("module_maker", lambda f, t, k: safe(f.modules[t.module[k]].maker)),
    ("module_model", lambda f, t, k: safe(f.modules[t.module[k]].model)),
    ("inverter_maker", lambda f, t, k: safe(f.inverters[t.inverter[k]].maker)),
    ("inverter_model", lambda f, t, k: safe(f.inverters[t.inverter[k]].model)),
    ("units", lambda f, t, k: t.units[k]),
    ("modules", lambda f, t, k: t.modules[k]),
    ("arrangement", lambda f, t, k: label(t.wired(k))),
    ("dc_ac_ratio", lambda f, t, k: f"{t.ratio[k]:.6g}"),
    ("clipping_loss_pct", lambda f, t, k: blank(t.clipping_pct[k])),
    ("yearly_kwh", lambda f, t, k: blank(t.yearly_kwh[k])),
    ("cold_voltage_margin_pct", lambda f, t, k: blank(t.margin_pct[k])),
    ("string_lengths", lambda f, t, k: t.lengths[k]),
    ("rules", lambda f, t, k: safe(f.request.rules.name)),
)


def write_csv(fit: Fit, stream: IO[str]) -> None:
    """Write all options as CSV, in order; with cost and currency where stock or prices were asked for."""
    writer = csv.writer(stream)
    shelf = fit.search.shelf
    writer.writerow(["rank", *(header for header, _ in _COLUMNS), *(["cost", "currency"] if shelf else [])])
    rank = 0
    for table in fit.ranked():
        costs = fit.search.cost(table).tolist() if shelf else []
        for k in range(len(table)):
            rank += 1
            cost = [f"{costs[k]:.2f}", shelf.currency] if shelf and costs[k] == costs[k] else [""] * 2 if shelf else []
            writer.writerow([rank, *(value(fit, table, k) for _, value in _COLUMNS), *cost])


def blank(value: float) -> str:
    """A number for a cell; blank where it is not known."""
    return "" if value != value else f"{value:.7g}"


def safe(text: str) -> str:
    """Text for a cell that no spreadsheet takes for a formula."""
    return f"'{text}" if text[:1] in ("=", "+", "-", "@", "\t", "\r") else text
