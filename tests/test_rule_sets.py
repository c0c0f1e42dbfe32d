"""Rule sets of one's own, the cold-voltage methods, caps, rear share and combiner, against hand and pvlib."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pvlib
import pytest

import oracle
import oracle_year
from catalog.errors import CatalogError
from catalog.records import Inputs, Inverter, Module, Site
from catalog_records import GLASS, MODULE
from cli.rule_files import read_rule_set
from handbook_values import NEC_690_7_A
from matcher.checks import Check
from matcher.electrical import design_points
from matcher.errors import MatcherError
from matcher.fit import Request, fit
from matcher.moduleyear import PlaneYear, plane_year
from matcher.rules import IEC_62548, NEC_690, PRACTICE, RuleSet
from matcher.weather import read_weather
from random_records import cec_module, cec_rows

DATA = Path(pvlib.__path__[0]) / "data"
SITE = Site(name="Hand", design_low_c=-10.0, design_high_c=35.0)
WHOLE = '''
name = "harbour-authority"
based_on = "iec-62548"
isc_factor = 1.35
voltage_cap_v = 500
[clauses]
short-circuit = "Harbour rules 4.2"
'''


def written(tmp_path: Path, text: str) -> str:
    """A rule set in a file."""
    path = tmp_path / "harbour.toml"
    path.write_text(text, encoding="utf-8")
    return str(path)


def box(**change: object) -> Inverter:
    """One tracker for 6 to about 20 modules in series."""
    values = dict(
        maker="Quillon", model="QN-5", ac_power_w=5000.0, max_dc_voltage_v=1000.0, mppt_low_v=150.0,
        mppt_high_v=800.0, weighted_efficiency_pct=96.0,
        inputs=(Inputs(trackers=1, strings_per_tracker=3, max_isc_a=40.0),),
    )  # fmt: skip
    return Inverter(**(values | change))


def checks_of(module: Module, inverter: Inverter, request: Request, plane: PlaneYear | None = None) -> list[dict[str, Check]]:
    """Checks of every option by name."""
    result = fit([module], [inverter], replace(request, every=True), plane=plane)
    return [{c.check: c for c in o.checks} for o in result.options()]


# --- the file --------------------------------------------------------------------------------------------


def test_a_file_changes_what_it_says_and_nothing_else(tmp_path):
    rules = read_rule_set(written(tmp_path, WHOLE))
    assert (rules.name, rules.isc_factor, rules.voltage_cap_v) == ("harbour-authority", 1.35, 500.0)
    assert rules.clause("short-circuit") == "Harbour rules 4.2"
    same = ("fuse_low", "fuse_high", "cold_voltage", "cold_margin_pct")
    assert [getattr(rules, f) for f in same] == [getattr(IEC_62548, f) for f in same]
    assert rules.clause("max-dc-voltage") == IEC_62548.clause("max-dc-voltage")
    nec = read_rule_set(written(tmp_path, 'name = "mine"\nbased_on = "nec-690"'))
    assert nec == replace(NEC_690, name="mine", clauses=nec.clauses)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("name = ", "no TOML file"),
        ('based_on = "iec-62548"', "a name of its own"),
        ('name = " "\nbased_on = "iec-62548"', "a name of its own"),
        ('name = " nec-690 "\nbased_on = "iec-62548"', "a name of its own"),
        ('name = 7\nbased_on = "iec-62548"', "a name of its own"),
        ('name = "x"', "based_on must name iec-62548 or nec-690"),
        ('name = "x"\nbased_on = "iec"', "based_on must name"),
        ('name = "x"\nbased_on = ["iec-62548"]', "based_on must name"),
        ('name = "x"\nbased_on = "iec-62548"\nisc_facter = 1.3', "'isc_facter' is not known"),
        ('name = "x"\nbased_on = "iec-62548"\nisc_factor = "1.3"', "isc_factor must be a number from 1 to 2.5"),
        ('name = "x"\nbased_on = "iec-62548"\nisc_factor = 0.9', "isc_factor must be a number"),
        ('name = "x"\nbased_on = "iec-62548"\nisc_factor = nan', "isc_factor must be a number"),
        ('name = "x"\nbased_on = "iec-62548"\nisc_factor = true', "isc_factor must be a number"),
        ('name = "x"\nbased_on = "iec-62548"\nvoltage_cap_v = 0', "voltage_cap_v must be a number"),
        ('name = "x"\nbased_on = "iec-62548"\nfuse_low = 3', "fuse_low 3 is above fuse_high 2.4"),
        ('name = "x"\nbased_on = "iec-62548"\ncold_voltage = "guess"', "cold_voltage must be one of coefficient, table, hourly"),
        ('name = "x"\nbased_on = "iec-62548"\ncold_voltage = ["table"]', "cold_voltage must be one of"),
        ('name = "x"\nbased_on = "iec-62548"\ncold_voltage = "hourly"', "cold_margin_pct"),
        ('name = "x"\nbased_on = "iec-62548"\ncold_margin_pct = 2', "goes with cold_voltage"),
        ('name = "x"\nbased_on = "iec-62548"\ncold_voltage = "hourly"\ncold_margin_pct = -1', "cold_margin_pct must be"),
        ('name = "x"\nbased_on = "iec-62548"\nclauses = "x"', "one text per check"),
        ('name = "x"\nbased_on = "iec-62548"\n[clauses]\nmppt-low = 3', "one text per check"),
        ('name = "x"\nbased_on = "iec-62548"\n[clauses]\nmppt_low = "x"', "there is no check 'mppt_low'"),
    ],
)
def test_each_wrong_entry_is_one_line_that_names_the_file(tmp_path, small_catalog, ferrule, text, words):
    path = written(tmp_path, text)
    ran = ferrule("fit", "-m", "AF6K-270P", "--low", "-12", "--high", "38", "--rules", path)
    assert ran.status == 2 and not ran.out
    assert ran.err.startswith(f"ferrule: rule set {path}") and words in ran.err
    assert ran.err.count("\n") == 1


def test_files_that_cannot_be_read(tmp_path, small_catalog, ferrule):
    (tmp_path / "raw.toml").write_bytes(b'name = "\xff"')
    (tmp_path / "folder.toml").mkdir()
    for name, words in (("raw.toml", "no TOML file"), ("folder.toml", "directory"), ("none.toml", "there is no such file; name one")):
        ran = ferrule("fit", "-m", "AF6K-270P", "--low", "-12", "--high", "38", "--rules", tmp_path / name)
        assert ran.status == 2 and words in ran.err and ran.err.count("\n") == 1
    assert "no such rule set" in ferrule("fit", "-m", "AF6K-270P", "--low", "-1", "--high", "3", "--rules", "nec").err


def test_all_faults_of_a_file_at_once(tmp_path):
    text = 'name = "nec-690"\nbased_on = "x"\nfactor = 2\nisc_factor = 9\nfuse_low = 3\nfuse_high = 2\n[clauses]\nodd = "x"'
    with pytest.raises(CatalogError) as refused:
        read_rule_set(written(tmp_path, text))
    for words in ("'factor' is not known", "name of its own", "based_on must", "isc_factor must", "fuse_low 3 is above", "'odd'"):
        assert words in str(refused.value)


@pytest.mark.parametrize("base", [IEC_62548, NEC_690], ids=lambda r: r.name)
def test_a_printed_rule_set_is_a_file_to_start_from(tmp_path, ferrule, base):
    printed = ferrule("rules", base.name).out
    assert read_rule_set(written(tmp_path, printed)) == replace(base, name="my-rules")
    # With every line in force it says the same, but for the cap, of which it shows the form only.
    whole = "\n".join(line.removeprefix("# ") for line in printed.splitlines()[1:])
    read = read_rule_set(written(tmp_path, whole))
    assert replace(read, voltage_cap_v=None, clauses={}) == replace(base, name="my-rules", clauses={})
    assert all(read.clause(check) == base.clause(check) for check in PRACTICE)
    assert base.name in ferrule("rules").out and ferrule("rules", "nec").status == 2


def test_a_file_that_an_editor_began_with_a_byte_order_mark(tmp_path):
    path = tmp_path / "bom.toml"
    path.write_text(WHOLE, encoding="utf-8-sig")
    assert read_rule_set(str(path)).name == "harbour-authority"


def test_its_name_is_on_every_result(tmp_path, small_catalog, ferrule):
    path = written(tmp_path, WHOLE)
    asked = ("fit", "-m", "AF6K-270P", "-i", "QN-5000", "--low", "-12", "--high", "38", "--rules", path)
    assert "harbour-authority" in ferrule(*asked).out
    document = json.loads(ferrule(*asked, "--json").out)
    assert document["rules"] == {
        "name": "harbour-authority", "isc_factor": 1.35, "voltage_cap_v": 500.0, "cold_voltage": "coefficient"
    }  # fmt: skip
    document = json.loads(ferrule(*asked, "--json", "--checks").out)
    rules = {c["check"]: c["rule"] for c in document["options"][0]["checks"]}
    assert rules["short-circuit"] == "Harbour rules 4.2"
    for form in ("csv", "html", "json"):
        out = tmp_path / f"result.{form}"
        assert ferrule(*asked, "--out", out).status == 0
        assert "harbour-authority" in out.read_text(encoding="utf-8"), form


# --- what the numbers do -----------------------------------------------------------------------------------


def test_factor_and_cap_take_effect():
    rules = replace(IEC_62548, name="mine", isc_factor=1.5, voltage_cap_v=400.0)
    for checks in checks_of(MODULE, box(), Request(SITE, rules)):
        assert checks["short-circuit"].value / 9.2 / 1.5 == pytest.approx(round(checks["short-circuit"].value / 9.2 / 1.5))
        assert checks["voltage-cap"].limit == 400.0
        assert checks["voltage-cap"].value <= 400.0
    # 40 A hold 3 strings of 9.2 A at 1.25 (34.5 A), and 2 at 1.5 (41.4 A for 3).
    most = [
        max(t.strings for o in fit([MODULE], [box()], Request(SITE, r, every=True)).options() for t in o.arrangement)
        for r in (IEC_62548, rules)
    ]
    assert most == [3, 2]


@pytest.mark.parametrize(("site_cap", "rules_cap", "wanted"), [(None, None, None), (600.0, None, 600.0), (None, 500.0, 500.0), (600.0, 500.0, 500.0), (500.0, 600.0, 500.0)])
def test_the_lower_cap_of_site_and_rules_holds(site_cap, rules_cap, wanted):
    site = replace(SITE, voltage_cap_v=site_cap)
    options = checks_of(MODULE, box(), Request(site, replace(IEC_62548, voltage_cap_v=rules_cap), ratio=(0.1, 2.0)))
    assert options
    voc = 38.2 * (1 + 0.0031 * 35)
    longest = max(round(c["max-dc-voltage"].value / voc) for c in options)
    assert longest == int(min(wanted or 1000.0, 1000.0) / voc)
    assert {c["voltage-cap"].limit if "voltage-cap" in c else None for c in options} == {wanted}


@pytest.mark.parametrize("warmest,coldest,factor", NEC_690_7_A)
def test_table_method_takes_the_factor_though_a_coefficient_is_stated(warmest, coldest, factor):
    rules = replace(NEC_690, cold_voltage="table")
    for low in (warmest, coldest):
        site = replace(SITE, design_low_c=float(low), design_high_c=40.0)
        points = design_points([MODULE, replace(MODULE, technology="CdTe")], site, rules)
        assert points.voc_cold_v[0] == pytest.approx(38.2 * factor)
        # The table is for crystalline silicon: thin film keeps its coefficient.
        assert points.voc_cold_v[1] == pytest.approx(38.2 * (1 - 0.0031 * (low - 25)))


@pytest.mark.parametrize("rear", [None, 0.0, 0.1, 0.25])
def test_rear_share_raises_the_design_current_of_bifacial_modules(rear):
    site = replace(SITE, rear_share=rear)
    plain = replace(GLASS, bifacial=False, bifaciality=None)
    modules = [replace(m, voc_coef_pct=-0.27, vmp_coef_pct=-0.36) for m in (GLASS, plain)]
    points = design_points(modules, site, IEC_62548)
    assert points.isc_design_a == pytest.approx([11.3 * 1.25 * (1 + 0.7 * (rear or 0.0)), 11.3 * 1.25])


def test_a_rear_share_needs_the_bifaciality():
    module = replace(GLASS, bifaciality=None, voc_coef_pct=-0.27, vmp_coef_pct=-0.36)
    with pytest.raises(MatcherError, match="bifaciality is not stated"):
        fit([module], [box()], Request(replace(SITE, rear_share=0.1)))
    assert fit([module], [box()], Request(SITE)).totals.arrangements


def test_a_combiner_box_waives_the_string_inputs_only():
    inverter = box(inputs=(Inputs(trackers=1, strings_per_tracker=1, max_isc_a=40.0),))
    most = {}
    for combiner in (False, True):
        options = list(fit([MODULE], [inverter], Request(SITE, combiner=combiner, every=True)).options())
        most[combiner] = max(t.strings for o in options for t in o.arrangement)
        assert all(("string-inputs" in {c.check for c in o.checks}) is not combiner for o in options)
    assert most == {False: 1, True: 3}  # 40 A hold three times 11.5 A


# --- cold voltage from hourly weather ------------------------------------------------------------------------


@pytest.mark.parametrize("file", ["703165TY.csv", "723170TYA.CSV"])
@pytest.mark.parametrize("row", [3, 40, 77])
@pytest.mark.parametrize("margin", [0.0, 2.5])
def test_hourly_voc_is_the_highest_of_all_hours(file, row, margin):
    """Hour by hour: pvlib's CEC model and its Voc over every sunlit hour of a TMY3 file that pvlib installs."""
    module = cec_module(cec_rows()[row])
    weather, meta = oracle_year.read_tmy3_mid_interval(str(DATA / file))
    poa, cell = oracle_year.plane(weather, meta["latitude"], meta["longitude"], meta["altitude"], 35.0, 180.0)
    lit = poa > 0
    six = oracle.six_parameters(module)
    order = ("alpha_sc", "a_ref", "I_L_ref", "I_o_ref", "R_sh_ref", "R_s", "Adjust")
    curve = pvlib.pvsystem.calcparams_cec(poa[lit], cell[lit], *(six[name] for name in order))
    voc = np.asarray(pvlib.pvsystem.singlediode(*curve)["v_oc"])
    rules = RuleSet("own", 1.25, 1.5, 2.4, cold_voltage="hourly", cold_margin_pct=margin)
    plane = plane_year(read_weather(DATA / file), 35.0, 180.0)
    points = design_points([module], SITE, rules, plane)
    assert points.voc_cold_v[0] == pytest.approx(voc.max() * (1 + margin / 100), rel=2e-4)
    assert points.cell_cold_c[0] == pytest.approx(cell[lit][voc.argmax()], abs=0.1)


