"""The report in a real browser without network: errors, requests, sorting, text alternatives, widths."""

from __future__ import annotations

import json
import shutil
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from report_cases import DUO, HOSTILE, NARROW, SITE_YEAR, TABLED, listing

from cli import fit_files

webdriver = pytest.importorskip("selenium.webdriver", reason="selenium is not installed")

CHROMIUM, DRIVER = shutil.which("chromium"), shutil.which("chromedriver")
pytestmark = pytest.mark.skipif(
    CHROMIUM is None or DRIVER is None, reason="Debian's chromium and chromium-driver are not installed"
)

FLAGS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--window-size=1200,900",
)

# AC powers [W] of inverters that are otherwise alike.
SIZES = (2500.0, 3100.0, 3900.0, 4600.0, 7000.0, 12000.0)


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Any]:
    from selenium.webdriver.chrome.service import Service

    options = webdriver.ChromeOptions()
    options.binary_location = CHROMIUM
    for flag in FLAGS:
        options.add_argument(flag)
    options.add_argument(f"--user-data-dir={tmp_path_factory.mktemp('profile')}")
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    driver = webdriver.Chrome(options=options, service=Service(DRIVER))
    yield driver
    driver.quit()


@pytest.fixture(scope="module")
def report(tmp_path_factory: pytest.TempPathFactory) -> str:
    """Address of a report with nine options, one of them with names that would do harm."""
    more = [replace(TABLED, id=10 + k, model=f"WT {w / 1000:.1f}", ac_power_w=w) for k, w in enumerate(SIZES)]
    path = tmp_path_factory.mktemp("report") / "result.html"
    fit = listing(inverters=(DUO, TABLED, HOSTILE, NARROW, *more))
    fit_files.write(fit, str(path), SITE_YEAR, with_checks=True, why=True)
    return Path(path).as_uri()


@pytest.fixture
def page(browser: Any, report: str) -> Iterator[Any]:
    browser.get_log("performance")
    browser.get(report)
    yield browser
    browser.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})
    browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": ""})
    browser.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": False})


def column(page: Any, name: str) -> list[str]:
    """Texts of a column of the rows that are shown, in the order shown."""
    cells = f'#table tbody tr:not([hidden]) td[data-label="{name}"]'
    return page.execute_script(
        f"return Array.from(document.querySelectorAll({cells!r}), c => c.innerText.trim())"
    )


def click_head(page: Any, name: str) -> None:
    for button in page.find_elements("css selector", "#table thead button"):
        if button.text == name:
            button.click()
            return
    raise AssertionError(f"no column {name}")


def choose(page: Any, field: str, text: str) -> None:
    from selenium.webdriver.support.select import Select

    Select(page.find_element("id", field)).select_by_visible_text(text)


def numbers(texts: list[str]) -> list[float]:
    return [float(t.replace(",", "")) for t in texts]


def test_no_console_error_and_no_request_but_the_file_itself(page: Any, report: str) -> None:
    assert page.get_log("browser") == []
    messages = [json.loads(entry["message"])["message"] for entry in page.get_log("performance")]
    asked = {m["params"]["request"]["url"] for m in messages if m["method"] == "Network.requestWillBeSent"}
    assert {url for url in asked if not url.startswith("data:")} == {report}
    assert page.execute_script("return document.images.length") == 0


def test_the_table_sorts_by_number_and_by_word_both_ways(page: Any) -> None:
    ranks = column(page, "#")
    assert ranks == [str(k + 1) for k in range(len(ranks))] and len(ranks) >= 8
    click_head(page, "kWh a year")
    energy = numbers(column(page, "kWh a year"))
    assert energy == sorted(energy) and len(set(energy)) > 4
    click_head(page, "kWh a year")
    assert numbers(column(page, "kWh a year")) == sorted(energy, reverse=True)
    head = page.find_element("css selector", '#table th[aria-sort="descending"]')
    assert head.text.startswith("kWh a year")
    click_head(page, "inverter")
    names = [n for n in column(page, "inverter") if n.startswith("Wold")]
    assert names == sorted(names, key=lambda n: float(n.split()[4])) and len(names) >= 6
    choose(page, "sort", "#")
    assert column(page, "#") == ranks


def test_the_table_filters_by_word_and_by_verdict(page: Any) -> None:
    everything = column(page, "#")
    find = page.find_element("id", "find")
    find.send_keys("tarn 5.0")
    assert column(page, "inverter") == [TABLED.name]
    assert page.find_element("id", "shown").text == f"1 of {len(everything)} options match."
    find.clear()
    find.send_keys(" ")
    assert column(page, "#") == everything
    choose(page, "verdict", "fits")
    assert column(page, "inverter") == [DUO.name]
    find.send_keys("tarn")
    assert column(page, "inverter") == []
    find.clear()
    choose(page, "verdict", "any")
    assert column(page, "#") == everything


