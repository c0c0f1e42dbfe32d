"""Fifty kills of a load, and four writers and eight readers for a minute: nothing may be lost or torn.

python benchmarks/store_trust.py [--kills 50] [--seconds 60] [--writers 4] [--readers 8]
"""

from __future__ import annotations

import argparse
import sys
import tempfile
import time
from pathlib import Path

sys.path[:0] = [str(Path(__file__).parents[1]), str(Path(__file__).parents[1] / "tests")]

from store_workers import crowd, kill_loads  # noqa: E402


def main() -> None:
    """Run both and print what happened; a loss ends in an AssertionError."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--kills", type=int, default=50)
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--writers", type=int, default=4)
    parser.add_argument("--readers", type=int, default=8)
    parser.add_argument("--seed", type=int, default=int(time.time()), help="of the moments of the kills")
    asked = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        seen = kill_loads(Path(folder) / "killed.sqlite", asked.kills, count=10_000, seed=asked.seed)
        print(
            f"{asked.kills} kills (seed {asked.seed}): {seen['before']} as before, {seen['after']} as after"
        )
        done = crowd(
            str(Path(folder) / "crowd.sqlite"), Path(folder), asked.writers, asked.readers, asked.seconds
        )
        print(
            f"{asked.writers} writers, {asked.readers} readers and a loader for {asked.seconds:g} s:"
            f" {done.written} changes written, {done.refused} refused as somebody was first,"
            f" {done.loads} loads, {done.read} reads, {len(done.errors)} errors"
        )
        for error in done.errors:
            print(error)
    sys.exit(bool(done.errors))


if __name__ == "__main__":
    main()
