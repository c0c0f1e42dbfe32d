"""The demo: files read without a remark, numbers hold together, bundles teach what they should."""

from __future__ import annotations

import csv
import tomllib

import numpy as np
import pytest
from pvlib import inverter as pvlib_inverter

import seed_catalog
from catalog.cec import read_cec_inverters, read_cec_modules
from catalog.names import Named, resolve
from catalog.plausibility import findings_of
from catalog.records import SANDIA_PARAMETERS, Origin, Site
from catalog.sheetfiles import read_sheets
from catalog.sites import checked
from matcher.errors import MatcherError
from matcher.fit import Request, fit
from matcher.singlediode import max_power_point, six_parameters

# Weights of the California Energy Commission for efficiency at shares of the rated power (from memory).
CEC_WEIGHTS = {0.10: 0.04, 0.20: 0.05, 0.30: 0.12, 0.50: 0.21, 0.75: 0.53, 1.00: 0.05}


def rows(name: str) -> list[dict[str, str]]:
    with seed_catalog.path(name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file, strict=True))


MODULES = {m.name: m for m in read_sheets(seed_catalog.path("modules.toml")).modules}
INVERTERS = {i.name: i for i in read_sheets(seed_catalog.path("inverters.csv")).inverters}
SITES = {
    s["name"]: Site(**s) for s in tomllib.loads(seed_catalog.path("sites.toml").read_text("utf-8"))["site"]
}
STOCK, BUNDLES = rows("stock.csv"), rows("bundles.csv")


def test_datasheets_read_without_a_remark():
    for name in ("modules.toml", "inverters.csv"):
        assert read_sheets(seed_catalog.path(name)).notes == []
    assert findings_of([*MODULES.values(), *INVERTERS.values()]) == {}


def test_there_is_one_of_each():
    modules, inverters = MODULES.values(), INVERTERS.values()
    assert len(modules) >= 8 and len(inverters) >= 12
    assert {m.bifacial for m in modules} == {m.crystalline for m in modules} == {True, False}
    assert any(m.voc_coef_pct is None for m in modules)
    assert {1, 3} <= {i.phases for i in inverters}
    assert any(len(i.inputs) > 1 for i in inverters)
    assert any(i.max_dc_voltage_v is None for i in inverters)
    assert any(i.inputs[0].max_isc_a is None for i in inverters)
    assert min(i.ac_power_w for i in inverters) < 500 and max(i.ac_power_w for i in inverters) > 1e6
    assert sum(i.Paco is not None for i in inverters) == 3


def test_makers_are_invented():
    public = {r.maker.casefold() for r in read_cec_modules() + read_cec_inverters()}
    for maker in {r.maker.casefold() for r in (*MODULES.values(), *INVERTERS.values())}:
        assert not any(maker in real or maker.split()[0] == real for real in public)


@pytest.mark.parametrize("module", MODULES.values(), ids=MODULES)
def test_modules_follow_the_single_diode_model(module):
    """Values that no diode could have would not be met by the model fitted to them."""
    model = six_parameters(module)
    if model is None:
        assert module.voc_coef_pct is None
        return
    vmp, imp = max_power_point(model, np.array([1000.0]), np.array([25.0]))
    assert vmp[0] == pytest.approx(module.vmp_v, rel=0.01)
    assert imp[0] == pytest.approx(module.imp_a, rel=0.01)


@pytest.mark.parametrize("name", [name for name, i in INVERTERS.items() if i.Paco is not None])
def test_derived_sandia_parameters_give_the_weighted_efficiency(name):
    """pvlib.inverter.sandia computes the model independently of this project."""
    inverter = INVERTERS[name]
    assert all(inverter.origin(p) is Origin.DERIVED for p in SANDIA_PARAMETERS)
    parameters = {p: getattr(inverter, p) for p in SANDIA_PARAMETERS} | {"Pnt": 0.0}
    dc = np.linspace(inverter.Pso, inverter.Pdco, 20001)
    ac = pvlib_inverter.sandia(np.full_like(dc, inverter.Vdco), dc, parameters)
    weighted = sum(
        w * share * inverter.Paco / np.interp(share * inverter.Paco, ac, dc)
        for share, w in CEC_WEIGHTS.items()
    )
    assert 100 * weighted == pytest.approx(inverter.weighted_efficiency_pct, abs=0.05)


