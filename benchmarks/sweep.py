"""The sweep of the whole public table, from a sample of its parts."""

from __future__ import annotations

import random
import resource
import tempfile
from pathlib import Path

from benchmarks.cases import DC_LOSS_PCT, SITE, inverters, modules, plane
from benchmarks.measuring import best_of, heading, row
from cli.sweep_files import assemble
from cli.sweep_parts import Parts, Task
from matcher.fit import Request
from matcher.moduleyear import condense_plane

_CORES = 2


def run() -> None:
    """Time parts of the sweep and project the whole; the parts are as long as those of the command."""
    heading(f"Sweep: best option of {len(modules()):,} modules x {len(inverters()):,} inverters")
    pairs = len(modules()) * len(inverters())
    with tempfile.TemporaryDirectory() as folder:
        for form in (".csv", ".parquet"):
            _project(Path(folder), form, pairs)


def _project(folder: Path, form: str, pairs: int) -> None:
    task = Task(tuple(inverters()), Request(SITE), condense_plane(plane()), None, DC_LOSS_PCT, form)
    parts = Parts(task, modules(), folder / f"pairs{form}")
    assert task.takers is not None
    row(f"parts as {form}", "pairs", "s", "us/pair", "peak MB")
    paths: list[Path] = []
    seconds, done = 0.0, 0
    # Parts from all over the table: makers differ in how many twins they have.
    # Drawn, not in their order: neighbours in the table are alike, and twins are worked out once a part.
    numbers = random.Random(1).sample(range(len(parts.modules)), 12)
    for count, number in enumerate(numbers, 1):
        cost, path = best_of(1, lambda number=number: task.make(parts.modules[number], folder, number))
        seconds += cost.cpu_s
        done += len(parts.modules[number]) * len(inverters())
        paths.append(path)
        if count in (3, 6, len(numbers)):
            peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1000
            row(f"  {count} of {len(parts.modules)}", f"{done:,}", f"{seconds:.2f}", f"{seconds / done * 1e6:.2f}", f"{peak:.0f}")
    joining, _ = best_of(1, lambda: assemble(form, paths, folder / f"pairs{form}"))
    size = (folder / f"pairs{form}").stat().st_size / done * pairs / 1e9
    whole = seconds / done * pairs / _CORES
    last = joining.cpu_s / done * pairs
    row(f"  whole table on {_CORES} cores, projected", f"{(whole + last) / 60:.1f} min", f"{size:.1f} GB")
    print(f"    of that {last / 60:.1f} min to put the parts together (one core)")
