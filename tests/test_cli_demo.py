"""``ferrule demo``: from nothing to an answer."""

from __future__ import annotations

import shlex
import tomllib
from pathlib import Path

import pytest

import seed_catalog
from catalog.store import Catalog
from cli import demo
from cli.cautions import CAUTIONS


@pytest.fixture(scope="module")
def screen(tmp_path_factory) -> tuple[str, Path]:
    """What the demo prints, and the folder of user data that it worked in."""
    import contextlib
    import io

    from cli.main import run

    data = tmp_path_factory.mktemp("data")
    out = io.StringIO()
    with pytest.MonkeyPatch.context() as patch, contextlib.redirect_stdout(out):
        patch.setenv("XDG_DATA_HOME", str(data))
        patch.setenv("FERRULE_CATALOG", str(data / "own.sqlite"))
        assert run(["demo"]) == 0
    return out.getvalue(), data


def test_the_demo_tells_question_answer_reasons_doubts_cautions_and_what_next(screen):
    said = " ".join(screen[0].split())
    assert (
        "24 of them. The buyer asks: Which inverters take Marzipan Photovoltaik Klassik 270P at Butterfield"
        in said
    )
    assert "fits: every check that can stop it holds" in said
    assert "to-confirm:" in said and "To confirm on the datasheets before ordering" in said
    assert "In short: the least inverter" in said
    assert "max-dc-voltage" in said and "IEC 62548" in said
    assert "stopped by" in said
    assert "clear-sky year" in said and "upper bound of energy and of clipping" in said
    assert all(caution in said for caution in CAUTIONS)
    assert "--catalog" in said


def test_the_demo_fits_two_low_screens(screen):
    lines = screen[0].splitlines()
    assert len(lines) <= 64
    assert max(len(line.rstrip()) for line in lines if "--catalog" not in line) <= 100


def test_the_strings_of_the_demo_hold_by_hand(screen):
    # Voc in the cold by the datasheet's coefficient: STC value plus coefficient times difference to 25 degC,
    # as in the worked examples of Global Sustainable Energy Solutions, "Calculating Module Voltages", 2011.
    modules = tomllib.loads(seed_catalog.path("modules.toml").read_text(encoding="utf-8"))["module"]
    module = next(m for m in modules if m["model"] in demo.MODULE)
    cold = 8 * module["voc_v"] * (1 + module["voc_coef_pct"] / 100 * (-12 - 25))
    said = " ".join(screen[0].split())
    assert "1 Sinewright Fiddle 1.5 1.50 3 units: 1x8" in said
    value, limit = said.partition("max-dc-voltage ")[2].split(" V ")[0].split(" of ")
    assert float(value) == pytest.approx(cold, abs=0.05)
    assert limit == "450.0"


def test_the_least_money_is_the_least_of_the_proven(screen):
    # Prices and stock of the demo: 3 Fiddle 1.5 cost 867 EUR, one Viola 5 649 EUR, one Old Faithful 150 EUR.
    said = " ".join(screen[0].split())
    assert "The least money is #2, 1 x Sinewright Viola 5 (649 EUR, 9 on the shelf)" in said
    assert (
        "Cheaper still is #6, 1 x Humdrum Electric Old Faithful 4.6 (150 EUR, 6 on the shelf): do not pay"
        in said
    )


def test_the_demo_leaves_its_catalog_and_touches_no_other(screen):
    data = screen[1]
    assert [path.relative_to(data).as_posix() for path in data.rglob("*.sqlite")] == ["ferrule/demo.sqlite"]
    with Catalog.open(data / "ferrule" / "demo.sqlite") as catalog:
        assert len(catalog.names("module")) >= 8
        assert len(catalog.names("inverter")) >= 12
        assert "Butterfield Barn" in [site.name for site in catalog.sites()]


def test_what_the_demo_proposes_to_type_works(ferrule, screen):
    after = screen[0].partition("Go on from here")[2].replace("\\\n", "")
    proposed = [line.strip() for line in after.splitlines() if line.startswith("  ferrule ")]
    assert len(proposed) == 4
    for line in proposed:
        ran = ferrule(*shlex.split(line)[1:])
        assert ran.status == 0, f"{line}: {ran.err}"


def test_the_demo_is_made_anew(ferrule, tmp_path):
    made = tmp_path / "data" / "ferrule" / "demo.sqlite"
    made.parent.mkdir(parents=True)
    made.write_text("left over from an interrupted demo")
    assert ferrule("demo").status == 0
    with Catalog.open(made) as catalog:
        assert catalog.sites()


def test_keep_makes_the_catalog_elsewhere_and_overwrites_nothing(ferrule, tmp_path):
    kept = tmp_path / "shown.sqlite"
    assert ferrule("demo", "--keep", kept).status == 0
    before = kept.read_bytes()
    ran = ferrule("demo", "--keep", kept)
    assert ran.status == 2 and "overwrites nothing" in ran.err and ran.err.count("\n") == 1
    assert kept.read_bytes() == before
