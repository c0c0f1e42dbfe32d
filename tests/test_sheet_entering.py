"""``ferrule sheet enter``: a datasheet typed in, checked at once, left and taken up again."""

from __future__ import annotations

import io

import pytest

from catalog.records import Inputs, Inverter, Module, Origin, Source, specs
from catalog.store import Catalog
from cli.entering import EXAMPLES, INPUTS, SOURCE, Entering, asked_fields

MODULE = {
    "source": "Paper Sun datasheet, rev B", "maker": "Paper Sun", "model": "P-400", "technology": "Mono-c-Si", "bifacial": "no",
    "pmax_w": "400", "voc_v": "45.6", "isc_a": "11.2", "vmp_v": "37.9", "imp_a": "10.56", "voc_coef_pct": "-125 mV/K",
    "max_system_voltage_v": "1.5 kV",
}  # fmt: skip


@pytest.fixture
def enter(ferrule, monkeypatch):
    """Enter a record with some lines typed."""

    def enter_(kind, *lines, options=()):
        monkeypatch.setattr("sys.stdin", io.StringIO("".join(f"{line}\n" for line in lines)))
        return ferrule("sheet", "enter", kind, *options)

    return enter_


def lines_of(kind, answers):
    """What is typed for some answers; a module that is not bifacial is not asked for its bifaciality."""
    return [answers.get(spec.name, "") for spec in asked_fields(kind) if spec.name != "bifaciality"]


def test_a_module_is_asked_for_shown_and_kept(enter, small_catalog):
    ran = enter("module", *lines_of("module", MODULE), "yes")
    assert ran.status == 0
    assert (
        "Paper Sun P-400 (module" in ran.out
        and "Kept: Paper Sun P-400, from Paper Sun datasheet, rev B." in ran.out
    )
    assert "voc_v [V]: open-circuit voltage (like 38.2)" in ran.err
    with Catalog.open(small_catalog) as catalog:
        module = next(m for m in catalog.modules() if m.model == "P-400")
    assert module.source == Source("Paper Sun datasheet, rev B")
    assert (module.voc_coef_pct, module.max_system_voltage_v, module.noct_c) == (-0.274123, 1500.0, None)
    assert module.origin("voc_v") is Origin.ENTERED and module.origin("noct_c") is None


def test_an_inverter_with_inputs_and_one_without(enter, small_catalog):
    answers = {"source": "sheet", "maker": "Paper Grid", "model": "G-10", "ac_power_w": "10 kW", "mppt_low_v": "180",
               "mppt_high_v": "850", "inputs": "2 trackers: 2 strings, 26 A, Isc 32 A", "phases": "three-phase"}  # fmt: skip
    assert enter("inverter", *lines_of("inverter", answers), "yes").status == 0
    assert (
        enter("inverter", *lines_of("inverter", answers | {"model": "G-11", "inputs": ""}), "yes").status == 0
    )
    with Catalog.open(small_catalog) as catalog:
        known, unknown = (
            next(i for i in catalog.inverters() if i.model == model) for model in ("G-10", "G-11")
        )
    assert (known.ac_power_w, known.phases) == (10000.0, 3)
    assert known.inputs == (Inputs(trackers=2, strings_per_tracker=2, max_current_a=26.0, max_isc_a=32.0),)
    assert (unknown.inputs, unknown.origin("inputs")) == ((Inputs(trackers=1),), Origin.ASSUMED)


def test_what_cannot_be_is_asked_for_again(enter, small_catalog):
    lines = lines_of("module", MODULE)
    at = [spec.name for spec in asked_fields("module")].index("vmp_v")
    ran = enter("module", *lines[:at], "47.9", "thirty", "", *lines[at:], "yes")
    assert ran.status == 0
    assert "vmp_v 47.9 V is not below voc_v 45.6 V" in ran.err
    assert "'thirty' is no number in V" in ran.err
    assert "vmp_v is needed" in ran.err


def test_what_is_unusual_is_said_and_taken(enter, small_catalog):
    ran = enter("module", *lines_of("module", MODULE | {"noct_c": "60"}), "yes")
    assert ran.status == 0 and "unusual: noct_c 60 degC" in ran.err


def test_a_name_that_is_taken_is_told_at_once(enter, small_catalog):
    ran = enter("module", "sheet", "Alderfell Solar", "af6k-270p", "AF6K-290P", "later")
    assert "is in the catalog already: change it with 'ferrule sheet amend'" in ran.err
    assert "4/21 technology" in ran.err


def test_it_can_be_left_and_taken_up_again(enter, small_catalog):
    lines = lines_of("module", MODULE)
    ran = enter("module", *lines[:6], "later")
    assert ran.status == 1 and "Left as a draft: 'ferrule sheet enter module'" in ran.err
    # The end of what is typed (Ctrl-D) leaves too.
    ran = enter("module", *lines[6:8])
    assert ran.status == 1 and "Going on with Paper Sun P-400: 6 of 21 answered" in ran.err
    ran = enter("module", *lines[8:], "no")
    assert ran.status == 1
    assert enter("module", "yes").status == 0
    with Catalog.open(small_catalog) as catalog:
        assert [m.model for m in catalog.modules()].count("P-400") == 1
    # Kept: the next begins anew.
    assert "1/21 source" in enter("module").err


def test_a_draft_can_be_forgotten(enter, small_catalog):
    enter("module", "sheet", "Paper Sun", "later")
    assert "Going on" not in enter("module", options=["--fresh"]).err


def test_back_goes_to_the_field_before_and_a_field_can_be_changed_at_the_end(enter, small_catalog):
    lines = lines_of("module", MODULE)
    ran = enter(
        "module",
        "sheet",
        "Paper Son",
        "back",
        "Paper Sun",
        *lines[2:],
        "maker",
        "Paper Sun Ltd",
        "perhaps",
        "yes",
    )
    assert (
        ran.status == 0 and "now Paper Son" in ran.err and "'perhaps' is neither yes nor a field" in ran.err
    )
    assert "Kept: Paper Sun Ltd P-400" in ran.out


def test_nothing_is_half_kept(enter, small_catalog):
    with Catalog.open(small_catalog) as catalog:
        before = catalog.names("module")
    enter("module", *lines_of("module", MODULE), "later")
    with Catalog.open(small_catalog) as catalog:
        assert catalog.names("module") == before


@pytest.mark.parametrize(("kind", "type_"), [("module", Module), ("inverter", Inverter)])
def test_all_that_a_datasheet_gives_is_asked_for_and_the_examples_are_sound(kind, type_):
    asked = [spec.name for spec in asked_fields(kind)]
    required = [spec.name for spec in specs(type_).values() if spec.required]
    assert asked[: 1 + len(required)] == ["source", *required]
    draft = Entering(kind)
    for spec in asked_fields(kind):
        if draft.pointless(spec):
            continue
        remarks = draft.answer(spec, EXAMPLES[kind][spec.name].split(" or ")[0])
        assert not remarks, (spec.name, remarks)
    assert draft.record().name
    assert Entering.from_bytes(kind, draft.to_bytes()) == draft
    assert Entering.from_bytes(kind, b"[1]") == Entering.from_bytes(kind, b"\xff") == Entering(kind)
    assert {SOURCE.name, INPUTS.name} >= {name for name in asked if name not in specs(type_)}
