"""Measure names: suppliers' texts over the public CEC tables resolved; time of look-up and search.

Run from the root of the project: ``python benchmarks/names.py [--count 1000] [--seed 1] [--show 20]``.
"""

from __future__ import annotations

import argparse
import random
import statistics
import sys
import time
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
sys.path[:0] = [str(ROOT), str(ROOT / "tests")]

from name_distortions import distorted  # noqa: E402

from catalog.cec import read_cec_inverters, read_cec_modules  # noqa: E402
from catalog.names import Named, NameIndex, find, look_up, resolve  # noqa: E402


def main() -> None:
    options = argparse.ArgumentParser(description=__doc__)
    options.add_argument("--count", type=int, default=1000)
    options.add_argument("--seed", type=int, default=1)
    options.add_argument("--show", type=int, default=0, help="print this many texts that were not resolved")
    asked = options.parse_args()
    modules = [("module", m, m.pmax_w) for m in read_cec_modules()]
    inverters = [("inverter", i, i.ac_power_w) for i in read_cec_inverters()]
    rng = random.Random(asked.seed)
    for records in (modules, inverters, modules + inverters):
        names = [Named(n, record.maker, record.model) for n, (_, record, _) in enumerate(records)]
        for left_out in (False, True):
            _resolve(names, records, asked.count // (4 if left_out else 1), asked.show, rng, left_out)
    _command_line(names, rng)


def _resolve(names, records, count, show, rng, left_out) -> None:
    """Resolve distorted names; with ``left_out``, against a catalog that lacks exactly those records."""
    chosen = rng.sample(range(len(names)), count)
    lacking = set(chosen) if left_out else set()
    begin = time.perf_counter()
    index = NameIndex([n for n in names if n.id not in lacking])
    _ = index.text_index
    built = time.perf_counter() - begin
    times, sure, wrong, first_five, none = [], 0, [], 0, 0
    not_sure, missed = [], []
    for row in chosen:
        kind, record, power = records[row]
        text = distorted(record.maker, record.model, kind, power, rng)
        begin = time.perf_counter()
        found = resolve(text, index)
        times.append(time.perf_counter() - begin)
        ids = [c.id for c in found.candidates]
        none += found.confidence == "none"
        if found.confidence == "sure":
            sure += 1
            if ids[0] != row:
                wrong.append((text, names[row].name, names[ids[0]].name))
        else:
            not_sure.append((text, names[row].name, [names[i].name for i in ids[:3]]))
        if row in ids[:5]:
            first_five += 1
        else:
            missed.append((text, names[row].name, [names[i].name for i in ids[:3]]))
    print(f"\n{count} texts, {len(index)} names, records {'left out' if left_out else 'in the catalog'}")
    print(f"  index for free text built in {built:.2f} s")
    print(f"  sure given {100 * sure / count:.1f} %, of these wrong {len(wrong)}; none {none}")
    if not left_out:
        print(f"  right record among the first five {100 * first_five / count:.1f} %")
    print(
        f"  median {1000 * statistics.median(times):.1f} ms,"
        f" 95 % under {1000 * sorted(times)[int(0.95 * count)]:.1f} ms"
    )
    for title, cases in (("WRONG", wrong), ("missed", missed[:show]), ("not sure", not_sure[:show])):
        for case in cases:
            print(f"  {title}: {case}")


def _command_line(names, rng) -> None:
    """Look-up and search as a command does them: on an index of its own."""
    some = rng.sample(names, 40)
    for title, ask in (
        ("look_up, full name", lambda n, index: look_up(n.name, index)),
        ("look_up, model", lambda n, index: look_up(n.model.lower().replace("-", " "), index)),
        ("look_up, slip", lambda n, index: look_up(n.maker[:2] + n.maker[3:] + " " + n.model, index)),
        ("find, half a name", lambda n, index: find(n.name[: len(n.name) // 2], index, 20)),
    ):
        times = []
        for n in some:
            begin = time.perf_counter()
            ask(n, NameIndex(names))
            times.append(time.perf_counter() - begin)
        print(
            f"{title}, index included: median {1000 * statistics.median(times):.0f} ms,"
            f" worst {1000 * max(times):.0f} ms"
        )


if __name__ == "__main__":
    main()
