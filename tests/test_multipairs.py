"""The best option of pairs whose inverter has several trackers, against a search through all their arrangements."""

from __future__ import annotations

import random
from dataclasses import replace
from pathlib import Path

import numpy as np
import pvlib
import pytest

from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.records import Inputs, Inverter, Module, Site
from matcher.arrangements import Space, distinct_lengths
from matcher.choices import Group
from matcher.clipping import block_losses, pair_losses
from matcher.columns import InverterColumns, column
from matcher.electrical import design_points
from matcher.moduleyear import condense_plane, plane_year
from matcher.multipairs import MultiPairs
from matcher.options import join
from matcher.order import Order
from matcher.request import Request
from matcher.search import Search
from matcher.sweep import years_of
from matcher.weather import read_weather
from random_records import random_inverter

DATA = Path(pvlib.__file__).parent / "data"
SITE = Site(name="Weir", design_low_c=-15.0, design_high_c=38.0)


@pytest.fixture(scope="module")
def plane():
    return condense_plane(plane_year(read_weather(DATA / "723170TYA.CSV"), 30.0, 180.0))


@pytest.fixture(scope="module")
def modules() -> list[Module]:
    return read_cec_modules()[::180]


@pytest.fixture(scope="module")
def tables() -> list[Inverter]:
    return read_cec_inverters()[::16]


def several_trackers(rng: random.Random, module: Module, table: list[Inverter]) -> Inverter:
    """A random inverter with several trackers that suits the module, with an efficiency of the public table."""
    while True:
        inverter = random_inverter(rng, module, SITE)
        if len(inverter.inputs) > 1 or inverter.inputs[0].trackers > 1:
            break
    like = rng.choice(table)
    scale = inverter.ac_power_w / like.Paco
    powers = {name: getattr(like, name) * scale for name in ("Pso", "Paco", "Pdco", "Pnt")}
    bends = {"Vdco": like.Vdco, "C0": like.C0 / scale, "C1": like.C1, "C2": like.C2, "C3": like.C3}
    inputs = inverter.inputs
    if rng.random() < 0.4:
        amps = [rng.choice((None, module.imp_a * rng.uniform(0.8, 1.4) * rng.choice((1, 2, 3)))) for _ in inputs]
        inputs = tuple(replace(g, max_current_a=a) for g, a in zip(inputs, amps, strict=True))
    return replace(inverter, inputs=inputs, **powers, **bends)


@pytest.mark.parametrize("seed", range(4))
def test_best_of_a_pair_is_that_of_all_its_arrangements(plane, modules, tables, seed):
    rng = random.Random(seed)
    compared = clipped = 0
    for _ in range(40):
        module = rng.choice(modules)
        inverter = several_trackers(rng, module, tables)
        request = Request(
            SITE, combiner=rng.random() < 0.2, clip_cap_pct=rng.choice((2.0, 2.0, 0.5, 0.0)),
            ratio=rng.choice(((0.8, 1.5), (0.5, 1.3), (1.2, 3.0))),
            order=rng.choice((Order.LEAST_INVERTER,) * 4 + (Order.RATIO, Order.MARGIN)),
        )  # fmt: skip
        points = design_points([module], SITE, request.rules, None)
        year = years_of([module], plane, 2.0) if rng.random() < 0.9 else None
        search = Search((module,), InverterColumns.of([inverter]), request, points, year)
        space = search.space(0, 0)
        found, sizes = MultiPairs(search, np.array([0]), np.array([0])).bests()
        assert sizes == [space.total]
        # Every arrangement worked out and ranked.
        if not 0 < space.total <= 30_000:
            continue
        every = search.whole(0, 0, space)
        wanted = every.take(search.rank(every)[:1])
        compared += 1
        clipped += bool(every.clipping_pct.max() > request.clip_cap_pct)
        best = join(found)
        assert len(best) == 1 and best.wired(0) == wanted.wired(0) and best.to_confirm[0] == wanted.to_confirm[0]
        np.testing.assert_allclose(best.clipping_pct, wanted.clipping_pct, atol=1e-9)
        np.testing.assert_allclose(best.yearly_kwh, wanted.yearly_kwh, rtol=1e-12)
    assert compared >= 8 and clipped >= 2


