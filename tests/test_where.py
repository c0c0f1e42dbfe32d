"""Conditions on values: what they find, and that whatever is typed is a condition or one helpful line."""

from __future__ import annotations

import operator

import pytest
from catalog_records import INVERTERS, MODULES
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from catalog.errors import CatalogError
from catalog.records import Inverter, Module, specs
from catalog.store import Catalog
from catalog.where import condition, kinds_of


@pytest.fixture
def found(small_catalog):
    """Models of the records that meet a condition."""
    with Catalog.open(small_catalog, readonly=True) as catalog:

        def found_(text: str, kind: str = "inverter") -> list[str]:
            records = {r.id: r for r in (catalog.inverters() if kind == "inverter" else catalog.modules())}
            return sorted(records[id_].model for id_ in catalog.matching(kind, condition(text, kind)))

        yield found_


QN5, QN8 = "QN-5000 [240V]", "QN-8000 Duo"


@pytest.mark.parametrize(
    ("text", "models"),
    [
        ("ac_power_w >= 5000 and phases == 1", [QN5]),
        ("ac_power_w >= 5 kW", [QN5, QN8]),
        ("ac_power_w > 5kW", [QN8]),
        ("5000 < ac_power_w", [QN8]),
        ("5000 <= ac_power_w < 8000", [QN5]),
        ("phases = 1 or phases == 3", [QN5, QN8]),
        ("not phases == 1", [QN8]),
        ("phases != 1", [QN8]),
        # Nobody knows the maximum DC voltage of the one: it meets neither the condition nor its opposite.
        ("max_dc_voltage_v >= 500", [QN8]),
        ("not max_dc_voltage_v >= 500", []),
        ("max_dc_voltage_v == unknown", [QN5]),
        ("max_dc_voltage_v != unknown", [QN8]),
        ("trackers > 1", [QN8]),
        # Of the one, nobody says how many trackers there are.
        ("inputs == unknown", [QN5]),
        ("inputs != unknown and phases == 3", [QN8]),
        ("max_isc_a == unknown", [QN5]),
        ('maker == "quillon"', [QN5, QN8]),
        ('model ~ "duo"', [QN8]),
        ('model ~ "%"', []),
        ('model ~ "[240v]"', [QN5]),
        ("mppt_high_v < max_dc_voltage_v", [QN8]),
        ("(phases == 1 or phases == 3) and ac_power_w < 6000", [QN5]),
        ("phases == 1 or phases == 3 and ac_power_w < 6000", [QN5]),
        ('"it\'s" == model or phases == 3', [QN8]),
    ],
)
def test_what_conditions_find(found, text, models):
    assert found(text) == models


def test_flags_and_texts_of_modules(found):
    assert found("bifacial", "module") == found("bifacial == yes", "module") == ["AF9B-440"]
    assert found("not bifacial", "module") == found("bifacial != yes", "module") == ["AF6K-270P"]
    assert found("voc_coef_pct < -0.3 %/K", "module") == ["AF6K-270P"]
    assert found("max_system_voltage_v >= 1.5 kV", "module") == ["AF9B-440"]


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "the condition is empty"),
        ("acpower_w > 5", "no field 'acpower_w'; near to it: ac_power_w"),
        ("hallo > 5", "there is maker, model, ac_power_w, max_dc_voltage_v, phases, trackers and what else"),
        ("max_isc_a > 20", "may differ from tracker to tracker: ask for == unknown"),
        ("inputs", "a comparison is wanted"),
        ("ac_power_w", "a comparison is wanted"),
        ("ac_power_w >", "a field or a value is wanted at its end"),
        ("ac_power_w > 5 phases == 1", "'and' or 'or' is wanted at 'phases == 1'"),
        ("(ac_power_w > 5", "a closing bracket is wanted"),
        ("ac_power_w > 5)", "'and' or 'or' is wanted"),
        ("ac_power_w > 5 V", "'V' is no unit of ac_power_w, which is in W"),
        ('ac_power_w > "5"', "ac_power_w is a number in W"),
        ("maker == 5", "maker is a text"),
        ('maker > "a"', "maker is a text"),
        ("5 > 3", "one side is a field"),
        ("ac_power_w > unknown", "unknown goes with"),
        ("maker == phases", "cannot be compared"),
        ("__import__('os').system('x')", "not understood"),
        ("ac_power_w > 5; DROP TABLE record", "not understood"),
        ("(" * 50 + "phases == 1" + ")" * 50, "too many brackets"),
        ("phases == 1 and " * 100 + "phases == 1", "ask in parts"),
    ],
)
def test_conditions_that_are_refused(text, says):
    with pytest.raises(CatalogError) as caught:
        condition(text, "inverter")
    assert says in str(caught.value) and "\n" not in str(caught.value)


