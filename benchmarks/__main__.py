"""All measurements, one after the other; one core unless said otherwise."""

from __future__ import annotations

import os

# Before numpy is imported: one core for both sides of every comparison.
for _name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[_name] = "1"

import argparse  # noqa: E402
import importlib  # noqa: E402
import platform  # noqa: E402
import time  # noqa: E402

_SECTIONS = ["processes", "against_pvlib", "growth", "sweep"]


def main() -> None:
    """Run the measurements that are asked for."""
    parser = argparse.ArgumentParser(prog="python -m benchmarks", description=__doc__)
    parser.add_argument("section", nargs="*", choices=[[], *_SECTIONS], help="all of them, if none is named")
    asked = parser.parse_args().section or _SECTIONS
    begun = time.perf_counter()
    print(f"Python {platform.python_version()}, {platform.machine()}, {os.cpu_count()} cores,"
          f" load {os.getloadavg()[0]:.1f}. Times are processor times, the best of several runs.")  # fmt: skip
    for name in asked:
        # One by one: while nothing heavy is imported here, the peak memory of a child is its own.
        importlib.import_module(f"benchmarks.{name}").run()
    print(f"\nTook {time.perf_counter() - begun:.0f} s.")


main()
