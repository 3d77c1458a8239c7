"""Page, pictures and bench sheet of every shipped recipe, its loop cut short."""

import json
import math
import re
from dataclasses import replace
from xml.etree import ElementTree as ET

import pytest

from wavegen.production.make import make
from wavegen.recipe.bench import Bench, Generator, PathStage
from wavegen.recipe.find import shipped_recipes
from wavegen.recipe.load import load_recipe
from wavegen.reports.stimulus_reports import Wanted, write_stimulus_reports

SHIPPED = {name: path for name, _, path in shipped_recipes()}
SHORT = "16384 samples"
LONGER = {"causeway-two-carriers-cancelled": "61440 samples"}
"""Where the shortest loop has more."""
ALWAYS = {"ccdf", "density", "power-time", "spectrum", "seam"}
WITHOUT_SYMBOLS = {
    "balloon-telemetry-soqpsk",
    "canal-link-shaped",
    "depot-tracker-gmsk",
    "filter-sweep-64-tones",
    "glasshouse-beacon-gfsk",
    "kiln-receiver-uneven-tones",
    "lantern-mesh-half-sine",
    "noise-power-ratio-comb",
    "crane-remote-cpfsk",
    "signal-box-msk",
    "power-reference-carrier",
    "quay-sensor-bursts",
    "ranger-handset-four-level",
    "receiver-noise-floor",
}
"""What has no symbols, or none that a linear receiver finds through its stages."""
BENCH = Bench(
    average_power_at_device_dbm=-30.0,
    level_uncertainty_db=0.5,
    overshoot_db=0.3,
    generator=Generator(clock_most_hz=2e8, granularity_samples=16, word_bits=14),
    path=(
        PathStage(name="cable", role="cable", gain_db=-1.0, peak_limit_dbm=30.0),
        PathStage(name="amplifier", role="device", gain_db=20.0, vswr=2.0, average_limit_dbm=0.0),
        PathStage(name="head", role="sensor", video_bandwidth_hz=1e7, energy_limit_j=1e-3),
    ),
)
SVG = re.compile(r"<svg .*?</svg>", re.DOTALL)
READINGS = re.compile(r'<script type="application/json" class="readings">(.*?)</script>', re.DOTALL)
NO_NUMBER = re.compile(r"\b(?:nan|inf|infinity)\b", re.IGNORECASE)
OUTSIDE = re.compile(
    r"(?:src|href|action)\s*=\s*[\"'](?!#|data:)|url\((?!#)|@import", re.IGNORECASE
)


def names_of(page):
    return re.findall(r'<figure class="picture" id="picture-([a-z-]+)">', page)


def panels_of(page):
    return [panel for found in READINGS.findall(page) for panel in json.loads(found)]


@pytest.mark.parametrize("name", SHIPPED)
def test_every_recipe_has_page_pictures_and_sheet(name, tmp_path):
    loaded = load_recipe(SHIPPED[name], overrides=(f"duration={LONGER.get(name, SHORT)}",))
    loaded = replace(loaded, recipe=replace(loaded.recipe, bench=BENCH))
    made = make(loaded, out=tmp_path)
    write_stimulus_reports(made, Wanted(report=True, sheet=True))
    page = (made.folder / f"{name}.report.html").read_text(encoding="utf-8")
    check_pictures(page, name, n_channels=len(made.document["files"][0]["channels"] or [0]))
    check_page(page)
    sheet = (made.folder / f"{name}.bench.html").read_text(encoding="utf-8")
    check_page(sheet)
    for told in ("if the setting means RMS", "amplifier.average_limit", "To start", "SHA-512"):
        assert told in sheet


def check_pictures(page, name, *, n_channels):
    expected = ALWAYS if name in WITHOUT_SYMBOLS else ALWAYS | {"constellation"}
    ends = ("", "-second")[:n_channels]
    assert sorted(names_of(page)) == sorted(kind + end for kind in expected for end in ends)
    drawings = SVG.findall(page)
    assert len(drawings) == len(expected) * n_channels
    for drawing in drawings:
        for element in ET.fromstring(drawing).iter():  # noqa: S314 - our own drawing
            for value in (element.get("d"), element.get("transform"), element.get("points")):
                assert value is None or not NO_NUMBER.search(value)
    panels = panels_of(page)
    assert len(panels) >= len(ALWAYS)
    for panel in panels:
        for axis in (panel["x"], panel["y"]):
            assert math.isfinite(axis["from"])
            assert math.isfinite(axis["to"])
            assert axis["from"] != axis["to"]
        assert any(
            low is not None and panel["y"]["from"] <= low <= panel["y"]["to"]
            for curve in panel["curves"]
            for low in curve["y"]
        ), panel["curves"][0]["name"]


def check_page(page):
    ids = re.findall(r'\bid="([^"]+)"', page)
    assert len(ids) == len(set(ids))
    asked = set(re.findall(r'(?:href="#|url\(#)([^")]+)', page))
    assert asked <= set(ids)
    assert not OUTSIDE.search(page)
    for said in re.findall(r'role="img" aria-label="([^"]*)"', page):
        assert len(said) > 20
    body = re.sub(r"<(svg|script|style|pre)\b.*?</\1>", "", page, flags=re.DOTALL)
    assert not NO_NUMBER.search(re.sub(r"<[^>]*>", " ", body))