def test_fields_tell_the_kind():
    kinds = ("module", "inverter")
    assert kinds_of("voc_v > 40", kinds) == ("module",)
    assert kinds_of("phases == 1", kinds) == ("inverter",)
    assert kinds_of('maker ~ "q"', kinds) == kinds
    with pytest.raises(CatalogError, match="no kind of record has all of voc_v, phases"):
        kinds_of("voc_v > 40 and phases == 1", kinds)


COMPARE = {
    "==": operator.eq,
    "!=": operator.ne,
    "<": operator.lt,
    "<=": operator.le,
    ">": operator.gt,
    ">=": operator.ge,
}


def _numbers(type_):
    return [name for name, spec in specs(type_).items() if spec.type in (int, float)]


@st.composite
def conditions(draw, type_, depth=2):
    """A condition as text, and as a function of a record that returns True, False or None (not known)."""
    if depth and draw(st.booleans()):
        kind = draw(st.sampled_from(("and", "or", "not")))
        left, one = draw(conditions(type_, depth - 1))
        if kind == "not":
            return f"not ({left})", lambda r: None if one(r) is None else not one(r)
        right, other = draw(conditions(type_, depth - 1))
        end = kind == "or"

        def joined(r):
            values = (one(r), other(r))
            return end if end in values else (None if None in values else not end)

        return f"({left}) {kind} ({right})", joined
    name = draw(st.sampled_from(_numbers(type_)))
    sign = draw(st.sampled_from(sorted(COMPARE)))
    known = [getattr(r, name) for r in (*MODULES, *INVERTERS) if getattr(r, name, None) is not None]
    number = draw(st.sampled_from([0.0, 1.0, 100.0, *map(float, known)]))

    def compared(r):
        value = getattr(r, name)
        return None if value is None else COMPARE[sign](value, number)

    return f"{name} {sign} {number!r}", compared


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.data())
def test_conditions_mean_what_python_means_by_them(found, data):
    for kind, type_, records in (("module", Module, MODULES), ("inverter", Inverter, INVERTERS)):
        text, meets = data.draw(conditions(type_))
        assert found(text, kind) == sorted(r.model for r in records if meets(r) is True)


WORDS = st.sampled_from(
    (
        "ac_power_w",
        "phases",
        "model",
        "and",
        "or",
        "not",
        "(",
        ")",
        "==",
        ">=",
        "~",
        "5",
        "5 kW",
        "unknown",
        "yes",
        '"a"',
        "'",
        "x",
        "1e9",
        "%",
    )
)


@settings(max_examples=400, deadline=None)
@given(st.one_of(st.text(max_size=30), st.lists(WORDS, max_size=9).map(" ".join)))
def test_whatever_is_typed_is_a_condition_or_one_line(text):
    try:
        condition(text, "inverter")
    except CatalogError as problem:
        assert "\n" not in str(problem) and str(problem).startswith("--where")


def test_find_by_values(ferrule, small_catalog):
    ran = ferrule("sheet", "find", "--where", "ac_power_w >= 5000 and phases == 1")
    assert ran.status == 0 and QN5 in ran.out and QN8 not in ran.out and "1 record." in ran.out
    assert ferrule("sheet", "find", "duo", "--where", "ac_power_w >= 5000").out.count("QN-") == 1
    assert ferrule("sheet", "find", "--where", "ac_power_w > 1 MW").status == 1
    ran = ferrule("sheet", "find", "--where", "ac_pwr > 1")
    assert ran.status == 2 and "near to it: ac_power_w" in ran.err
    assert ferrule("sheet", "find").status == 2
