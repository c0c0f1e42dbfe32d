"""Names: looked up as people type them, and resolved from suppliers' free text."""

from __future__ import annotations

import random

import pytest
from name_distortions import distorted

from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.namekeys import compact
from catalog.names import Named, NameIndex, find, look_up, resolve, twins

INVENTED = [
    Named(1, "Alderfell Solar Inc.", "AF6K-270P"),
    Named(2, "Alderfell Solar Inc.", "AF6K-275P"),
    Named(3, "Alderfell Solar Inc.", "AF6K-270M"),
    Named(4, "Alderfell Solar Inc.", "AF6K-270P-BB"),
    Named(5, "Brightmoor Energy Ltd", "BM-Q300"),
    Named(6, "Candlewick PV", "BM-Q300"),
    Named(7, "Brightmoor Energy Ltd", "Helder 6.0-1 [240V]"),
    Named(8, "Brightmoor Energy Ltd", "Helder 6.0-1 [208V]"),
    Named(9, "Brightmoor Energy Ltd", "Helder 60-1"),
    Named(10, "Dörrbach Elektronik", "DX 5000S"),
    Named(11, "Candlewick PV", "CW250S-24/Ad"),
    Named(12, "Candlewick PV", "CW250S-24/Ad+"),
    Named(13, "Ebbing", "Ebbing 40"),
]
BY_ID = {n.id: n for n in INVENTED}


@pytest.fixture(scope="module")
def cec_modules():
    """Names of the CEC module table, with the rated powers [W]."""
    records = read_cec_modules()
    return NameIndex([Named(i, r.maker, r.model) for i, r in enumerate(records)]), [r.pmax_w for r in records]


@pytest.fixture(scope="module")
def cec_inverters():
    """Names of the CEC inverter table, with the rated powers [W]."""
    records = read_cec_inverters()
    return NameIndex([Named(i, r.maker, r.model) for i, r in enumerate(records)]), [
        r.ac_power_w for r in records
    ]


@pytest.mark.parametrize(
    ("query", "meant"),
    [
        ("Alderfell Solar Inc. AF6K-270P", 1),  # the full name wins, though another name begins with it
        ("af6k 270p", 1),
        ("AF6K270P", 1),
        ("  af6k - 270 p ", 1),
        ("alderfell af6k-270p", 1),
        ("AF6K-270P alderfell", 1),
        ("af6k-270p bb", 4),
        ("Alderfel AF6K-270P", 1),
        ("Aldrefell Solar AF6K-270M", 3),
        ("fa6k 270m", 3),  # turned letters
        ("helder 6.0-1 240v", 7),
        ("helder 6,0-1 [208V]", 8),
        ("helder 60-1", 9),
        ("dorrbach dx5000s", 10),
        ("DÖRRBACH DX 5000S", 10),
        ("candlewick bm q300", 6),
        ("cw250s-24/ad", 11),
        ("cw250s-24/ad+", 12),
        ("ebbing 40", 13),
        ("275", 2),  # a part of one name only
    ],
)
def test_look_up_finds(query, meant):
    found = look_up(query, INVENTED)
    assert found.match == meant
    assert [c.id for c in found.candidates] == [meant]


@pytest.mark.parametrize(
    ("query", "candidates"),
    [
        ("bm-q300", {5, 6}),
        ("alderfell", {1, 2, 3, 4}),
        ("af6k 270", {1, 3, 4}),
        ("helder 6.0-1", {7, 8}),
        ("helder 6.0", {7, 8}),
        ("cw250", {11, 12}),
    ],
)
def test_look_up_never_guesses_between_records(query, candidates):
    found = look_up(query, INVENTED)
    assert found.match is None
    assert {c.id for c in found.candidates} == candidates


@pytest.mark.parametrize("query", ["af6k-265p", "af6k-280p", "af5k-270p", "bm-q305", "dx 500s", "dx 50000s"])
def test_digits_are_no_typing_errors(query):
    found = look_up(query, INVENTED)
    assert found.match is None
    assert found.candidates  # "did you mean"


def test_one_letter_that_tells_types_apart_is_no_typing_error():
    assert look_up("AF6K-275N", INVENTED).match is None


@pytest.mark.parametrize("query", ["", "   ", "-/-", "\n"])
def test_nothing_typed_is_nothing_found(query):
    assert look_up(query, INVENTED) == look_up(query, [])
    assert find(query, INVENTED) == []
    assert resolve(query, INVENTED).confidence == "none"


def test_every_full_name_of_the_tables_finds_its_record(cec_modules, cec_inverters):
    rng = random.Random(4)
    for index, _ in (cec_modules, cec_inverters):
        for named in rng.sample(index.names, 60):
            assert look_up(named.name, index).match == named.id
            assert resolve(named.name, index).candidates[0].id == named.id


