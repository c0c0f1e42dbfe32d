"""Parts of a sweep as files, and the one file that they make up: CSV, or Parquet with the optional extra."""

from __future__ import annotations

import csv
import io
import os
import shutil
import tempfile
from collections.abc import Callable, Sequence
from dataclasses import fields
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from catalog.errors import CatalogError
from cli.fit_files import replacing, safe
from matcher.options import Options, label

if TYPE_CHECKING:
    from catalog.records import Inverter, Module
    from matcher.sweep import Bests

FORMS = (".csv", ".parquet")

COLUMNS = (
    "module_maker", "module_model", "inverter_maker", "inverter_model", "verdict", "modules", "arrangement",
    "dc_ac_ratio", "clipping_loss_pct", "yearly_kwh", "cold_voltage_margin_pct",
)  # fmt: skip

#: Writes the best options of a part to a stream.
PartWriter = Callable[["Bests", Sequence["Module"], Sequence["Inverter"], Any], None]


def form_of(out: str) -> str:
    """The form that the ending of a file name decides.

    Raises
    ------
    CatalogError
        Where it decides none, or the form needs a package that is not installed.
    """
    form = Path(out).suffix.lower()
    if form not in FORMS:
        raise CatalogError(f"--out {out}: the ending decides the form, {' or '.join(FORMS)}")
    if form == ".parquet":
        from cli.parquet import required

        required(out)
    return form


def write_part(
    form: str, path: Path, found: Bests, modules: Sequence[Module], inverters: Sequence[Inverter]
) -> None:
    """Write a part; its file stands there whole or not at all."""
    handle, name = tempfile.mkstemp(dir=path.parent, prefix=".", suffix=".tmp")
    try:
        with os.fdopen(handle, "wb") as stream:
            _WRITERS[form](found, modules, inverters, stream)
        os.replace(name, path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise


def assemble(form: str, parts: Sequence[Path], out: Path) -> None:
    """Make one file of the parts, in their order; it takes the place of another only once it is whole."""
    with replacing(out, binary=True) as stream:
        if form == ".parquet":
            from cli.parquet import concatenate

            concatenate(parts, stream)
            return
        stream.write((",".join(COLUMNS) + "\r\n").encode())
        for part in parts:
            with part.open("rb") as lines:
                shutil.copyfileobj(lines, stream, 1 << 20)


def labels(options: Options) -> tuple[list[str], np.ndarray]:
    """The different arrangements in words, and which of them each option has, shape (n,)."""
    which = np.zeros(len(options), dtype=np.int64)
    for f in fields(options):
        values = getattr(options, f.name)
        for column in values.T if values.ndim == 2 else ():
            if (column != column[:1]).any():
                which = np.unique(which * (int(column.max()) + 1) + column, return_inverse=True)[1]
    _, first = np.unique(which, return_index=True)
    return [label(options.wired(k)) for k in first.tolist()], which


def _write_csv(found: Bests, modules: Sequence[Module], inverters: Sequence[Inverter], stream: Any) -> None:
    t = found.options
    words, which = labels(t)
    verdicts = np.array(["fits", "to-confirm"], dtype=object)[t.to_confirm.astype(np.int8)]
    columns = (verdicts, t.modules, np.array(words, dtype=object)[which], t.ratio, t.clipping_pct, t.yearly_kwh, t.margin_pct)
    # What does not depend on names is put into words once for all twins, and all of it at once.
    cells = [None] * (len(columns) * len(t))
    for k, column in enumerate(columns):
        cells[k :: len(columns)] = column.tolist()
    text = "%s,%d,%s,%.6g,%.7g,%.7g,%.7g\r\n" * len(t) % tuple(cells)
    tails = text.replace(",nan", ",").splitlines(keepends=True)
    inverter_names = [_cells(i.maker, i.model) for i in inverters]
    for module, rows in zip(modules, found.rows.tolist(), strict=True):
        name = _cells(module.maker, module.model)
        lines = [
            f"{name}{inverter}{tails[row]}"
            for inverter, row in zip(inverter_names, rows, strict=True)
            if row >= 0
        ]
        stream.write("".join(lines).encode())


def _cells(*texts: str) -> str:
    """Cells of a CSV line, each with the comma after it."""
    line = io.StringIO()
    csv.writer(line, lineterminator=",").writerow([safe(text) for text in texts])
    return line.getvalue()


def _write_parquet(found: Bests, modules: Sequence[Module], inverters: Sequence[Inverter], stream: Any) -> None:
    from cli.parquet import write_table

    m, i = np.nonzero(found.rows >= 0)
    row = found.rows[m, i]
    t = found.options
    words, which = labels(t)
    values = (
        ([module.maker for module in modules], m), ([module.model for module in modules], m),
        ([inverter.maker for inverter in inverters], i), ([inverter.model for inverter in inverters], i),
        (["fits", "to-confirm"], t.to_confirm[row].astype(np.int32)), t.modules[row], (words, which[row]),
        t.ratio[row], t.clipping_pct[row], t.yearly_kwh[row], t.margin_pct[row],
    )  # fmt: skip
    write_table(dict(zip(COLUMNS, values, strict=True)), stream)


_WRITERS: dict[str, PartWriter] = {".csv": _write_csv, ".parquet": _write_parquet}
