"""Parquet, for which the optional extra ``parquet`` installs pyarrow."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from catalog.errors import CatalogError
from matcher.options import Options

if TYPE_CHECKING:
    import pyarrow

    from matcher.fit import Fit

#: A column: numbers, or different texts and which of them each row has.
Column = np.ndarray | tuple[Sequence[str], np.ndarray]

#: Rows of a file that are written together.
_ROW_GROUP = 250_000

_COMPRESSION: dict[str, Any] = {"compression": "zstd", "compression_level": 1}


def required(out: str) -> None:
    """Make sure that Parquet can be written.

    Raises
    ------
    CatalogError
        Where pyarrow is not installed.
    """
    try:
        import pyarrow.parquet  # noqa: F401
    except ImportError:
        raise CatalogError(
            f"--out {out}: Parquet needs the optional extra: pip install 'ferrule[parquet]', or choose .csv"
        ) from None


def write_table(columns: Mapping[str, Column], stream: Any) -> None:
    """Write columns as a file of one row group; not a number becomes null."""
    import pyarrow.parquet as pq

    table = _table(columns)
    pq.write_table(table, stream, row_group_size=max(1, table.num_rows), **_COMPRESSION)


def concatenate(parts: Sequence[Path], stream: Any) -> None:
    """One file of files with the same columns, in their order; a row group for each."""
    import pyarrow.parquet as pq

    with pq.ParquetWriter(stream, pq.read_schema(parts[0]), **_COMPRESSION) as writer:
        for part in parts:
            table = pq.read_table(part)
            if table.num_rows:
                writer.write_table(table, row_group_size=table.num_rows)


def write_fit(fit: Fit, stream: Any) -> None:
    """Write all options of a result, in order."""
    import pyarrow.parquet as pq

    from cli.fit_files import gathered

    writer = None
    rank = 0
    for options in gathered(fit.ranked(), _ROW_GROUP):
        table = _table({"rank": np.arange(rank + 1, rank + len(options) + 1), **_fit_columns(fit, options)})
        rank += len(options)
        writer = writer or pq.ParquetWriter(stream, table.schema, **_COMPRESSION)
        writer.write_table(table, row_group_size=_ROW_GROUP)
    if writer is not None:
        writer.close()


def _fit_columns(fit: Fit, t: Options) -> dict[str, Column]:
    from cli.sweep_files import labels

    m, i = (np.unique(a, return_inverse=True) for a in (t.module, t.inverter))
    modules, inverters = [fit.modules[k] for k in m[0]], [fit.inverters[k] for k in i[0]]
    return {
        "verdict": (["fits", "to-confirm"], t.to_confirm.astype(np.int32)),
        "module_maker": ([r.maker for r in modules], m[1]),
        "module_model": ([r.model for r in modules], m[1]),
        "inverter_maker": ([r.maker for r in inverters], i[1]),
        "inverter_model": ([r.model for r in inverters], i[1]),
        "units": t.units,
        "modules": t.modules,
        "arrangement": labels(t),
        "dc_ac_ratio": t.ratio,
        "clipping_loss_pct": t.clipping_pct,
        "yearly_kwh": t.yearly_kwh,
        "cold_voltage_margin_pct": t.margin_pct,
        "string_lengths": t.lengths,
        "rules": ([fit.request.rules.name], np.zeros(len(t), dtype=np.int32)),
    }


def _table(columns: Mapping[str, Column]) -> pyarrow.Table:
    import pyarrow as pa

    def array(column: Column) -> pyarrow.Array:
        if isinstance(column, tuple):
            texts, which = column
            return pa.DictionaryArray.from_arrays(which.astype(np.int32), pa.array(texts, pa.string()))
        if column.dtype.kind == "f":
            return pa.array(column, from_pandas=True)
        return pa.array(column.astype(np.int32))

    return pa.table({name: array(column) for name, column in columns.items()})
