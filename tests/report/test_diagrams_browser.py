"""The pages of `exceed envelope` and `exceed spectrum` in a real browser: drawn, without an error or a request."""

from __future__ import annotations

import json
import shutil
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from exceed.documents.aircraft import load_aircraft
from exceed.envelopes import envelope_of
from exceed.report.envelope import envelope_page, envelope_summary
from exceed.report.spectrum import spectrum_page, spectrum_summary
from exceed.settings import Settings
from exceed.spectra import spectrum

webdriver = pytest.importorskip("selenium.webdriver", reason="selenium is not installed")
BROWSER = shutil.which("chromium") or shutil.which("google-chrome") or shutil.which("chromium-browser")
DRIVER = shutil.which("chromedriver")
pytestmark = [
    pytest.mark.skipif(BROWSER is None or DRIVER is None, reason="no Chromium and chromedriver on this machine"),
    # selenium leaves its service's sockets to the garbage collector
    pytest.mark.filterwarnings("ignore::ResourceWarning"),
    pytest.mark.filterwarnings("ignore::pytest.PytestUnraisableExceptionWarning"),
]
SAMPLES = Path(__file__).parent.parent.parent / "sample_logs"


@pytest.fixture(scope="module")
def pages(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    folder = tmp_path_factory.mktemp("pages")
    diagram = envelope_of(load_aircraft(SAMPLES / "aircraft" / "larkspur.yaml"))
    counted = spectrum(Settings((str(SAMPLES / "zz-nma"),), fleet=str(SAMPLES / "fleet.yaml")))
    (folder / "envelope.html").write_text(envelope_page(envelope_summary(diagram), diagram), "utf-8")
    (folder / "spectrum.html").write_text(spectrum_page(spectrum_summary(counted), counted), "utf-8")
    return {name: (folder / f"{name}.html").as_uri() for name in ("envelope", "spectrum")}


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


@pytest.mark.parametrize("width", [1280, 390])
@pytest.mark.parametrize(("name", "figures"), [("envelope", 1), ("spectrum", 2)])
def test_a_page_draws_its_figures(browser: Any, pages: dict[str, str], name: str, figures: int, width: int) -> None:
    metrics = {"width": width, "height": 900, "deviceScaleFactor": 1, "mobile": width < 500}
    browser.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
    browser.get_log("performance")
    browser.get(pages[name])
    places = browser.find_elements("css selector", ".plot")
    assert len(places) == figures
    for place in places:
        browser.execute_script("arguments[0].scrollIntoView()", place)
        until(lambda place=place: place.find_elements("css selector", ".trace"))
    assert browser.get_log("browser") == []
    # the page itself does not scroll sideways
    assert browser.execute_script("return document.documentElement.scrollWidth") <= width
    asked = [json.loads(entry["message"])["message"] for entry in browser.get_log("performance")]
    urls = {row["params"]["request"]["url"] for row in asked if row["method"] == "Network.requestWillBeSent"}
    assert not [url for url in urls if url != pages[name] and not url.startswith(("data:", "blob:"))]


def until(true: Any) -> None:
    for _ in range(200):
        if true():
            return
        time.sleep(0.05)  # a browser draws when it will; there is nothing to wait on
    raise AssertionError("the browser did not get there within ten seconds")
