"""``ferrule sheet load``: the public tables, or files of datasheets, into the catalog."""

from __future__ import annotations

import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from catalog.errors import CatalogError
from cli.kinds import asked_kinds
from cli.opening import CatalogOption, location, open_catalog

if TYPE_CHECKING:
    from catalog.loading import LoadReport, Progress
    from catalog.sheetfiles import SheetFile
    from cli.columns import Columns

PUBLIC_TABLES = "cec"

#: Remarks on a file that are said one by one; the others are counted.
_REMARKS = 20


def load(
    what: Annotated[
        list[str],
        typer.Argument(
            metavar="cec|FILE...",
            help="The public CEC tables, or files of datasheets (.csv, .xlsx, .toml, .json of Orange Button).",
            show_default=False,
        ),
    ],
    modules: Annotated[
        Path | None,
        typer.Option(
            metavar="FILE", help="With cec: this table of modules instead of the one that comes with pvlib."
        ),
    ] = None,
    inverters: Annotated[
        Path | None,
        typer.Option(
            metavar="FILE",
            help="With cec: this table of inverters. With one of the two options, only that table is loaded.",
        ),
    ] = None,
    kind: Annotated[
        str | None,
        typer.Option("--kind", metavar="KIND", help="What the rows are, where a table does not tell."),
    ] = None,
    columns: Annotated[
        list[str] | None,
        typer.Option(
            "--map",
            metavar="HEADING=FIELD",
            help='What a column is: "Power (W)=pmax_w", "Tk=voc_coef_pct in mV/K"; no field leaves it out.',
        ),
    ] = None,
    given: Annotated[
        list[str] | None,
        typer.Option(
            "--set",
            metavar="FIELD=VALUE",
            help="A value for all records of the files that state none, such as bifacial=no; it counts as entered.",
        ),
    ] = None,
    yes: Annotated[bool, typer.Option("--yes", help="Accept what the columns seem to be.")] = False,
    catalog: CatalogOption = None,
) -> None:
    """Load the public tables or your own datasheets: all or nothing, and safe to repeat.

    What is loaded again and has not changed stays as it is; what has changed becomes a new revision, and
    values that you amended yourself are kept. The catalog is made where there is none.

    Tables may have headings as people write them, in units as people use them. What they are taken for is
    shown; what is not sure is asked for, or accepted with --yes, and kept for the next table like it.

    Example: ferrule sheet load cec
    """
    began = time.perf_counter()
    from cli.columns import Columns, pairs
    from cli.console import say
    from cli.stock_review import say_matched

    values = pairs(given or (), "--set", "bifacial=no")
    settled = Columns(catalog, pairs(columns or (), "--map", "Power (W)=pmax_w"), yes, values)
    (kind,) = asked_kinds(kind) if kind else (None,)
    found = _read(what, modules, inverters, settled, kind, values)
    with open_catalog(catalog, create=True) as opened:
        with _progress() as tell:
            report = opened.load(found.modules, found.inverters, tell)
        settled.keep(opened)
        _say_loaded(found, report, time.perf_counter() - began)
        say_matched(opened)
    say(f"Catalog: {location(catalog)}")


def _say_loaded(found: SheetFile, report: LoadReport, seconds: float) -> None:
    from cli.console import counted, note, say

    for line in found.notes[:_REMARKS]:
        note(line)
    if len(found.notes) > _REMARKS:
        note(f"... and {counted(len(found.notes) - _REMARKS, 'more remark')}")
    say(
        f"{counted(len(found.modules), 'module')} and {counted(len(found.inverters), 'inverter')}:"
        f" {report.new:,} new, {report.changed:,} changed, {report.unchanged:,} unchanged, in {seconds:.1f} s."
    )


def _read(
    what: list[str],
    modules: Path | None,
    inverters: Path | None,
    columns: Columns,
    kind: str | None,
    given: Mapping[str, str],
) -> SheetFile:
    from catalog.sheetfiles import SheetFile

    if PUBLIC_TABLES in what:
        if len(what) > 1:
            raise CatalogError(
                f"load {PUBLIC_TABLES} by itself, then the files (a file of that name: ./{PUBLIC_TABLES})"
            )
        return _public(modules, inverters)
    if modules or inverters:
        option = "--modules" if modules else "--inverters"
        raise CatalogError(
            f"{option} belongs to 'ferrule sheet load {PUBLIC_TABLES}'; name datasheet files without it"
        )
    files, problems = [], []
    for name in what:
        try:
            files.append(_file(Path(name), columns, kind, given))
        except CatalogError as problem:
            problems.append(str(problem))
    if problems:
        # One try tells what is wrong with all of the files.
        raise CatalogError("\n".join(dict.fromkeys(problems)))
    columns.check_used()
    return SheetFile(
        [record for file in files for record in file.modules],
        [record for file in files for record in file.inverters],
        [line for file in files for line in file.notes],
    )


def _public(modules: Path | None, inverters: Path | None) -> SheetFile:
    """The CEC tables: those that are named, or both that pvlib installs."""
    from catalog.cec import read_cec_inverters, read_cec_modules
    from catalog.sheetfiles import SheetFile

    both = modules is None and inverters is None
    return SheetFile(
        read_cec_modules(modules) if both or modules else [],
        read_cec_inverters(inverters) if both or inverters else [],
        [],
    )


def _file(path: Path, columns: Columns, kind_of_rows: str | None, given: Mapping[str, str]) -> SheetFile:
    """A file in one of the project's forms, or a CEC table; its content tells which."""
    from catalog.cec import cec_kind
    from catalog.sheetfiles import read_sheets

    kind = cec_kind(path) if path.suffix.casefold() == ".csv" else None
    if kind is None:
        if not path.exists() and not path.suffix:
            raise CatalogError(
                f"{path}: no such file; write '{PUBLIC_TABLES}' for the public tables, or the path of a file"
            )
        try:
            return read_sheets(path, settle=columns.settle, kind=kind_of_rows, given=given)
        except CatalogError as problem:
            raise CatalogError("\n".join((str(problem), *_other_faults(path, columns, kind_of_rows, given)))) from None
    return _public(path, None) if kind == "module" else _public(None, path)


def _other_faults(path: Path, columns: Columns, kind: str | None, given: Mapping[str, str]) -> list[str]:
    """Rows that cannot be read, where the columns of a table are not settled yet: one try tells both."""
    from catalog.sheet_needs import stand_ins
    from catalog.sheetfiles import read_sheets

    instead = None if columns.lacking is None else stand_ins(columns.lacking)
    if instead is None:
        return []
    try:
        read_sheets(path, settle=columns.as_it_seems, kind=kind, given={**given, **instead})
    except CatalogError as problem:
        return [str(problem)]
    return []


@contextmanager
def _progress() -> Iterator[Progress | None]:
    """A bar on stderr where that is a terminal."""
    from cli.console import console

    screen = console(stderr=True)
    if not screen.is_terminal:
        yield None
        return
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeElapsedColumn

    columns = (TextColumn("{task.description}"), BarColumn(), MofNCompleteColumn(), TimeElapsedColumn())
    with Progress(*columns, console=screen, transient=True) as bar:
        task = bar.add_task("reading", total=None)
        yield lambda done, total: bar.update(task, description="loading", completed=done, total=total)
