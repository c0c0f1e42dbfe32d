"""Times of this process and of others, the best of several runs; memory; lines of the report."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

ROOT = Path(__file__).resolve().parents[1]


@dataclass(frozen=True, slots=True)
class Cost:
    """Processor time (user and system) and time on the clock [s], highest memory [MB]."""

    cpu_s: float
    wall_s: float
    peak_mb: float = 0.0


def best_of(runs: int, work: Callable[[], Any]) -> tuple[Cost, Any]:
    """The run that took the least processor time, and what the work gave."""
    best, found = Cost(float("inf"), float("inf")), None
    for _ in range(runs):
        cpu, wall = time.process_time(), time.perf_counter()
        found = work()
        cost = Cost(time.process_time() - cpu, time.perf_counter() - wall)
        best = min(best, cost, key=lambda c: c.cpu_s)
    return best, found


def process(arguments: Sequence[str], runs: int = 3, before: Callable[[], Any] | None = None) -> Cost:
    """Cost of a Python process with its children, the best of several runs; it must end with status 0."""
    best = Cost(float("inf"), float("inf"))
    for _ in range(runs):
        if before is not None:
            before()
        wall = time.perf_counter()
        child = subprocess.Popen([sys.executable, *arguments], cwd=ROOT, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)
        assert child.stderr is not None
        said = child.stderr.read()
        _, status, used = os.wait4(child.pid, 0)
        child.returncode = os.waitstatus_to_exitcode(status)
        if child.returncode:
            raise SystemExit(f"{' '.join(arguments)} ended with status {child.returncode}: {said.decode()}")
        cost = Cost(used.ru_utime + used.ru_stime, time.perf_counter() - wall, used.ru_maxrss / 1000)
        best = min(best, cost, key=lambda c: c.cpu_s)
    return best


def heading(text: str) -> None:
    """Print a heading."""
    print(f"\n{text}\n{'-' * len(text)}", flush=True)


def row(what: str, *values: str) -> None:
    """Print one line of figures."""
    print(f"  {what:<58}" + "".join(f"{v:>14}" for v in values), flush=True)
