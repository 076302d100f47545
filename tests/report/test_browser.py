"""The page in a real browser: no error, no request, figures drawn, links that work, a printed list of inspections."""

from __future__ import annotations

import base64
import json
import os
import re
import shutil
import subprocess
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from exceed.report.page import render_page
from exceed.report.summary import summarise
from report import examples

webdriver = pytest.importorskip("selenium.webdriver", reason="selenium is not installed")
BROWSER = shutil.which("chromium") or shutil.which("google-chrome") or shutil.which("chromium-browser")
DRIVER = shutil.which("chromedriver")
pytestmark = [
    pytest.mark.skipif(BROWSER is None or DRIVER is None, reason="no Chromium and chromedriver on this machine"),
    # selenium leaves its service's sockets to the garbage collector
    pytest.mark.filterwarnings("ignore::ResourceWarning"),
    pytest.mark.filterwarnings("ignore::pytest.PytestUnraisableExceptionWarning"),
]


@pytest.fixture(scope="module")
def address(tmp_path_factory: pytest.TempPathFactory) -> str:
    day = examples.day()
    path = tmp_path_factory.mktemp("page") / "day.html"
    path.write_text(render_page(summarise(day), [log.plots for log in day.logs if log.plots is not None]), "utf-8")
    return path.as_uri()


@pytest.fixture(scope="module")
def browser() -> Iterator[Any]:
    options = webdriver.ChromeOptions()
    options.binary_location = BROWSER
    for argument in ("--headless=new", "--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage"):
        options.add_argument(argument)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    driver = webdriver.Chrome(options=options, service=webdriver.ChromeService(DRIVER))
    yield driver
    driver.quit()


def show(browser: Any, address: str, width: int, *, dark: bool = False) -> None:
    metrics = {"width": width, "height": 900, "deviceScaleFactor": 1, "mobile": width < 500}
    browser.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
    scheme = {"name": "prefers-color-scheme", "value": "dark" if dark else "light"}
    browser.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": [scheme]})
    browser.get_log("browser")
    browser.get_log("performance")
    browser.get(address)


def plots(browser: Any) -> list[Any]:
    return list(browser.find_elements("css selector", ".plot"))


def draw_all(browser: Any) -> None:
    browser.execute_script("document.querySelectorAll('details').forEach(d => { d.open = true; })")
    for place in plots(browser):
        browser.execute_script("arguments[0].scrollIntoView()", place)
        until(lambda place=place: place.find_elements("css selector", ".main-svg"))


def until(true: Any) -> None:
    for _ in range(200):
        if true():
            return
        time.sleep(0.05)  # a browser draws when it will; there is nothing to wait on
    raise AssertionError("the browser did not get there within ten seconds")


@pytest.mark.parametrize(("width", "dark"), [(1280, False), (390, False), (1280, True)])
def test_the_page_draws_everything_without_an_error_or_a_request(
    browser: Any, address: str, width: int, dark: bool
) -> None:
    show(browser, address, width, dark=dark)
    assert len(plots(browser)) == 9  # seven cards with samples, a V-n diagram, a spectrum
    draw_all(browser)
    assert all(place.find_elements("css selector", ".trace, .hm") for place in plots(browser))
    assert browser.get_log("browser") == []
    asked = [
        message["params"]["request"]["url"]
        for entry in browser.get_log("performance")
        if (message := json.loads(entry["message"])["message"])["method"] == "Network.requestWillBeSent"
    ]
    assert [url for url in asked if url != address and not url.startswith("data:")] == []


@pytest.mark.parametrize("width", [1280, 390])
def test_the_page_does_not_scroll_sideways(browser: Any, address: str, width: int) -> None:
    show(browser, address, width)
    draw_all(browser)
    assert browser.execute_script("return document.documentElement.scrollWidth") <= width