def hourly_plane() -> PlaneYear:
    """Three hours, invented: dim and cold, bright and cool, brighter and hot."""
    return PlaneYear(np.array([50.0, 700.0, 1000.0]), np.array([-15.0, 5.0, 40.0]), np.ones(3), np.arange(3))


HOURLY = RuleSet("own", 1.25, 1.5, 2.4, cold_voltage="hourly", cold_margin_pct=3.0)


def test_hourly_needs_weather_and_says_so(small_catalog, tmp_path, ferrule):
    with pytest.raises(MatcherError, match="hourly weather"):
        fit([MODULE], [box()], Request(SITE, HOURLY))
    path = written(tmp_path, 'name = "own"\nbased_on = "iec-62548"\ncold_voltage = "hourly"\ncold_margin_pct = 3')
    asked = ("fit", "-m", "AF6K-270P", "-i", "QN-5000", "--low", "-12", "--high", "38", "--rules", path)
    ran = ferrule(*asked, "--lat", "52", "--lon", "4")
    assert ran.status == 2 and "weather file" in ran.err and ran.err.count("\n") == 1
    ran = ferrule(*asked, "--weather", DATA / "723170TYA.CSV", "--json", "--checks")
    assert ran.status == 0, ran.err
    document = json.loads(ran.out)
    assert document["rules"]["cold_voltage"] == "hourly" and document["rules"]["cold_margin_pct"] == 3.0
    assert all(o["climate"]["coldest_c"] is None for o in document["options"])
    page = tmp_path / "page.html"
    assert ferrule(*asked, "--weather", DATA / "723170TYA.CSV", "--out", page).status == 0
    assert "highest modelled Voc" in page.read_text(encoding="utf-8")
    screen = " ".join(ferrule(*asked, "--weather", DATA / "723170TYA.CSV").out.split())
    assert "highest modelled Voc" in screen and "3 %" in screen
    assert "no limit to" not in screen  # nothing says that it holds in any cold


def test_hourly_needs_no_coefficient_of_voc_where_the_model_is_on_record():
    """Thin film without a coefficient of Voc but with its six parameters: the model gives the voltage."""
    module = replace(cec_module(cec_rows()[3]), technology="CdTe", voc_coef_pct=None)
    points = design_points([module], SITE, HOURLY, hourly_plane())
    assert points.reasons == (None,)
    same = design_points([cec_module(cec_rows()[3])], SITE, HOURLY, hourly_plane())
    assert points.voc_cold_v == pytest.approx(same.voc_cold_v)


def test_hourly_without_a_model_says_what_is_missing():
    module = replace(MODULE, isc_coef_pct=None, vmp_coef_pct=-0.4)
    with pytest.raises(MatcherError, match="isc_coef_pct, not stated"):
        fit([module], [box()], Request(SITE, HOURLY), plane=hourly_plane())


def test_an_unknown_rule_set_is_refused():
    with pytest.raises(CatalogError, match="there is no such file"):
        read_rule_set("nowhere/none.toml")
