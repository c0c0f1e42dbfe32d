"""What is asked of a search besides the records."""

from __future__ import annotations

from dataclasses import dataclass

from catalog.records import Site
from matcher.choices import FACE
from matcher.errors import MatcherError
from matcher.order import Order
from matcher.rules import DEFAULT_RULES, RuleSet


@dataclass(frozen=True, slots=True)
class Request:
    """Site, rules and wishes of a search.

    Attributes
    ----------
    ratio
        Window of DC/AC ratios of the whole: a preference, no verdict.
    counts
        Lowest and highest number of modules, all units together.
    units
        Lowest and highest number of inverters of one type that share the modules. More than one asks for
        ``counts`` or ``strings``.
    strings
        An array given as strings, hosted exactly: (modules in series, number of such strings) pairs.
    faces
        Azimuth and tilt [deg] of each entry of ``strings``, where parts of the array face different ways.
    clip_cap_pct
        Clipping loss up to which a higher DC/AC ratio is better [%].
    combiner
        Strings are paralleled ahead of the inverter, which waives its string inputs.
    order
        What decides between options of the same verdict.
    every
        All arrangements, and not the best one of each record.
    """

    site: Site
    rules: RuleSet = DEFAULT_RULES
    ratio: tuple[float, float] = (0.8, 1.5)
    counts: tuple[int, int] | None = None
    units: tuple[int, int] = (1, 1)
    strings: tuple[tuple[int, int], ...] | None = None
    faces: tuple[tuple[float, float], ...] = ()
    clip_cap_pct: float = 2.0
    combiner: bool = False
    order: Order = Order.LEAST_INVERTER
    every: bool = False

    def __post_init__(self) -> None:
        low, high = self.ratio
        if not 0 < low <= high:
            raise MatcherError(f"the DC/AC ratio window {low:g}..{high:g} is upside down or not above 0")
        for what, bounds in (("module count", self.counts), ("number of units", self.units)):
            if bounds is not None and not 0 < bounds[0] <= bounds[1]:
                raise MatcherError(f"the {what} {bounds[0]}..{bounds[1]} is upside down or not above 0")
        if self.site.design_low_c > self.site.design_high_c:
            raise MatcherError(
                f"the design low {self.site.design_low_c:g} degC is above the design high"
                f" {self.site.design_high_c:g} degC"
            )
        if self.strings is not None and self.counts is not None:
            raise MatcherError("strings say how many modules there are: leave the module count away")

    @property
    def kinds(self) -> tuple[tuple[int, int], ...]:
        """Strings by length and face: (`matcher.arrangements.FACE` * face + modules in series, strings)."""
        if not self.faces:
            return self.strings or ()
        known = self.different_faces
        return tuple(
            ((known.index(face) + 1) * FACE + length, count)
            for (length, count), face in zip(self.strings or (), self.faces, strict=True)
        )

    @property
    def different_faces(self) -> tuple[tuple[float, float], ...]:
        """The faces, each once, in the order in which they are given."""
        return tuple(dict.fromkeys(self.faces))

    @property
    def several(self) -> bool:
        """Whether more than one unit may be used."""
        return self.units[1] > 1

    @property
    def modules_in_strings(self) -> int:
        """Modules of the array that is given as strings; 0 where none is."""
        return sum(length * count for length, count in self.strings or ())