def test_sites_are_sound():
    assert len(SITES) >= 3
    for site in SITES.values():
        assert checked(site) is site
        assert None not in (site.lat, site.lon, site.tilt, site.azimuth)
    # South of the equator an array looks north.
    assert all((s.lat < 0) == (s.azimuth < 90 or s.azimuth > 270) for s in SITES.values())


def test_stock_names_records_that_exist():
    assert len({row["article"] for row in STOCK + BUNDLES}) == len(STOCK) + len(BUNDLES)
    known = {"module": MODULES, "inverter": INVERTERS}
    assert sum(row["record"] == "" for row in STOCK) == 1
    for row in STOCK:
        assert row["record"] == "" or row["record"] in known[row["kind"]]
        assert int(row["quantity"]) >= 0 and float(row["unit_price"]) > 0
    assert {row["record"] for row in STOCK} - {""} == {*MODULES, *INVERTERS}


def test_suppliers_texts_are_never_resolved_to_a_wrong_record():
    names = [Named(k, r.maker, r.model) for k, r in enumerate((*MODULES.values(), *INVERTERS.values()))]
    sure = 0
    for row in STOCK:
        answer = resolve(row["text"], names)
        if answer.confidence == "sure":
            sure += 1
            assert names[answer.candidates[0].id].name == row["record"], row["text"]
    assert sure >= 0.7 * len(STOCK)


def outcome(row: dict[str, str], site: Site) -> str:
    """Verdict of the best arrangement of a bundle at a site."""
    count, units = int(row["modules"]), int(row["inverters"])
    request = Request(site=site, ratio=(0.1, 5.0), counts=(count, count), units=(units, units))
    try:
        found = fit([MODULES[row["module"]]], [INVERTERS[row["inverter"]]], request)
    except MatcherError:
        return "no-verdict"
    best = list(found.options(1))
    return str(best[0].verdict) if best else "does-not-fit"


@pytest.mark.parametrize("row", BUNDLES, ids=lambda row: row["article"])
def test_bundles_are_what_they_are_meant_to_be(row):
    sites = [SITES[row["site"]]] if row["site"] else SITES.values()
    assert {outcome(row, site) for site in sites} == {row["expect"]}
    assert len(row["lesson"]) > 20


def test_bundles_teach_every_outcome():
    assert {row["expect"] for row in BUNDLES} == {"fits", "to-confirm", "does-not-fit", "no-verdict"}


def test_lessons_by_hand():
    """The arithmetic of some lessons: Voc falls linearly with the cell's temperature, NOCT adds heat."""
    bundles = {row["article"]: row for row in BUNDLES}

    def cold(article: str, count: int) -> float:
        module, site = MODULES[bundles[article]["module"]], SITES[bundles[article]["site"]]
        return count * module.voc_v * (1 + module.voc_coef_pct / 100 * (site.design_low_c - 25))

    assert cold("LL-B07", 14) == pytest.approx(601.2, abs=0.1) and cold("LL-B07", 13) < 600
    assert cold("LL-B08", 7) > 450 > cold("LL-B08", 6)
    meadow, desert = MODULES["Noonday & Niece Meadow 590"], SITES["Saltpan Wells"]
    cell = desert.design_high_c + (meadow.noct_c - 20) / 800 * 1000
    hot = meadow.vmp_v * (1 + meadow.vmp_coef_pct / 100 * (cell - 25))
    assert 23 * hot < 880 <= 25 * hot
    assert 4577 == 23 * 199 and all(199 % n for n in range(2, 15))
    janus = MODULES["Two-Faced Glassworks Janus 580B"]
    assert janus.isc_a * 1.25 < 18 < janus.isc_a * 1.25 * (1 + 0.8 * 0.1)


def test_path_refuses_what_is_not_there():
    with pytest.raises(FileNotFoundError):
        seed_catalog.path("nothing.toml")


def test_readme_tells_of_every_file():
    readme = seed_catalog.path("README.md").read_text("utf-8")
    names = {p.name for p in seed_catalog.path("README.md").parent.iterdir() if p.suffix in (".toml", ".csv")}
    assert all(f"`{name}`" in readme for name in names)
