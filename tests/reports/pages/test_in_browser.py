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


HOSTILE_TITLE = (
    '<script>document.title="broken"</script><img src=x onerror=alert(1)> & "q" {{ 7 * 7 }} $x^{2'
)
"""Recipes take one line of 120 characters, and no marks that turn it."""
HOSTILE_FILE = "a\"b' <img src=x onerror=alert(1)>&\u202eturned\nlines " + "n" * 120 + ".cf32"


def page_of_a_file(folder: Path) -> Path:
    """Measure a file whose name is hostile, as the command line does."""
    import numpy as np

    from wavegen.cli.main import run

    path, page = folder / HOSTILE_FILE, folder / "measured.html"
    rng = np.random.default_rng(1)
    noise = rng.standard_normal((20_000, 2)).astype("<f4") / 8
    path.write_bytes(noise.tobytes())
    options = ["--format", "cf32_le", "--sample-rate", "1MHz", "--report", str(page)]
    assert run(["measure", str(path), *options]) == 0
    return page


def page_of_a_recipe(folder: Path) -> Path:
    """Make a stimulus whose title is hostile."""
    from wavegen.production.make import make
    from wavegen.recipe.load import load_text
    from wavegen.reports.stimulus_reports import Wanted, write_stimulus_reports

    title = json.dumps(HOSTILE_TITLE)
    text = f"""\
wavegen: 1
title: {title}
sample_rate: 1 MHz
duration: 4096 samples
signal: {{kind: noise, bandwidth: 200 kHz}}
bench:
  average_power_at_device: -30 dBm
  path: [{{name: "<b onclick=alert(3)>", role: device, peak_limit: 10 dBm}}]
"""
    made = make(load_text(text, name="x"), out=folder)
    write_stimulus_reports(made, Wanted(report=True, sheet=True))
    return made.folder / "x.report.html"


def test_marks_that_turn_text_are_spelt_out(opened):
    body = opened.find_element("css selector", "body").text
    assert r"\u202eturned\u202c" in body
    assert r"\x07" in body
    assert "\u202e" not in opened.page_source


@pytest.mark.parametrize("make_page", [page_of_a_file, page_of_a_recipe])
def test_hostile_names_stay_inert(browser, tmp_path, make_page):
    page = make_page(tmp_path)
    browser.get_log("performance")
    browser.get_log("browser")
    browser.get(page.as_uri())
    assert browser.get_log("browser") == []
    found = browser.execute_script("""
        const own = [...document.querySelectorAll("body *")];
        return {
          title: document.title,
          images: document.querySelectorAll("img, iframe, object, embed, b").length,
          scripts: document.querySelectorAll("script:not([type])").length,
          handlers: own.filter(e => [...e.attributes].some(a => a.name.startsWith("on"))).length,
          text: document.body.innerText,
          wide: document.documentElement.scrollWidth - document.documentElement.clientWidth,
        };
    """)
    assert "broken" not in found["title"].partition("<script>")[0]
    assert found["images"] == 0
    assert found["scripts"] == 1
    assert found["handlers"] == 0
    assert found["wide"] <= 0
    assert "onerror=alert(1)" in found["text"]  # it is read, and does nothing
    assert "\u202e" not in browser.page_source
    assert "49" not in found["title"]


def test_hostile_text_fits_a_phone(opened):
    opened.execute_cdp_cmd(
        "Emulation.setDeviceMetricsOverride",
        {"width": 390, "height": 800, "deviceScaleFactor": 1, "mobile": True},
    )
    try:
        overflow = opened.execute_script(
            "return document.documentElement.scrollWidth - document.documentElement.clientWidth"
        )
        drawing = opened.find_element("css selector", ".drawing svg")
        assert overflow <= 0
        assert drawing.size["width"] >= 500  # its letters can be read: it scrolls within its frame
    finally:
        opened.execute_cdp_cmd("Emulation.clearDeviceMetricsOverride", {})