def test_find_as_one_types():
    assert {c.id for c in find("af6k-27", INVENTED)} == {1, 2, 3, 4}
    assert [c.id for c in find("270p ald", INVENTED)] == [1, 4]
    assert [c.id for c in find("helder", INVENTED, 2)] == [9, 8]
    assert find("af6k-265p", INVENTED)[0].id in {1, 2}  # nothing holds it: the nearest names


def test_twins_are_models_of_several_makers():
    again = [*INVENTED, Named(20, "Brightmoor", "bm q300"), Named(21, "Fallow", "Ebbing 41")]
    assert twins(again) == [[5, 6, 20]]
    assert twins([Named(1, "Ebbing", "Ebbing 40"), Named(2, "Fallow", "40")]) == [[1, 2]]


@pytest.mark.parametrize(
    ("text", "meant"),
    [
        ("ALDERFELL SOL. AF6K 270P poly 270Wp blk frame", 1),
        ("Solarmodul Alderfell AF6K-\n270P, 24 pcs", 1),
        ("AF6K-27OP 270 Wp qty 60", 1),  # letter O
        ("270P AF6K Alderfell, pallet 31 pcs", 1),
        ("24x AF6K270P270Wp ALDERFELL", 1),
        ("Alderf. AF6K 275P 275W mono, EUR 89,50", 2),
        ("AF 6K-270 P BB alderfell solar", 4),
        ("Candlewick BM Q3OO full black", 6),
        ("BRIGHTM. HELDER 6.0 1 string inverter 240 Vac 6 kW", 7),
        ("Doerrbach? no: Dörrbach DX50OOS inverter 5kW", 10),
    ],
)
def test_resolve_is_sure(text, meant):
    found = resolve(text, INVENTED)
    assert (found.confidence, BY_ID[found.candidates[0].id]) == ("sure", BY_ID[meant])


@pytest.mark.parametrize(
    "text",
    [
        "BM-Q300 mono 300Wp",  # two makers
        "Brightmoor Helder 6.0-1 inverter",  # two AC voltages
        "Brightmoor Helder 6.0-1 480V",  # neither of them
        "Alderfell AF6K-270P 275Wp",  # the power contradicts
        "Alderfell AF6K 270",  # poly or mono
        "Alderfell AF6K-270P-XT",  # another type, as far as can be told
        "Alderfell AF6K-270P/AF6K-275P",  # two types
        "Fallowgate AF6K-270P",  # another maker, perhaps
        "Candlewick CW250S 24 Ad poly",  # with or without +
    ],
)
def test_resolve_leaves_the_choice(text):
    found = resolve(text, INVENTED)
    assert found.confidence == "choose"
    assert found.candidates


@pytest.mark.parametrize(
    "text", ["Alderfell AF6K-265P", "Candlewick BM-Q305", "Brightmoor Helder 3.0-1 240V"]
)
def test_a_type_that_is_not_in_the_catalog_is_never_sure(text):
    assert resolve(text, INVENTED).confidence != "sure"


@pytest.mark.parametrize(
    "text", ["mounting rail 4.2 m, anodised", "MC4 connectors, 100 pcs", "freight and packing"]
)
def test_resolve_knows_what_is_no_record(text, cec_modules):
    assert resolve(text, INVENTED).confidence == "none"
    assert resolve(text, cec_modules[0]).confidence != "sure"


@pytest.mark.parametrize("kind", ["module", "inverter"])
def test_distorted_names_of_the_tables(kind, cec_modules, cec_inverters):
    index, powers = cec_modules if kind == "module" else cec_inverters
    rng = random.Random(11)
    chosen = rng.sample(index.names, 150)
    texts = [distorted(n.maker, n.model, kind, powers[n.id], rng) for n in chosen]
    found = [resolve(text, index) for text in texts]
    wrong = [
        (text, n.name)
        for text, n, f in zip(texts, chosen, found, strict=True)
        if f.confidence == "sure" and f.candidates[0].id != n.id
    ]
    assert not wrong
    assert sum(f.confidence == "sure" for f in found) >= 0.8 * len(found)
    among_five = sum(n.id in [c.id for c in f.candidates[:5]] for n, f in zip(chosen, found, strict=True))
    assert among_five >= 0.98 * len(found)


def test_a_changed_digit_is_never_sure(cec_modules):
    index, _ = cec_modules
    rng = random.Random(12)
    known = set(index.model_keys)
    sure = []
    for named in rng.sample(index.names, 80):
        at = rng.choice([i for i, c in enumerate(named.model) if c.isdigit()])
        model = named.model[:at] + str((int(named.model[at]) + 5) % 10) + named.model[at + 1 :]
        found = resolve(f"{named.maker} {model} mono", index)
        if compact(model) not in known and found.confidence == "sure":
            sure.append((model, index.names[found.candidates[0].id].name))
    assert not sure


def test_an_index_answers_as_the_list_does():
    index = NameIndex(INVENTED)
    for text in ("af6k 270p", "helder 6.0-1", "xyz"):
        assert look_up(text, index) == look_up(text, INVENTED)
        assert find(text, index) == find(text, INVENTED)
        assert resolve(text, index) == resolve(text, INVENTED)
