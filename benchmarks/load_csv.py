"""Loading 20,000 datasheets from CSV, plausibility checks included, against a bare ``executemany`` of the same rows.

    python benchmarks/load_csv.py [ROWS]

Both begin with the file's rows and end with a committed SQLite file. The bare one parses the file by `csv`, makes
numbers of its numbers, and inserts the rows into one table without index, check or history.
"""

from __future__ import annotations

import csv
import random
import sqlite3
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

from catalog.records import Module, Source  # noqa: E402
from catalog.sheetfiles import read_sheets, write_sheets  # noqa: E402
from catalog.store import Catalog  # noqa: E402

_REPEATS = 3


def invented(number: int) -> list[Module]:
    """Invented modules whose values go together as real ones do."""
    rng = random.Random(7)
    found = []
    for k in range(number):
        cells = rng.choice((54, 60, 66, 72))
        vmp, imp = round(cells * rng.uniform(0.55, 0.6), 2), round(rng.uniform(8, 14), 2)
        found.append(
            Module(
                maker=f"Invented {k % 60}", model=f"IV-{k}", technology="Mono-c-Si", bifacial=k % 3 == 0,
                cells_in_series=cells, pmax_w=round(vmp * imp, 1), voc_v=round(vmp * 1.2, 2), isc_a=round(imp * 1.06, 2),
                vmp_v=vmp, imp_a=imp, voc_coef_pct=round(rng.uniform(-0.32, -0.25), 3), isc_coef_pct=round(rng.uniform(0.03, 0.06), 3),
                pmax_coef_pct=round(rng.uniform(-0.4, -0.3), 3), noct_c=45.0, max_system_voltage_v=1500.0, max_series_fuse_a=25.0,
                length_m=1.722, width_m=1.134, source=Source("Invented tables", "2031"),
            )
        )  # fmt: skip
    return found


def bare(path: Path, target: Path) -> None:
    """The same rows by the standard library alone."""
    with path.open(encoding="utf-8", newline="") as file:
        heading, *rows = csv.reader(file)
    numeric = [k for k, cell in enumerate(rows[0]) if _is_number(cell)]
    for row in rows:
        for k in numeric:
            row[k] = float(row[k])
    with sqlite3.connect(target) as connection:
        connection.execute(f"CREATE TABLE sheet ({', '.join(heading)})")
        connection.executemany(f"INSERT INTO sheet VALUES ({', '.join('?' * len(heading))})", rows)
    connection.close()


def _is_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


def loaded(path: Path, target: Path) -> None:
    """The file into a new catalog."""
    found = read_sheets(path)
    with Catalog.open(target, create=True) as catalog:
        catalog.load(found.modules, found.inverters)


def best(what: Callable[[Path, Path], None], path: Path, folder: Path) -> float:
    """Least time of some repetitions [s]."""
    times = []
    for k in range(_REPEATS):
        began = time.perf_counter()
        what(path, folder / f"{what.__name__}-{k}.sqlite")
        times.append(time.perf_counter() - began)
    return min(times)


def main(rows: int = 20_000) -> None:
    """Print both times."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        path = folder / "invented.csv"
        write_sheets(path, invented(rows), [])
        loaded(path, folder / "warm.sqlite")
        ours, theirs = best(loaded, path, folder), best(bare, path, folder)
        began = time.perf_counter()
        read_sheets(path)
        reading = time.perf_counter() - began
    print(f"{rows:,} datasheets: loaded in {ours:.2f} s (read and checked in {reading:.2f} s of it);"
          f" bare executemany {theirs:.2f} s; ratio {ours / theirs:.1f}")  # fmt: skip


if __name__ == "__main__":
    main(*map(int, sys.argv[1:2]))