def test_many_pairs_at_once_are_as_each_alone(plane, modules, tables):
    rng = random.Random(11)
    modules = rng.sample(modules, 12)
    inverters = [several_trackers(rng, rng.choice(modules), tables) for _ in range(6)]
    request = Request(SITE)
    points = design_points(modules, SITE, request.rules, None)
    search = Search(tuple(modules), InverterColumns.of(inverters), request, points, years_of(modules, plane, 2.0))
    m, i = np.repeat(np.arange(len(modules)), len(inverters)), np.tile(np.arange(len(inverters)), len(modules))
    together = join(MultiPairs(search, m, i).bests()[0])
    assert len(together) > 12
    for k in range(len(together)):
        pair = together.module[k : k + 1].astype(int), together.inverter[k : k + 1].astype(int)
        alone = join(MultiPairs(search, *pair).bests()[0])
        assert alone.wired(0) == together.wired(k)


def test_losses_of_pairs_are_those_of_blocks(plane, modules, tables):
    rng = random.Random(5)
    years = years_of(modules[:5], plane, 2.0)
    inverter = replace(tables[3], inputs=(Inputs(trackers=2, max_current_a=9.0), Inputs(trackers=1)))
    columns = InverterColumns.of([inverter])
    amps = column(inverter.inputs, "max_current_a")[[0, 0, 1]]
    for line in range(5):
        block = np.array([[[rng.randint(0, 2), rng.randint(6, 9)] for _ in range(3)] for _ in range(8)])
        block[:, 0, 0] = 1
        block[block[:, :, 0] == 0] = 0
        year = replace(years, power_w=years.power_w[line], vmp_v=years.vmp_v[line])
        wanted = block_losses(year, columns, 0, amps, block)
        found = pair_losses(
            years, columns, np.full(8, line), np.zeros(8, dtype=int), np.tile(amps, (8, 1)), block[:, :, 0], block[:, :, 1]
        )
        np.testing.assert_allclose(found.power_pct, wanted.power_pct, atol=1e-9)
        np.testing.assert_allclose(found.current_pct, wanted.current_pct, atol=1e-9)
        np.testing.assert_allclose(found.yearly_kwh, wanted.yearly_kwh, rtol=1e-12)


def test_foremost_is_the_first_of_all_of_its_count():
    space = Space((Group(2, 3, False), Group(1, 2, True)), shortest=5, longest=9, sure_from=5, sure_to=8, fewest=1, most=60)
    for to_confirm in (False, True):
        for modules in range(1, 60):
            if space.size(modules, to_confirm):
                first = next(space.classes(modules, to_confirm, eager=10**9))[0]
                assert space.foremost(modules, to_confirm).tolist() == first.tolist()


def test_least_mean_is_the_least_of_all_arrangements():
    rng = np.random.default_rng(2)
    space = Space((Group(2, 2, False), Group(1, 3, False)), shortest=5, longest=8, sure_from=5, sure_to=8, fewest=1, most=40)
    values = [rng.uniform(1, 3, (2, 4)), rng.uniform(1, 3, (3, 4))]
    group = [0, 0, 1]
    for modules in range(5, 40):
        accepted = np.arange(41) == modules
        costs = [
            sum(s * n * values[g][s - 1, n - 5] for g, (s, n) in zip(group, row, strict=True) if s) / modules
            for block in space.listing(accepted)
            for row in block.tolist()
        ]
        found = space.least_mean(modules, False, range(5, 9), values)
        assert found == pytest.approx(min(costs)) if costs else np.isinf(found)
    assert set(distinct_lengths(next(space.of_lengths(18, False, (5, 8))))) == {2}
