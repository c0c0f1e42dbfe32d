"""Read and load random and damaged files of datasheets; print how many were taken and refused.

    python benchmarks/fuzz_sheets.py [FILES]

Ends with the traceback of the first file that does something else than be taken whole or be refused in one line.
"""

from __future__ import annotations

import sys
import tempfile
import time
from collections import Counter
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
sys.path[:0] = [str(ROOT), str(ROOT / "tests")]

from hypothesis import HealthCheck, Phase, given, settings  # noqa: E402
from sheet_fuzz import check, files  # noqa: E402

from catalog.store import Catalog  # noqa: E402

_PER_CATALOG = 250


def main(number: int = 10_000) -> None:
    """Run so many files and print the counts by form."""
    taken: Counter[str] = Counter()
    refused: Counter[str] = Counter()
    began = time.perf_counter()
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)

        # A new catalog now and then keeps each load short.
        while (done := taken.total() + refused.total()) < number:
            with Catalog.open(folder / f"{done}.sqlite", create=True) as catalog:
                some = min(_PER_CATALOG, number - done)
                quiet = settings(
                    max_examples=some, deadline=None, database=None, phases=[Phase.generate, Phase.shrink],
                    suppress_health_check=list(HealthCheck),
                )  # fmt: skip

                @quiet
                @given(files)
                def run(file: tuple[str, bytes]) -> None:
                    (taken if check(folder, catalog, *file) else refused)[Path(file[0]).suffix] += 1  # noqa: B023

                run()
    total = taken.total() + refused.total()
    print(
        f"{total:,} files in {time.perf_counter() - began:.0f} s: {taken.total():,} taken, {refused.total():,} refused in one line"
    )
    for form in sorted({*taken, *refused}):
        print(f"  {form}: {taken[form]:,} taken, {refused[form]:,} refused")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:2]))
