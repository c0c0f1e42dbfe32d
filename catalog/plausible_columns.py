"""What a plausibility rule is, and the columns of values that it works on."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from operator import attrgetter
from typing import TYPE_CHECKING, Any, Literal

from catalog.records import Inverter, Module

if TYPE_CHECKING:
    import numpy as np

Severity = Literal["impossible", "odd"]
Record = Module | Inverter


class Columns:
    """The values of several records of one type by field name, as float arrays; what is not stated is NaN."""

    def __init__(self, records: Sequence[Record]) -> None:
        self.records = records

    def __getattr__(self, name: str) -> np.ndarray:
        """Column of one field or property, shape (records,); built when first asked for."""
        column = self.each(attrgetter(name))
        self.__dict__[name] = column
        return column

    def each(self, function: Callable[[Any], float | None]) -> np.ndarray:
        """Column of what a function says of each record."""
        import numpy as np

        return np.array(list(map(function, self.records)), dtype=float)

    def some_missing(self, names: Sequence[str]) -> np.ndarray:
        """Whether a row has some of the named values, but not all of them."""
        values = attrgetter(*names)
        missing = self.each(lambda record: values(record).count(None))
        return (missing > 0) & (missing < len(names))


@dataclass(frozen=True, slots=True)
class Rule:
    """How values go together.

    ``broken`` marks the rows that break the rule; a comparison with a value that is not stated is false, so
    an unknown value breaks none, and neither does one that is impossible by itself. ``message`` is asked for
    the marked rows only.
    """

    field: str
    severity: Severity
    broken: Callable[[Columns], np.ndarray]
    message: Callable[[Any], str]