def test_figures_are_drawn_only_when_they_come_into_sight(browser: Any, address: str) -> None:
    show(browser, address, 1280)
    assert browser.find_elements("css selector", ".plot .main-svg") == []
    browser.execute_script("document.querySelector('#envelope').scrollIntoView()")
    until(lambda: browser.find_elements("css selector", "#envelope .main-svg"))


def test_a_link_of_the_table_leads_to_the_card(browser: Any, address: str) -> None:
    show(browser, address, 1280)
    link = browser.find_element("css selector", "table.events a")
    link.click()
    target = browser.find_element("css selector", ".card:target")
    assert link.get_attribute("href").endswith("#" + target.get_attribute("id"))


def test_the_keyboard_reaches_the_content_and_opens_what_is_folded(browser: Any, address: str) -> None:
    from selenium.webdriver.common.keys import Keys

    show(browser, address, 1280)
    body = browser.find_element("tag name", "body")
    body.send_keys(Keys.TAB)
    assert browser.switch_to.active_element.get_attribute("class") == "skip"
    browser.switch_to.active_element.send_keys(Keys.ENTER)
    assert browser.switch_to.active_element.get_attribute("id") == "main"
    fold = browser.find_element("css selector", ".card summary")
    fold.send_keys(Keys.ENTER)
    until(lambda: browser.find_elements("css selector", ".card details[open] .main-svg"))


def test_hostile_text_runs_nothing(browser: Any, address: str) -> None:
    show(browser, address, 1280)
    assert browser.execute_script("return document.scripts.length") == 3
    assert "<script>alert('x')</script>" in browser.find_element("tag name", "body").text


@pytest.mark.skipif(shutil.which("pdftotext") is None, reason="no pdftotext to read the print with")
def test_each_inspection_is_printed_on_one_sheet_of_its_own(browser: Any, address: str, tmp_path: Path) -> None:
    show(browser, address, 1280, dark=True)
    printed = browser.execute_cdp_cmd("Page.printToPDF", {"preferCSSPageSize": True})
    (tmp_path / "day.pdf").write_bytes(base64.b64decode(printed["data"]))
    command = ["pdftotext", "-layout", str(tmp_path / "day.pdf"), "-"]
    pages = subprocess.run(command, capture_output=True, text=True, check=True).stdout.split("\f")
    sheets = [page for page in pages if re.search(r"^\s*Inspection request:", page, re.M)]
    assert len(sheets) == 3
    for page in sheets:
        assert len(re.findall("Inspection request:", page)) == 1
        assert "Release reference" in page
        assert "peak estimated" in page
    size = subprocess.run(["pdfinfo", str(tmp_path / "day.pdf")], capture_output=True, text=True, check=True).stdout
    assert "A4" in size


def axe_core() -> Path | None:
    """axe-core's script: where AXE_CORE says, in node_modules of the working folder, or among npm's global packages."""
    places = [Path(os.environ["AXE_CORE"])] if os.environ.get("AXE_CORE") else []
    places.append(Path("node_modules/axe-core/axe.min.js"))
    if shutil.which("npm"):
        root = subprocess.run(["npm", "root", "-g"], capture_output=True, text=True, check=False).stdout.strip()
        places.append(Path(root) / "axe-core" / "axe.min.js")
    return next((place for place in places if place.is_file()), None)


@pytest.mark.parametrize(("width", "dark"), [(1280, False), (390, False), (1280, True)])
def test_axe_finds_no_violation_of_wcag_aa(browser: Any, address: str, width: int, dark: bool) -> None:
    script = axe_core()
    if script is None:
        pytest.skip("axe-core is not installed (npm install axe-core)")
    show(browser, address, width, dark=dark)
    draw_all(browser)
    browser.execute_script(script.read_text(encoding="utf-8"))
    found = browser.execute_async_script(
        "const done = arguments[arguments.length - 1];"
        "axe.run(document, {runOnly: ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'best-practice']})"
        ".then(r => done(r.violations.map(v => [v.id, v.nodes.slice(0, 3).map(n => n.html.slice(0, 160))])));"
    )
    assert found == []
