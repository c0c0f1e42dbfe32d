"""What tests of the store share: a refusal to open, and processes that use one catalog at once, or are killed."""

from __future__ import annotations

import json
import os
import random
import signal
import time
import traceback
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import pytest
from catalog_records import INVERTER, MODULE, REV_C, TABLE_2024, TWO_GROUPS

from catalog.errors import CatalogError
from catalog.records import Inverter, Module
from catalog.store import Catalog

AS_BEFORE, AS_AFTER = "before", "after"


def fork(work: Callable[[], object], answer: Path | None = None) -> int:
    """Run a function in a process of its own; return its id. What it returns or raises goes to a file."""
    child = os.fork()
    if child:
        return child
    try:
        said = {"answer": work()}
    except BaseException:
        said = {"error": traceback.format_exc()}
    try:
        if answer is not None:
            answer.write_text(json.dumps(said))
    finally:
        os._exit(0 if "answer" in said else 1)


def many_modules(count: int, **changes: object) -> list[Module]:
    """Modules that differ in their model."""
    return [replace(MODULE, model=f"AF6K-{n}", **changes) for n in range(count)]


# Kills


def kill_loads(path: Path, kills: int, count: int = 2000, seed: int = 1) -> dict[str, int]:
    """Kill a load at random moments, and look each time at what is left.

    Parameters
    ----------
    path : Path
        A file that does not exist.
    kills : int
        How often.
    count : int
        Records before; the load changes all of them and brings as many inverters again.

    Returns
    -------
    dict
        How often the catalog was as ``before`` and as ``after`` the load.

    Raises
    ------
    AssertionError
        If it was anything else, or damaged.
    """
    before = many_modules(count)
    after = many_modules(count, voc_v=38.5, source=TABLE_2024)
    inverters = [replace(INVERTER, model=f"QN-{n}") for n in range(count)]
    with Catalog.open(path, create=True) as catalog:
        catalog.load(before, [])
    blank = path.read_bytes()

    def load() -> None:
        with Catalog.open(path) as catalog:
            catalog.load(after, inverters)

    started = time.monotonic()
    _, status = os.waitpid(fork(load), 0)
    takes = time.monotonic() - started
    assert status == 0
    chance = random.Random(seed)
    seen = {AS_BEFORE: 0, AS_AFTER: 0}
    for kill in range(kills):
        path.write_bytes(blank)
        child = fork(load)
        if kill % 2:
            time.sleep(takes * chance.uniform(0.0, 1.1))
        else:
            # Half of them in the short while in which the file itself is written.
            _wait_for_writing(path, len(blank), until=time.monotonic() + 10 * takes)
            time.sleep(chance.uniform(0.0, 0.05))
        os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)
        seen[state_of(path, before, after, inverters)] += 1
    return seen


def _wait_for_writing(path: Path, size: int, until: float) -> None:
    """Wait until a file grows."""
    while os.path.getsize(path) == size and time.monotonic() < until:
        time.sleep(0.0005)


def state_of(
    path: Path, before: Sequence[Module], after: Sequence[Module], inverters: Sequence[Inverter]
) -> str:
    """Whether a catalog is as before or as after a load, all of it."""
    from catalog.backup import damage

    with Catalog.open(path, readonly=True) as catalog:
        modules, names = catalog.modules(), [n.model for n in catalog.names("inverter")]
    assert damage(path) is None
    volts = [m.voc_v for m in modules]
    if volts == [m.voc_v for m in before]:
        assert names == []
        return AS_BEFORE
    assert volts == [m.voc_v for m in after]
    assert names == [i.model for i in inverters]
    return AS_AFTER


# A crowd


@dataclass(frozen=True, slots=True)
class Crowd:
    """What many processes did to one catalog in some seconds."""

    written: int
    refused: int
    read: int
    loads: int
    errors: list[str]


def crowd(location: str, folder: Path, writers: int, readers: int, seconds: float) -> Crowd:
    """Let writers amend and load, and readers read, one catalog at once; then count what is left.

    Every writer adds one to a value that it has read, and gives another value the same number, so that a lost
    update shows in the sum and a torn read in a difference.

    Raises
    ------
    AssertionError
        If an update was lost.
    """
    with Catalog.open(location, create=True) as catalog:
        catalog.load(many_modules(300), [TWO_GROUPS])
        id_ = catalog.names("inverter")[0].id
        catalog.amend("inverter", id_, {"max_array_power_w": 1000.0, "night_w": 1000.0}, REV_C)
    until = time.time() + seconds
    work = [lambda: _write(location, id_, until) for _ in range(writers)]
    work += [lambda: _read(location, id_, until) for _ in range(readers)]
    work.append(lambda: _load(location, until))
    answers = [folder / f"{n}.json" for n in range(len(work))]
    for child in [fork(function, answer) for function, answer in zip(work, answers, strict=True)]:
        os.waitpid(child, 0)
    said = [json.loads(answer.read_text()) for answer in answers]
    errors = [s["error"] for s in said if "error" in s]
    done = [s.get("answer") or [0, 0] for s in said]
    written = sum(d[0] for d in done[:writers])
    with Catalog.open(location, readonly=True) as catalog:
        left = catalog.inverter(id_)
        changes = len(catalog.history("inverter", id_)) - 2
    assert left.max_array_power_w == left.night_w == 1000.0 + written
    assert changes == written
    return Crowd(
        written=written,
        refused=sum(d[1] for d in done[:writers]),
        read=sum(d[0] for d in done[writers:-1]),
        loads=done[-1][0],
        errors=errors,
    )


def _write(location: str, id_: int, until: float) -> tuple[int, int]:
    written = refused = 0
    while time.time() < until:
        with Catalog.open(location) as catalog:
            now = catalog.inverter(id_)
            more = now.night_w + 1
            try:
                catalog.amend(
                    "inverter",
                    id_,
                    {"max_array_power_w": more, "night_w": more},
                    REV_C,
                    note=f"process {os.getpid()}",
                    expected=now.revision,
                )
                written += 1
            except CatalogError as error:
                # Another one was first: that is no loss, it is said and the change is made anew.
                assert "changed by someone else meanwhile" in str(error), error
                refused += 1
    return written, refused


def _read(location: str, id_: int, until: float) -> tuple[int, int]:
    read = 0
    while time.time() < until:
        with Catalog.open(location, readonly=True) as catalog:
            now = catalog.inverter(id_)
            assert now.max_array_power_w == now.night_w
            assert now.inputs == TWO_GROUPS.inputs
            assert len({m.voc_v for m in catalog.modules()}) == 1
            read += 1
    return read, 0


def _load(location: str, until: float) -> tuple[int, int]:
    loads = 0
    while time.time() < until:
        with Catalog.open(location) as catalog:
            catalog.load(many_modules(300, voc_v=38.0 + loads % 5 / 10), [])
            loads += 1
            time.sleep(0.1)
    return loads, 0


def refusal(path: str | Path, **how: bool) -> str:
    """The line with which a catalog is not opened."""
    with pytest.raises(CatalogError) as refused, Catalog.open(path, **how):
        pass
    line = str(refused.value)
    assert "\n" not in line
    return line