def test_pictures_have_names_and_descriptions_for_those_who_do_not_see_them(page: Any) -> None:
    tree = page.execute_cdp_cmd("Accessibility.getFullAXTree", {})["nodes"]
    names = [
        n["name"]["value"]
        for n in tree
        if n.get("role", {}).get("value") in ("img", "image") and not n["ignored"]
    ]
    assert len(names) == 3
    assert all(len(name) > 60 for name in names)


@pytest.mark.parametrize("width", [390, 768, 1200])
def test_the_page_is_no_wider_than_the_screen(page: Any, width: int) -> None:
    metrics = {"width": width, "height": 844, "deviceScaleFactor": 1, "mobile": width < 500}
    page.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
    assert page.execute_script("return document.documentElement.scrollWidth") <= width
    sizes = page.execute_script(
        "return Array.from(document.querySelectorAll('p, li, td, svg text'), e => e.matches('svg text')"
        " ? parseFloat(getComputedStyle(e).fontSize) * e.ownerSVGElement.getScreenCTM().a"
        " : parseFloat(getComputedStyle(e).fontSize))"
    )
    assert min(sizes) >= 8.0


def test_it_works_without_script(browser: Any, report: str) -> None:
    browser.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": True})
    try:
        browser.get(report)
        assert not browser.find_element("css selector", ".controls").is_displayed()
        rows = browser.find_elements("css selector", "#table tbody tr")
        assert len(rows) >= 8 and all(r.is_displayed() for r in rows)
    finally:
        browser.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": False})


@pytest.fixture(scope="module")
def bundles(tmp_path_factory: pytest.TempPathFactory) -> str:
    """Address of a page with vetted bundles, one of an inverter whose name would do harm."""
    from report_cases import MODULE, SITE

    from cli.bundle_lists import BundleRow
    from cli.vet_lists import Line, VettedList
    from cli.vet_report import write_list
    from matcher.rules import DEFAULT_RULES
    from matcher.vet import Bundle, Vetter

    vetter = Vetter((DUO, TABLED, HOSTILE))
    lines = []
    for number, (inverter, count) in enumerate([(0, 20), (0, 400), (1, 20), (2, 16)], 2):
        vetted = vetter.vet(Bundle(MODULE, inverter, count), SITE)
        row = BundleRow(number, f"A-{number}", MODULE.name, str(count), vetted.inverter.name, "1", "", "")
        lines.append(Line(row, vetted.verdict, vetted))
    lines.append(Line(BundleRow(9, "A-9", "?", "1", "?", "1", "", ""), "no-verdict", reason="no module is named"))
    path = tmp_path_factory.mktemp("bundles") / "list.html"
    with path.open("w", encoding="utf-8") as stream:
        write_list(VettedList(lines, {}), DEFAULT_RULES, "bundles.csv", stream)
    return path.as_uri()


def test_a_list_of_bundles_sorts_and_filters_and_fits_phone_and_paper(browser: Any, bundles: str) -> None:
    browser.get_log("browser")
    browser.get(bundles)
    assert browser.get_log("browser") == []
    assert column(browser, "row") == ["2", "3", "4", "5", "9"]
    choose(browser, "verdict", "does-not-fit")
    assert column(browser, "article") == ["A-3"]
    assert browser.find_element("id", "shown").text == "1 of 5 bundles match."
    choose(browser, "verdict", "any")
    choose(browser, "direction", "falling")
    assert column(browser, "row") == ["9", "5", "4", "3", "2"]
    for width, media in ((390, ""), (1200, ""), (688, "print")):
        metrics = {"width": width, "height": 844, "deviceScaleFactor": 1, "mobile": width < 500}
        browser.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
        browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": media})
        assert browser.execute_script("return document.documentElement.scrollWidth") <= width
    browser.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})
    browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": ""})


# Paper sizes in inches: ISO 216 A4 and ANSI letter; margins as in the style sheet, 14 mm left and right.
def test_a_long_table_is_printed_as_far_as_is_said(page: Any) -> None:
    page.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": "print"})
    printed = """
        const rows = Array.from(document.querySelectorAll('#table tbody tr'));
        rows.slice(1).forEach(row => { for (let k = 0; k < 20; k++) row.after(row.cloneNode(true)); });
        const all = Array.from(document.querySelectorAll('#table tbody tr'));
        return all.filter(r => r.offsetHeight > 0).length"""
    assert page.execute_script(printed) == 100


@pytest.mark.parametrize(("paper", "width", "height"), [("A4", 8.27, 11.69), ("letter", 8.5, 11.0)])
def test_nothing_is_cut_off_in_print(page: Any, paper: str, width: float, height: float) -> None:
    printed = page.execute_cdp_cmd("Page.printToPDF", {"paperWidth": width, "paperHeight": height})["data"]
    assert len(printed) > 10_000
    pixels = int((width - 28 / 25.4) * 96)
    metrics = {"width": pixels, "height": 1000, "deviceScaleFactor": 1, "mobile": False}
    page.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
    page.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": "print"})
    assert not page.find_element("css selector", ".controls").is_displayed()
    assert page.execute_script("return document.documentElement.scrollWidth") <= pixels
