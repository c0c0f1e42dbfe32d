"""Whole processes beside the bare import of the libraries that they stand on."""

from __future__ import annotations

import tempfile
from pathlib import Path

from benchmarks.cases import MODULE
from benchmarks.measuring import Cost, heading, process, row

_WHERE = ("--low", "-12", "--high", "38", "--lat", "36.1", "--lon", "-79.9")


def run() -> None:
    """Time the commands; each line names what is asked of it as a multiple of the bare import."""
    heading("Whole processes, best of 3: start, work, end")
    row("", "cpu s", "wall s", "x import", "peak MB")
    bare = process(["-c", "import pvlib, pandas, sqlmodel"])
    _tell("python -c 'import pvlib, pandas, sqlmodel'", bare, bare)
    _tell("ferrule --help", process(["-m", "cli", "--help"]), bare)
    with tempfile.TemporaryDirectory() as folder:
        catalog = Path(folder) / "catalog.sqlite"
        load = ["-m", "cli", "sheet", "load", "cec", "--catalog", str(catalog)]
        _tell("ferrule sheet load cec (new catalog; below 8)", process(load, 3, lambda: catalog.unlink(missing_ok=True)), bare)
        fit = ["-m", "cli", "fit", "--module", MODULE, *_WHERE, "--catalog", str(catalog)]
        first = min((process([*fit, "--tilt", tilt], 1) for tilt in ("31", "32", "33")), key=lambda c: c.cpu_s)
        _tell("ferrule fit --module, all inverters, a new place (below 3)", first, bare)
        _tell("the same, a place that was asked for before", process([*fit, "--tilt", "33"]), bare)
        out = [*fit, "--every", "--out", str(Path(folder) / "every.csv")]
        _tell("ferrule fit --module --every --out every.csv", process(out, 1), bare)
        other = ["-m", "cli", "fit", "--inverter", "SMA America SB5000US [240V]", *_WHERE, "--catalog", str(catalog)]
        _tell("ferrule fit --inverter, all modules", process(other), bare)


def _tell(what: str, cost: Cost, bare: Cost) -> None:
    row(what, f"{cost.cpu_s:.2f}", f"{cost.wall_s:.2f}", f"{cost.cpu_s / bare.cpu_s:.2f}", f"{cost.peak_mb:.0f}")
