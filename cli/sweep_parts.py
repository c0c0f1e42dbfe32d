"""A sweep in parts: made by several processes, kept beside the output, so that it goes on where it was broken off."""

from __future__ import annotations

import hashlib
import json
import os
import shutil
from collections.abc import Iterator, Sequence
from concurrent.futures import as_completed
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

from filelock import FileLock, Timeout

from catalog.errors import CatalogError
from catalog.records import Inverter, Module
from cli.processes import processes
from cli.sweep_files import write_part
from matcher.sweep import Takers, bests

if TYPE_CHECKING:
    from matcher.moduleyear import PlaneYear
    from matcher.request import Request

SCHEMA = "ferrule.sweep-parts/1"

#: Goes into the key of kept parts; to be raised when what they hold changes.
_EDITION = 1

#: Pairs in a part; one of an inverter with several trackers counts as many.
_PAIRS = 200_000
_SEVERAL_TRACKERS = 50


@dataclass(frozen=True)
class Task:
    """Everything that decides the result, but for the modules."""

    inverters: tuple[Inverter, ...]
    request: Request
    plane: PlaneYear | None
    hourly: PlaneYear | None
    dc_loss_pct: float
    form: str

    @cached_property
    def takers(self) -> Takers:
        """The inverters as arrays, twins once."""
        return Takers.of_records(self.inverters)

    def make(self, modules: Sequence[Module], folder: Path, number: int) -> Path:
        """Make one part; its file carries its number and how many pairs of it go together."""
        found = bests(modules, self.takers, self.request, self.plane, self.dc_loss_pct, self.hourly)
        path = folder / f"{number:05d}-{int((found.rows >= 0).sum())}{self.form}"
        write_part(self.form, path, found, modules, self.inverters)
        return path


class Parts:
    """The parts of one sweep in a folder of their own, with a manifest that says what they are parts of."""

    def __init__(self, task: Task, modules: Sequence[Module], out: Path) -> None:
        self.task = task
        self.folder = out.with_name(f"{out.name}.parts")
        several = int((~task.takers.distinct.single)[task.takers.of].sum())
        size = max(1, min(512, _PAIRS // (len(task.inverters) + _SEVERAL_TRACKERS * several)))
        self.modules = [modules[k : k + size] for k in range(0, len(modules), size)]
        self._key = _key_of(task, modules, size)
        self._lock = FileLock(self.folder / ".lock", timeout=0)

    def open(self) -> bool:
        """Make the folder or take it up; whether parts of another sweep had to be thrown away.

        Raises
        ------
        CatalogError
            Where that cannot be done, the folder holds something else, or another sweep is at work there.
        """
        manifest = self.folder / "manifest.json"
        afresh = False
        try:
            found = [path.name for path in self.folder.iterdir()] if self.folder.exists() else []
            if set(found) - {".lock"} and "manifest.json" not in found:
                raise self._something_else()
            self.folder.mkdir(exist_ok=True)
            self._lock.acquire()
            if manifest.exists():
                kept = _manifest(manifest)
                if kept.get("schema") != SCHEMA:
                    raise self._something_else()
                afresh = kept.get("key") != self._key
                if afresh:
                    manifest.unlink()
                    for left in self.made().values():
                        left.unlink()
            for left in self.folder.glob(".*.tmp"):
                left.unlink(missing_ok=True)
            if not manifest.exists():
                draft = self.folder / ".manifest.tmp"
                draft.write_text(json.dumps({"schema": SCHEMA, "key": self._key, "parts": len(self.modules)}))
                os.replace(draft, manifest)
        except Timeout:
            raise CatalogError(f"{self.folder}: another sweep is at work on the same file: wait for it") from None
        except OSError as error:
            raise CatalogError(f"{self.folder}: {error.strerror}; choose another place with --out") from None
        return afresh

    def _something_else(self) -> CatalogError:
        return CatalogError(f"{self.folder} holds something else: move it, or choose another --out")

    def made(self) -> dict[int, Path]:
        """File of each part that is there, by its number."""
        return {int(path.name[:5]): path for path in self.folder.glob(f"*-*{self.task.form}")}

    def make(self, jobs: int) -> Iterator[int]:
        """Make the parts that are not there, on several processes; gives the number of each that is finished."""
        made = self.made()
        todo = [number for number in range(len(self.modules)) if number not in made]
        jobs = min(jobs, len(todo))
        if jobs <= 1:
            for number in todo:
                self.task.make(self.modules[number], self.folder, number)
                yield number
            return
        with processes(jobs, _begin, self.task) as pool:
            futures = {pool.submit(_make, self.modules[k], self.folder, k): k for k in todo}
            for future in as_completed(futures):
                future.result()
                yield futures.pop(future)

    def clear(self) -> None:
        """Remove the folder."""
        self._lock.release()
        shutil.rmtree(self.folder)


def rows_of(path: Path) -> int:
    """Number of pairs that a part's file holds."""
    return int(path.stem[6:])


def _key_of(task: Task, modules: Sequence[Module], size: int) -> str:
    digest = hashlib.sha256(repr((_EDITION, task.form, task.dc_loss_pct, size, _versions(task.form))).encode())
    digest.update(repr(task.request).encode())
    for plane in (task.plane, task.hourly):
        for values in () if plane is None else (plane.irradiance, plane.cell_c, plane.hours):
            digest.update(values.tobytes())
        digest.update(b"|")
    for record in (*modules, *task.inverters):
        digest.update(repr(record).encode())
    return digest.hexdigest()


def _versions(form: str) -> tuple[str, ...]:
    """Versions of the packages that numbers and bytes come from."""
    from importlib.metadata import version

    return tuple(version(name) for name in ("numpy", *(["pyarrow"] if form == ".parquet" else [])))


def _manifest(path: Path) -> dict:
    try:
        kept = json.loads(path.read_text(encoding="utf-8"))
    except ValueError:
        return {}
    return kept if isinstance(kept, dict) else {}


# In the processes of the pool

_task: Task | None = None


def _begin(task: Task) -> None:
    global _task
    _task = task


def _make(modules: Sequence[Module], folder: Path, number: int) -> Path:
    assert _task is not None
    return _task.make(modules, folder, number)
