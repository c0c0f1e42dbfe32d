"""The report: what stands in the page, that its text is only text, and that it needs nothing from outside."""

from __future__ import annotations

import base64
import hashlib
import re
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pytest
from report_cases import (
    DUO,
    HOSTILE,
    HOSTILE_MAKER,
    HOSTILE_MODEL,
    MODULE,
    NARROW,
    NO_YEAR,
    SITE,
    SITE_YEAR,
    TABLED,
    listing,
    pair,
)

from catalog.records import Inputs
from cli import facts, fit_files, pages, pictures, report, series
from cli.cautions import CAUTIONS
from cli.drawing import spread
from cli.fit_screen import question, wiring
from matcher.checks import Tracker, check_option, verdict
from matcher.fit import Fit

VOID = {"meta", "link", "input", "br", "hr", "img"}


class Page(HTMLParser):
    """Elements of a page as (tag, attributes, text); refuses what is not nested properly."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.found: list[tuple[str, dict[str, str | None], list[str]]] = []
        self._open: list[int] = []
        self.feed(text)
        self.close()
        assert not self._open, "unclosed element"

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.found.append((tag, dict(attrs), []))
        if tag not in VOID:
            self._open.append(len(self.found) - 1)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.found.append((tag, dict(attrs), []))

    def handle_endtag(self, tag: str) -> None:
        assert self.found[self._open.pop()][0] == tag

    def handle_data(self, data: str) -> None:
        for k in self._open:
            self.found[k][2].append(data)

    def texts(self, tag: str, **wanted: str) -> list[str]:
        return [
            " ".join("".join(text).split())
            for name, attrs, text in self.found
            if name == tag and all(attrs.get(k.replace("_", "-")) == v for k, v in wanted.items())
        ]


def written(fit: Fit, folder: Path, *, why: bool = True) -> str:
    path = folder / "result.html"
    fit_files.write(fit, str(path), SITE_YEAR if fit.year is not None else NO_YEAR, with_checks=True, why=why)
    return path.read_text("utf-8")


def test_question_answer_options_reasons_and_cautions_are_there(tmp_path: Path) -> None:
    fit = listing()
    page = Page(written(fit, tmp_path))
    options = list(fit.options())
    assert page.texts("h1") == [question(fit)]
    assert page.texts("td", data_label="wiring") == [wiring(o) for o in options]
    assert page.texts("td", data_label="modules") == [str(o.modules) for o in options]
    assert page.texts("td", data_label="kWh a year") == [f"{o.yearly_kwh:,.0f}" for o in options]
    assert page.texts("code") == [c.check for c in options[0].checks]
    (text,) = page.texts("body")
    assert all(line in text for line in CAUTIONS)
    assert NARROW.name in text and "stopped by" in text


def test_each_check_has_words_of_its_own(tmp_path: Path) -> None:
    fits = (listing(), pair(inverter=replace(DUO, inputs=(replace(DUO.inputs[0], max_power_w=8000.0),))))
    checks = {c.check for fit in fits for o in fit.options(3) for c in o.checks} | {"voltage-cap"}
    assert checks == set(pages.CHECK_WORDS)


def test_verdicts_are_words(tmp_path: Path) -> None:
    page = Page(written(listing(), tmp_path))
    marks = page.texts("td", data_label="verdict")
    assert {m.split()[-1] for m in marks} == {"fits", "to-confirm"}


def test_values_to_confirm_are_named_and_never_rounded_down(tmp_path: Path) -> None:
    fit = listing(inverters=(TABLED,))
    page = Page(written(fit, tmp_path))
    (option,) = fit.options()
    (need,) = [c.at_least for c in option.confirm]
    (line,) = [t for t in page.texts("strong") if "of at least" in t]
    named = float(re.search(r"at least ([\d.]+) A", line)[1])  # type: ignore[index]
    assert need <= named < need + 0.1
    assert page.texts("td", data_label="to confirm") == [f"inverter: Isc of a tracker ≥ {named:.1f} A"]


def test_hostile_names_stay_text(tmp_path: Path) -> None:
    module = replace(MODULE, maker=HOSTILE_MAKER, model=HOSTILE_MODEL)
    hostile_site = replace(SITE, name="</title><script>alert(2)</script>")
    for fit in (
        listing(),
        pair(HOSTILE, module),
        listing(inverters=(HOSTILE, replace(NARROW, maker=HOSTILE_MAKER))),
    ):
        fit.request = replace(fit.request, site=hostile_site)
        page = Page(written(fit, tmp_path))
        tags = [tag for tag, _, _ in page.found]
        assert tags.count("script") == 1 and "img" not in tags
        assert not [a for _, attrs, _ in page.found for a in attrs if a.startswith("on")]
        (text,) = page.texts("body")
        assert HOSTILE_MAKER in text
        assert hostile_site.name in page.texts("h1")[0]


def test_nothing_is_asked_from_outside(tmp_path: Path) -> None:
    text = written(listing(inverters=(DUO, TABLED, NARROW)), tmp_path)
    page = Page(text)
    for _, attrs, _ in page.found:
        for name in ("src", "href", "xlink:href", "action", "poster", "data", "srcset"):
            assert (attrs.get(name) or "#").startswith(("#", "data:,"))
    (style,) = (t for tag, attrs, t in page.found if tag == "style" and "type" not in attrs)
    assert "url(" not in "".join(style) and "@import" not in "".join(style)
    # The names of the two XML vocabularies are no requests.
    names = {"http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"}
    assert set(re.findall(r"https?://[^\s\"'<>]+", text)) <= names


def test_only_the_script_of_the_page_itself_is_allowed(tmp_path: Path) -> None:
    text = written(listing(), tmp_path)
    script = re.search(r"<script>(.*?)</script>", text, re.DOTALL)[1]  # type: ignore[index]
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    policy = re.search(r'Content-Security-Policy" content="([^"]+)"', text)[1].replace("&#39;", "'")  # type: ignore[index]
    assert f"script-src 'sha256-{digest}';" in policy and policy.startswith("default-src 'none'")


def test_pictures_have_words_and_names_that_are_unique(tmp_path: Path) -> None:
    page = Page(written(pair(), tmp_path))
    pictures = [attrs for tag, attrs, _ in page.found if tag == "svg"]
    assert len(pictures) == 3
    ids = [attrs["id"] for _, attrs, _ in page.found if attrs.get("id")]
    assert len(ids) == len(set(ids))
    words = {
        attrs["id"]: "".join(t) for tag, attrs, t in page.found if tag in ("title", "desc") and "id" in attrs
    }
    for attrs in pictures:
        assert attrs["role"] == "img"
        title, desc = str(attrs["aria-labelledby"]).split()
        assert words[title] and len(words[desc]) > 60
    used = {
        u
        for _, attrs, _ in page.found
        for v in attrs.values()
        for u in re.findall(r"url\(#([^)]+)\)", v or "")
    }
    used |= {str(attrs["xlink:href"])[1:] for _, attrs, _ in page.found if "xlink:href" in attrs}
    assert used <= set(ids)


def test_without_a_year_the_page_says_why_there_is_no_energy(tmp_path: Path) -> None:
    page = Page(written(listing(year=False), tmp_path))
    assert len([tag for tag, _, _ in page.found if tag == "svg"]) == 2
    assert f"No picture of energy and clipping: {NO_YEAR.why_not}." in page.texts("p")
    assert page.texts("td", data_label="kWh a year") == []


def test_more_options_than_a_browser_sorts_are_cut_and_said(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(report, "ROWS", 4)
    fit = pair()
    page = Page(written(fit, tmp_path))
    assert len(page.texts("td", data_label="wiring")) == 4
    assert page.texts("p", id="shown")[0].startswith(f"The first 4 of {fit.totals.arrangements} options;")


def test_nothing_fits_is_a_page_with_the_reason(tmp_path: Path) -> None:
    page = Page(written(pair(NARROW), tmp_path, why=False))
    assert "Nothing fits." in page.texts("p")
    assert len([tag for tag, _, _ in page.found if tag == "svg"]) == 1
    assert page.texts("td", data_label="nearest")


def test_the_same_result_gives_the_same_page(tmp_path: Path) -> None:
    assert written(pair(), tmp_path) == written(pair(), tmp_path)


def test_several_units_are_shown(tmp_path: Path) -> None:
    page = Page(written(pair(counts=(70, 75), units=(2, 2)), tmp_path))
    assert set(page.texts("td", data_label="units")) == {"2"}
    assert len([tag for tag, _, _ in page.found if tag == "svg"]) == 3


@pytest.mark.parametrize(
    "inverter", [TABLED, replace(TABLED, max_dc_voltage_v=500.0, max_array_power_w=6000.0)]
)
def test_the_grid_agrees_with_the_checks(inverter: object) -> None:
    fit = pair(inverter)  # type: ignore[arg-type]
    (option,) = fit.options(1)
    grid = series.wiring_grid(fit, 0, 0, option)
    seen = set()
    for n, row in zip(grid.lengths, grid.cells, strict=True):
        for s, cell in zip(grid.strings, row, strict=True):
            outcome = str(verdict(check_option(fit.pair(0, 0), [Tracker(0, s, n)])))
            ratio = s * n * MODULE.pmax_w / 5000.0
            expected = "no" if outcome == "does-not-fit" else outcome if 0.8 <= ratio <= 1.5 else "ratio"
            assert cell == expected, (n, s)
            seen.add(cell)
    assert seen == {"no", "ratio", "to-confirm"}
    assert grid.chosen is not None
    column, line = grid.chosen
    assert f"{grid.strings[column]}x{grid.lengths[line]}" == option.label


@pytest.mark.parametrize("groups", [DUO.inputs, (DUO.inputs[0], replace(DUO.inputs[1], max_isc_a=None))])
def test_the_grid_agrees_with_hosting_the_strings(groups: tuple[Inputs, ...]) -> None:
    inverter = replace(DUO, inputs=groups)
    grid = series.wiring_grid(pair(inverter), 0, 0, None)
    seen = set()
    for n, row in zip(grid.lengths, grid.cells, strict=True):
        for s, cell in zip(grid.strings, row, strict=True):
            hosted = pair(inverter, strings=((n, s),), ratio=(1e-6, 1e6))
            found = [str(o.verdict) for o in hosted.options(1)]
            ratio = s * n * MODULE.pmax_w / DUO.ac_power_w
            assert cell == ("no" if not found else found[0] if 0.8 <= ratio <= 1.5 else "ratio"), (n, s)
            seen.add(cell)
    assert seen >= {"no", "ratio", "fits"}


def test_the_climate_picture_meets_limit_and_window() -> None:
    fit = pair(TABLED)
    (option,) = fit.options(1)
    s = series.string_in_climate(fit, option)
    # By the datasheet's coefficients alone: Voc at the air's temperature, Vmp 33.75 K above it
    # (NOCT 45 degC, gap of the roof 2 K: (45 + 2 - 20) / 800 * 1000).
    voc = s.longest * 38.2 * (1 - 0.31 / 100 * (s.ambient_c - 25))
    vmp = s.shortest * 31.1 * (1 - 0.42 / 100 * (s.ambient_c + 33.75 - 25))
    assert s.voc_v == pytest.approx(voc)
    assert s.vmp_v == pytest.approx(vmp)
    assert option.hottest_c is not None
    assert np.interp(option.hottest_c, s.ambient_c, s.vmp_v) == pytest.approx(TABLED.mppt_low_v, abs=0.05)
    assert {"MPPT window, top", "MPPT window, bottom", "module system voltage"} == {
        lim.name for lim in s.limits
    }


def test_the_picture_rounds_the_climate_window_to_the_safe_side() -> None:
    fit = pair(TABLED)
    (option,) = fit.options(1)
    option = replace(option, confirm=(), coldest_c=-3.9, hottest_c=46.709)
    drawn = pictures.draw_climate(series.string_in_climate(fit, option)).svg
    assert "holds from −3 °C" in drawn and "holds up to 46 °C" in drawn
    assert facts.climate_words(option, -12, 36) == "-3 to 46 °C"


def test_a_voltage_to_confirm_is_drawn_as_one() -> None:
    fit = pair(replace(TABLED, mppt_high_v=450.0), counts=(14, 14), ratio=(0.7, 1.5))
    (option,) = (o for o in fit.options() if o.label == "1x14")
    assert facts.holds_from(option) is None
    assert facts.climate_words(option, -12, 36) == "-12 °C or warmer, once confirmed"
    (limit,) = (lim for lim in series.string_in_climate(fit, option).limits if not lim.recorded)
    assert limit.name == "confirm max DC voltage"
    assert 14 * 38.2 * (1 + 0.31 / 100 * 37) <= limit.volts < 14 * 38.2 * (1 + 0.31 / 100 * 37) + 0.1


@pytest.mark.parametrize(
    ("coldest", "hottest", "words"),
    [
        (-17.4, 58.2, "-17 to 58 °C"),
        (-17.4, None, "-17 °C or warmer"),
        (-120.0, 58.2, "58 °C or cooler"),
        (None, None, "any temperature"),
    ],
)
def test_the_climate_in_words(coldest: float | None, hottest: float | None, words: str) -> None:
    option = replace(next(pair().options()), confirm=(), coldest_c=coldest, hottest_c=hottest)
    assert facts.climate_words(option, -12, 36) == words


def test_energy_by_count_is_that_of_the_options() -> None:
    fit = pair(TABLED)
    options = list(fit.options())
    found = series.energy_by_count(fit, options[0])
    assert found is not None
    assert found.counts == tuple(sorted({o.modules for o in options}))
    for count, kwh, clipped in zip(found.counts, found.yearly_kwh, found.clipping_pct, strict=True):
        first = next(o for o in options if o.modules == count)
        assert (kwh, clipped) == pytest.approx((first.yearly_kwh, first.clipping_loss_pct))
    assert found.chosen == options[0].modules


def test_labels_are_moved_apart_and_stay_in_order() -> None:
    assert spread([1, 5, 9], 2, 0, 10) == [1, 5, 9]
    placed = spread([5, 5, 5.5, 9.9, 10], 1, 0, 10)
    assert all(b - a >= 1 - 1e-9 for a, b in zip(placed, placed[1:], strict=False))
    assert placed[-1] <= 10 and placed[0] >= 0


def test_units_stay_with_their_numbers() -> None:
    assert pages.typeset("at -12 °C, AF-270 of 5 V") == "at \u221212\u00a0°C, AF-270 of 5\u00a0V"
