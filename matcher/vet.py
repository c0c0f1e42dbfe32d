"""Whether a bundle is sound: N modules of one type and K inverters of one type, sold as one article.

A bundle is unsound only where no arrangement of exactly its modules on exactly its inverters passes the stop
checks. Its DC/AC ratio is remarked on and never a reason. Without a site the climate is solved for.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from catalog.records import Inverter, Module, Site
from matcher.anyclimate import MILD_C, AnyClimate, Window, cool
from matcher.bench import Bench, with_diode
from matcher.checks import Check, Verdict, verdict
from matcher.columns import InverterColumns
from matcher.electrical import design_points
from matcher.errors import MatcherError
from matcher.fit import Option, module_points
from matcher.mends import Mend, Neighbours, mends
from matcher.moduleyear import ModuleYear, PlaneYear
from matcher.near import Rejection, checks_of, count_stopped, no_length, no_string, stopped_by, strings_stopped
from matcher.options import Unit
from matcher.reach import any_hosting
from matcher.rules import DEFAULT_RULES, RuleSet
from matcher.wiring import Load, place

#: DC/AC ratios that are common (the default window of a search); outside them a bundle gets a remark.
COMMON_RATIO = (0.8, 1.5)

NO_VERDICT = "no-verdict"

#: A site of no place: only what a site says besides temperatures counts.
ANYWHERE = Site(name="any climate", design_low_c=MILD_C, design_high_c=MILD_C)


@dataclass(frozen=True, slots=True)
class Bundle:
    """N modules on K inverters, perhaps with their wiring.

    ``inverter`` is the place of the inverter in the list that is vetted with. ``strings`` are (modules in series,
    strings) pairs of all units together, spread over the trackers as goes best; ``loads`` are (strings, modules in
    series) of each tracker of one unit, of which all units are alike.
    """

    module: Module
    inverter: int
    modules: int
    units: int = 1
    strings: tuple[tuple[int, int], ...] | None = None
    loads: tuple[Load, ...] | None = None

    def __post_init__(self) -> None:
        if self.modules < 1 or self.units < 1:
            raise MatcherError(f"{self.modules} modules on {self.units} inverters are no bundle: both must be above 0")
        wired = None
        if self.strings is not None:
            wired = sum(length * count for length, count in self.strings)
        elif self.loads is not None:
            wired = self.units * sum(count * length for count, length in self.loads)
        if wired is not None and wired != self.modules:
            raise MatcherError(f"the strings have {wired} modules, the bundle has {self.modules}: make them agree")


@dataclass(frozen=True, slots=True)
class Vetted:
    """What came out for one bundle.

    ``verdict`` is that of the engine, or ``no-verdict`` where the module cannot be matched. ``option`` is the best
    arrangement (or the given one) where there is a sound one; otherwise ``failed`` names the checks that stop the
    nearest one, whose ``checks`` and ``wired`` are given where it can be told. ``window`` is the climate window of
    the option, or, for an unsound bundle, of the arrangement that bears most; ``None`` where no climate is left.
    ``site`` is what was judged at. ``inverters`` are those that the bundle and the mends point into.
    """

    bundle: Bundle
    verdict: str
    site: Site
    solved: bool
    option: Option | None = None
    reason: str = ""
    failed: tuple[str, ...] = ()
    checks: tuple[Check, ...] = ()
    wired: tuple[Unit, ...] = ()
    window: Window | None = None
    mends: tuple[Mend, ...] = ()
    remarks: tuple[str, ...] = ()
    inverters: tuple[Inverter, ...] = ()

    @property
    def inverter(self) -> Inverter:
        """The inverter of the bundle."""
        return self.inverters[self.bundle.inverter]

    @property
    def sound(self) -> bool:
        """Whether it fits, or would once a value is confirmed."""
        return self.option is not None


class Vetter:
    """Vets many bundles on one list of inverters; what they share is worked out once.

    Parameters
    ----------
    inverters
        Those of the bundles, and those that may take their place.
    available
        Whether each may take another's place; all may, where none is given.
    """

    def __init__(
        self, inverters: Sequence[Inverter], rules: RuleSet = DEFAULT_RULES, combiner: bool = False,
        available: Sequence[bool] | None = None,
    ) -> None:  # fmt: skip
        self.inverters = tuple(inverters)
        self._columns = InverterColumns.of(inverters)
        self._rules, self._combiner = rules, combiner
        self._neighbours = Neighbours(self._columns, available)
        self._benches: dict[tuple[object, Site], Bench] = {}
        self._climates: dict[tuple[object, Site], AnyClimate] = {}
        self._modules: dict[object, Module] = {}

    def prepare(
        self, modules: Sequence[Module], site: Site, *, condensed: PlaneYear | None = None, plane: PlaneYear | None = None,
        dc_loss_pct: float = 0.0,
    ) -> None:  # fmt: skip
        """Work out what many modules of a list need at a site, all at once.

        Parameters
        ----------
        condensed
            Condensed year of the site's array, for energy and clipping.
        plane
            As for `vet`.
        dc_loss_pct
            Losses from the modules to the inverter, for energy and clipping [% of power].
        """
        from matcher.sweep import years_of

        points = design_points(modules, site, self._rules, plane)
        years = None if condensed is None else years_of(modules, condensed, dc_loss_pct)
        for k, module in enumerate(modules):
            year = None
            if years is not None and not np.isnan(years.power_w[k]).all():
                year = ModuleYear(years.power_w[k], years.vmp_v[k], years.hours)
            self._benches[key_of(module), site] = Bench.of(
                self._known(module), self._columns, site, self._rules, self._combiner, year, points=points.take(k)
            )

    def prepare_climates(self, modules: Sequence[Module], site: Site) -> None:
        """As `prepare`, for solving for the climate at a place like this one."""
        mild = mild_of(site)
        self.prepare(modules, mild)
        points = design_points(modules, cool(mild), self._rules)
        for k, module in enumerate(modules):
            if points.reasons[k] is None:
                bench = self._benches[key_of(module), mild]
                self._climates[key_of(module), mild] = AnyClimate(bench, module_points(points, k))

    def forget(self) -> None:
        """Let go of what was worked out for the modules so far."""
        for kept in (self._benches, self._climates, self._modules):
            kept.clear()

    def vet(
        self, bundle: Bundle, site: Site | None, *, year: ModuleYear | None = None, plane: PlaneYear | None = None,
        mending: bool = True, like: Site = ANYWHERE,
    ) -> Vetted:  # fmt: skip
        """Judge one bundle.

        Parameters
        ----------
        site
            Where it is to stand; ``None`` solves for the climate.
        year
            Condensed year of the module at the site, for energy and clipping.
        plane
            The year on the site's array, for rule sets that take the cold voltage from hourly weather.
        mending
            Look for changes where it is not sound.
        like
            Mounting, cap and rear share of the place where no site is given.
        """
        if site is None:
            return self._anywhere(bundle, like, mending)
        bench = self._bench(bundle.module, site, year, plane)
        if bench.reason is not None:
            return _no_verdict(bundle, bench, site)
        outcome = self._judged(bundle, bench)
        if isinstance(outcome, Option):
            return _sound(bundle, outcome, bench, site, solved=False)
        window = self._elsewhere(bundle, site)
        return self._unsound(bundle, outcome, bench, site, window, mending, solved=False)

    def bench(self, module: Module, site: Site, plane: PlaneYear | None = None) -> Bench:
        """The module at a site on all inverters, also where it cannot be matched."""
        return self._bench(module, site, plane=plane)

    def _anywhere(self, bundle: Bundle, like: Site, mending: bool) -> Vetted:
        mild = mild_of(like)
        bench = self._bench(bundle.module, mild)
        if bench.reason is not None:
            return _no_verdict(bundle, bench, mild, solved=True)
        window = self._widest(bundle, bench)
        solved = window.site(mild) if window is not None else None
        if solved is None:
            outcome = self._judged(bundle, bench)
            assert isinstance(outcome, Rejection), "what holds on a mild day has a climate window"
            return self._unsound(bundle, outcome, bench, mild, None, mending, solved=True)
        at_edges = self._bench(bundle.module, solved)
        outcome = self._judged(bundle, at_edges)
        assert isinstance(outcome, Option), f"{bundle}: no arrangement at the edges of its own climate window"
        return _sound(bundle, outcome, at_edges, solved, solved=True)

    def _elsewhere(self, bundle: Bundle, site: Site) -> Window | None:
        """The climate in which an unsound bundle would be sound; an unknown one where hours of weather decide."""
        if self._rules.cold_voltage == "hourly":
            return Window(None, None, hot_open=True, by_hours=True)
        bench = self._bench(bundle.module, mild_of(site))
        return None if bench.reason is not None else self._widest(bundle, bench)

    def _widest(self, bundle: Bundle, mild: Bench) -> Window | None:
        """Climate window of the wiring that bears most; ``None`` where none holds anywhere."""
        climate = self._climate(bundle.module, mild)
        i = bundle.inverter
        if bundle.strings is None and bundle.loads is None:
            lengths = climate.widest(i, bundle.modules, bundle.units)
            return None if lengths is None else climate.of_lengths(i, *lengths)
        given = [n for n, _ in bundle.strings or ()] + [n for _, n in bundle.loads or ()]
        window = climate.of_lengths(i, min(given), max(given))
        site = window.site(mild.fit.request.site)
        if site is None or isinstance(self._judged(bundle, self._bench(bundle.module, site)), Rejection):
            return None
        return window

    def _judged(self, bundle: Bundle, bench: Bench) -> Option | Rejection:
        """The best arrangement or the given one, or what stops it."""
        i = bundle.inverter
        if bundle.loads is not None:
            pair = bench.pair(i)
            return _given(bench, i, (Unit(bundle.units, place(pair, bundle.loads)),))
        space = bench.space(i)
        pair = bench.pair(i)
        if bundle.strings is not None:
            stopped = strings_stopped(pair, space, bundle.strings, (bundle.units, bundle.units))
            if stopped is not None:
                return stopped
            whole = replace(space, fewest=1, most=min(space.most, bundle.modules))
            wired = any_hosting(whole, self.inverters[i], bundle.strings, bundle.units)
            assert wired is not None
            return _given(bench, i, wired)
        option = bench.best(i, bundle.modules, bundle.units)
        if option is not None:
            return option
        if space.shortest > space.longest:
            return no_length(pair, space, bench.fit.window(0))
        if all(g.max_strings < 1 for g in space.groups):
            return no_string(pair)
        return count_stopped(pair, space, bundle.modules, bundle.units)

    def _unsound(
        self, bundle: Bundle, outcome: Rejection, bench: Bench, site: Site, window: Window | None, mending: bool,
        solved: bool,
    ) -> Vetted:  # fmt: skip
        changes: list[Mend] = []
        if mending:
            given = bundle.strings is not None or bundle.loads is not None
            changes = mends(
                bench, bundle.inverter, bundle.modules, bundle.units, self._neighbours.of(bundle.inverter), strings=given
            )
        return Vetted(
            bundle, str(Verdict.DOES_NOT_FIT), site, solved, None, outcome.nearest, outcome.failed, outcome.checks,
            outcome.wired, window, tuple(changes), (), self.inverters,
        )  # fmt: skip

    def _known(self, module: Module) -> Module:
        """The module with its model, fitted once."""
        key = key_of(module)
        if key not in self._modules:
            self._modules[key] = with_diode(module)
        return self._modules[key]

    def _bench(
        self, module: Module, site: Site, year: ModuleYear | None = None, plane: PlaneYear | None = None
    ) -> Bench:
        key = (key_of(module), site)
        special = year is not None or plane is not None
        if special or key not in self._benches:
            known = self._known(module)
            bench = Bench.of(known, self._columns, site, self._rules, self._combiner, year, plane)
            if special:
                return bench
            self._benches[key] = bench
        return self._benches[key]

    def _climate(self, module: Module, mild: Bench) -> AnyClimate:
        key = (key_of(module), mild.fit.request.site)
        if key not in self._climates:
            self._climates[key] = AnyClimate(mild)
        return self._climates[key]


def mild_of(site: Site) -> Site:
    """A mild day at a place like this one, from which its climates are solved for."""
    return replace(
        site, name=ANYWHERE.name, design_low_c=MILD_C, design_high_c=MILD_C, lat=None, lon=None, weather=None
    )


def key_of(module: Module) -> object:
    """What tells modules apart: the number of the record, or its name where it has none."""
    return module.id if module.id is not None else module.name


def _given(bench: Bench, i: int, wired: tuple[Unit, ...]) -> Option | Rejection:
    """A given arrangement as an option, or what stops it."""
    pair = bench.pair(i)
    checks = checks_of(pair, wired)
    outcome = verdict(checks)
    if outcome is Verdict.DOES_NOT_FIT:
        return stopped_by(pair, wired, checks)
    return bench.option_of(i, wired, outcome)


def _no_verdict(bundle: Bundle, bench: Bench, site: Site, solved: bool = False) -> Vetted:
    reason = f"{bundle.module.name} cannot be matched: {bench.reason}"
    return Vetted(bundle, NO_VERDICT, site, solved, reason=reason, inverters=bench.fit.inverters)


def _sound(bundle: Bundle, option: Option, bench: Bench, site: Site, solved: bool) -> Vetted:
    waiting = {c.field for c in option.confirm}
    window = Window(
        option.coldest_c, option.hottest_c, bool(waiting & {"max_dc_voltage_v", "max_system_voltage_v"}),
        "voc_coef_pct" in waiting, option.cold_by_hours,
    )  # fmt: skip
    return Vetted(
        bundle, str(option.verdict), site, solved, option, checks=option.checks, wired=option.wired, window=window,
        remarks=tuple(_remarks(option)), inverters=bench.fit.inverters,
    )  # fmt: skip


def _remarks(option: Option) -> list[str]:
    low, high = COMMON_RATIO
    found = []
    if not low <= round(option.dc_ac_ratio, 2) <= high:
        found.append(f"DC/AC {option.dc_ac_ratio:.2f} is unusual ({low:.2f} to {high:.2f} is common)")
    if option.clipping_loss_pct is not None and option.clipping_loss_pct > 2.0:
        found.append(f"{option.clipping_loss_pct:.1f} % of the yearly energy is clipped")
    found += [f"{c.check}: {c.remark}" for c in option.checks if c.verdict is Verdict.NOTE and c.remark]
    return found
