"""Random records of any plausible content, for round trips."""

from __future__ import annotations

from dataclasses import replace

from hypothesis import strategies as st

from catalog.plausibility import findings
from catalog.records import Inputs, Inverter, Module, Origin, Source, specs

# Any printable text, with the marks that files give a meaning; blanks at the ends are no part of a name.
text = st.text(
    st.characters(exclude_categories=("C", "Z"), include_characters=' ,;|[]=\\"'), min_size=1, max_size=12
)
words = text.map(str.strip).filter(bool)
sources = st.builds(Source, words, st.one_of(st.just(""), words))


def _number(spec):
    high = spec.high if spec.high is not None else 10.0
    if spec.type is int:
        return st.integers(int(spec.low), int(high))
    return st.floats(spec.low if spec.low is not None else -10.0, high, allow_nan=False)


def inputs():
    """Groups of inputs, each value known or not."""
    number = {name: _number(spec) for name, spec in specs(Inputs).items()}
    optional = {name: st.one_of(st.none(), some) for name, some in number.items() if name != "trackers"}
    return st.builds(Inputs, trackers=number["trackers"], **optional)


def _values(draw, base, free):
    """Draw optional values, origins and sources for a sound record."""
    values = {}
    for name in free:
        values[name] = draw(st.one_of(st.none(), _number(specs(type(base))[name])))
    record = replace(base, maker=draw(words), model=draw(words), source=draw(sources), **values)
    known = [
        name
        for name in specs(type(base))
        if name not in ("maker", "model") and getattr(record, name) is not None
    ]
    marked = draw(
        st.dictionaries(
            st.sampled_from(known), st.sampled_from([o for o in Origin if o != Origin.STATED]), max_size=4
        )
    )
    others = draw(st.dictionaries(st.sampled_from(known), sources, max_size=3))
    return replace(record, origins=marked, sources=others)


@st.composite
def modules(draw):
    """Modules: the values at STC of one type, everything else free."""
    base = Module(
        maker="a", model="b", technology=draw(words), bifacial=draw(st.booleans()), pmax_w=400.0, voc_v=45.6,
        isc_a=11.2, vmp_v=37.9, imp_a=draw(st.floats(10.3, 10.8)),
    )  # fmt: skip
    free = (
        "cells_in_series",
        "bifaciality",
        "voc_coef_pct",
        "isc_coef_pct",
        "noct_c",
        "max_series_fuse_a",
        "R_s",
        "Adjust",
    )
    return _values(draw, base, free)


@st.composite
def inverters(draw):
    """Inverters: a voltage window of one type, everything else free."""
    base = Inverter(
        maker="a", model="b", ac_power_w=draw(st.floats(1000, 20000)), mppt_low_v=180.0, mppt_high_v=850.0,
        inputs=tuple(draw(st.lists(inputs(), min_size=1, max_size=3))),
    )  # fmt: skip
    free = ("ac_voltage_v", "phases", "weighted_efficiency_pct", "night_w", "C0", "C1", "Pnt")
    return _values(draw, base, free)


def possible(record) -> bool:
    """Whether nothing about a record is impossible, so that it may be in a file at all."""
    return all(f.severity == "odd" for f in findings(record))
