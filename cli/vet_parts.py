"""Many bundles vetted in parts, on several processes where there are enough of them."""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from typing import TypeAlias

from catalog.records import Inverter, Site
from cli.processes import processes
from cli.years import DC_LOSS_PCT
from matcher.errors import MatcherError
from matcher.moduleyear import PlaneYear
from matcher.rules import RuleSet
from matcher.vet import Bundle, Vetted, Vetter, key_of

#: Bundles in a part: what their modules need is worked out together.
SIZE = 128

#: Bundles from which on several processes save more than it takes to start them.
LONG = 1_500

#: A bundle and where it is to stand; ``None`` solves for the climate.
Question: TypeAlias = tuple[Bundle, Site | None]


@dataclass(frozen=True)
class Task:
    """What all bundles of a list share.

    ``condensed`` and ``hourly`` are the years of the sites' arrays: those that energy and clipping come from, and
    those that a rule set may take the cold voltage from.
    """

    inverters: tuple[Inverter, ...]
    rules: RuleSet
    combiner: bool
    available: tuple[bool, ...] | None
    like: Site
    condensed: dict[Site, PlaneYear] = field(default_factory=dict)
    hourly: dict[Site, PlaneYear] = field(default_factory=dict)

    def vetter(self) -> Vetter:
        """What vets the parts, one after the other."""
        return Vetter(self.inverters, self.rules, self.combiner, self.available)

    def vet(self, vetter: Vetter, part: Sequence[Question]) -> list[Vetted | str]:
        """What came out for each bundle of a part, or the reason why it was not judged."""
        vetter.forget()
        for site in dict.fromkeys(site for _, site in part):
            modules = list({key_of(b.module): b.module for b, s in part if s == site}.values())
            if site is not None:
                vetter.prepare(
                    modules, site, condensed=self.condensed.get(site), plane=self.hourly.get(site), dc_loss_pct=DC_LOSS_PCT
                )
            if self.rules.cold_voltage != "hourly":
                vetter.prepare_climates(modules, self.like if site is None else site)
        found: list[Vetted | str] = []
        for bundle, site in part:
            try:
                found.append(vetter.vet(bundle, site, like=self.like))
            except MatcherError as error:
                found.append(str(error))
        return found


def vet_all(task: Task, questions: Sequence[Question], jobs: int | None = None) -> Iterator[tuple[int, Vetted | str]]:
    """Vet all bundles; gives the number of each and what came out, part by part."""
    # Bundles of the same module share what is worked out for it.
    first = {}
    for k, (bundle, _) in enumerate(questions):
        first.setdefault(key_of(bundle.module), k)
    order = sorted(range(len(questions)), key=lambda k: first[key_of(questions[k][0].module)])
    parts = [order[k : k + SIZE] for k in range(0, len(order), SIZE)]
    jobs = (os.cpu_count() or 1) if jobs is None else jobs
    if jobs < 2 or len(questions) < LONG:
        vetter = task.vetter()
        for part in parts:
            yield from zip(part, task.vet(vetter, [questions[k] for k in part]), strict=True)
        return
    with processes(min(jobs, len(parts)), _begin, task) as pool:
        futures = [pool.submit(_vet, [questions[k] for k in part]) for part in parts]
        for part, future in zip(parts, futures, strict=True):
            for k, found in zip(part, future.result(), strict=True):
                yield k, found if isinstance(found, str) else replace(found, inverters=task.inverters)


# In the processes of the pool

_held: tuple[Task, Vetter] | None = None


def _begin(task: Task) -> None:
    global _held
    _held = task, task.vetter()


def _vet(part: Sequence[Question]) -> list[Vetted | str]:
    assert _held is not None
    task, vetter = _held
    # The inverters are known on the other side.
    return [v if isinstance(v, str) else replace(v, inverters=()) for v in task.vet(vetter, part)]
