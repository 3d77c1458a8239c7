"""Pages in a real browser, headless; left out, and said so, where there is none."""

import json
import shutil
from pathlib import Path

import pytest

from wavegen.reports.pages.page import html_of

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")
DRIVER = shutil.which("chromedriver")

pytestmark = pytest.mark.skipif(
    CHROMIUM is None or DRIVER is None, reason="no Chromium with its driver on PATH: left out"
)
A4_PRINTED_MM = (180, 265)
PIXELS_A_MM = 96 / 25.4


@pytest.fixture(scope="module")
def browser(tmp_path_factory):
    from selenium.webdriver import Chrome, ChromeOptions, ChromeService

    options = ChromeOptions()
    options.binary_location = CHROMIUM
    profile = tmp_path_factory.mktemp("profile")
    for argument in (
        "--headless",
        "--no-sandbox",
        "--disable-gpu",
        "--disable-quic",
        "--no-first-run",
        "--disable-background-networking",
        "--disable-component-update",
        "--disable-sync",
        "--window-size=1100,900",
        f"--user-data-dir={profile}",
    ):
        options.add_argument(argument)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    driver = Chrome(options=options, service=ChromeService(DRIVER))
    yield driver
    driver.quit()


@pytest.fixture
def opened(browser, hostile_page, tmp_path: Path):
    path = tmp_path / "report.html"
    path.write_text(html_of(hostile_page), encoding="utf-8")
    browser.get_log("performance")
    browser.get(path.as_uri())
    return browser


def test_loads_alone_and_without_complaint(opened):
    assert opened.get_log("browser") == []
    asked = [
        message["params"]["request"]["url"]
        for entry in opened.get_log("performance")
        for message in [json.loads(entry["message"])["message"]]
        if message["method"] == "Network.requestWillBeSent"
    ]
    assert len(asked) == 1
    assert asked[0].startswith("file:")
    assert opened.title.startswith("<script>")  # the title as it was given, not what it wanted


def test_pointing_reads_values(opened):
    from selenium.webdriver import ActionChains

    drawing = opened.find_element("css selector", "#picture-ccdf .drawing")
    opened.execute_script("arguments[0].scrollIntoView({block: 'center'})", drawing)
    output = opened.find_element("css selector", "#picture-ccdf output")
    before = output.text
    ActionChains(opened).move_to_element_with_offset(drawing, 40, 0).perform()
    said = output.text
    assert said != before
    assert " dB: loop " in said
    level = float(said.split("at ")[1].split(" dB")[0])
    share = float(said.split(": loop ")[1].split(" %")[0])
    import math

    assert share == pytest.approx(100 * math.exp(-(10 ** (level / 10))), rel=0.02)


def test_keys_reach_it_and_move_the_cursor(opened):
    from selenium.webdriver import Keys

    drawing = opened.find_element("css selector", "#picture-density .drawing")
    output = opened.find_element("css selector", "#picture-density output")
    drawing.send_keys(Keys.ARROW_RIGHT)
    first = output.text
    drawing.send_keys(Keys.ARROW_RIGHT)
    assert output.text != first
    drawing.send_keys(Keys.ARROW_LEFT)
    assert output.text == first


def test_every_drawing_has_words(opened):
    drawings = opened.find_elements("css selector", ".drawing")
    assert len(drawings) == 3
    for drawing in drawings:
        assert drawing.get_attribute("role") == "img"
        assert drawing.get_attribute("aria-label")
        assert drawing.get_attribute("tabindex") == "0"


def test_printed_figures_fit_a_page_and_are_not_cut(opened):
    opened.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": "print"})
    width, height = (round(side * PIXELS_A_MM) for side in A4_PRINTED_MM)
    opened.execute_cdp_cmd(
        "Emulation.setDeviceMetricsOverride",
        {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": False},
    )
    try:
        for figure in opened.find_elements("css selector", "figure"):
            assert figure.size["height"] <= height
            assert figure.size["width"] <= width
            assert figure.value_of_css_property("break-inside") == "avoid"
        overflow = opened.execute_script(
            "return document.documentElement.scrollWidth - document.documentElement.clientWidth"
        )
        assert overflow <= 0
        assert not opened.find_element("css selector", "output").is_displayed()
    finally:
        opened.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})
        opened.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": ""})


def test_dark_and_light_differ(opened):
    colours = []
    for scheme in ("light", "dark"):
        opened.execute_cdp_cmd(
            "Emulation.setEmulatedMedia",
            {"features": [{"name": "prefers-color-scheme", "value": scheme}]},
        )
        body = opened.find_element("css selector", "body")
        colours.append(body.value_of_css_property("background-color"))
    opened.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": []})
    assert colours[0] != colours[1]
