"""What is written beside a stimulus."""

import json
import re

import pytest

from wavegen.core.errors import ArgumentsError, FileError, TargetMissed
from wavegen.production.make import make
from wavegen.recipe.load import load_text
from wavegen.reports.stimulus_reports import (
    Wanted,
    refuse_beforehand,
    without,
    write_stimulus_reports,
)

RECIPE = """\
wavegen: 1
title: A carrier with a bench
sample_rate: 4 MHz
duration: 2000 symbols
signal:
  kind: single_carrier
  constellation: qpsk
  symbol_rate: 1 MHz
  pulse: {kind: root_raised_cosine, roll_off: 0.22}
stages:
  - {kind: clip, ceiling: 3 dB}
"""
BENCH = """\
bench:
  average_power_at_device: -20 dBm
  generator: {clock_most: 100 MHz, word_bits: 14}
  path:
    - {name: cable, gain: -1 dB, peak_limit: -18 dBm}
    - {name: amplifier, role: device, gain: 30 dB}
"""
ALL = Wanted(figures=True, report=True, sheet=True)


def loaded(bench=BENCH):
    return load_text(RECIPE + bench, name="car")


def test_everything_beside_the_files(tmp_path):
    made = make(loaded(), out=tmp_path, accepted_risks=["cable.peak_limit"])
    names = write_stimulus_reports(made, ALL)
    assert {"car.bench.html", "car.report.html", "car.ccdf.svg", "car.constellation.png"} <= set(
        names
    )
    assert all((made.folder / name).is_file() for name in names)
    sheet = (made.folder / "car.bench.html").read_text()
    assert "the file without crest-factor reduction is loaded" in sheet
    assert "EXCEEDED" in sheet
    report = (made.folder / "car.report.html").read_text()
    assert "Order of work" in report
    assert made.document["files"][0]["sha512"] in report


def test_an_accepted_risk_is_recorded_and_no_other_is_taken(tmp_path):
    with pytest.raises(TargetMissed):
        make(loaded(), out=tmp_path)
    assert not (tmp_path / "car").exists()
    with pytest.raises(ArgumentsError):
        make(loaded(), out=tmp_path, accepted_risks=["amplifier.peak_limit"])
    made = make(loaded(), out=tmp_path, accepted_risks=["cable.peak_limit"])
    kept = json.loads((made.folder / "car.ccdf.json").read_text())
    assert kept["bench"]["accepted_risks"] == ["cable.peak_limit"]


def test_what_cannot_be_written_is_refused_beforehand(tmp_path):
    with pytest.raises(ArgumentsError) as caught:
        refuse_beforehand(loaded(""), ALL, tmp_path, overwrite=False)
    assert caught.value.where == "--bench-sheet"
    (tmp_path / "car.report.html").write_text("mine")
    with pytest.raises(FileError):
        refuse_beforehand(loaded(), ALL, tmp_path, overwrite=False)
    refuse_beforehand(loaded(), ALL, tmp_path, overwrite=True)


def test_a_recipe_without_its_crest_reduction():
    unreduced = without(loaded(), ("crest",))
    assert unreduced is not None
    assert unreduced.loaded.recipe.stages == ()
    assert without(loaded(), ("device", "converter")) is None
    plain = load_text(RECIPE.partition("stages:")[0], name="car")
    assert without(plain, ("crest",)) is None


def test_the_reduction_is_shown_over_what_was_before(tmp_path):
    made = make(loaded(""), out=tmp_path)
    report = Wanted(report=True)
    write_stimulus_reports(made, report)
    page = (made.folder / "car.report.html").read_text()
    assert page.count("before its peaks are reduced") >= 2  # CCDF and spectrum
    assert "adjacent" in page


TWO = """\
second_channel:
  level: -6 dB
  signal:
    kind: single_carrier
    constellation: 8psk
    symbol_rate: 1 MHz
    pulse: {kind: root_raised_cosine, roll_off: 0.22}
"""
RAW = "output: {iq: [{format: raw, datatype: ci16_le}]}\n"


def test_both_channels_of_a_file_that_does_not_tell_its_rate(tmp_path):
    made = make(loaded(TWO + BENCH + RAW), out=tmp_path, accepted_risks=["cable.peak_limit"])
    names = write_stimulus_reports(made, Wanted(figures=True, report=True, sheet=True))
    both = {f"car.{kind}{end}.svg" for kind in ("ccdf", "spectrum") for end in ("", "-second")}
    assert both <= set(names)
    sheet = (made.folder / "car.bench.html").read_text()
    assert "Levels, channel 0" in sheet
    assert "Levels, channel 1" in sheet
    # the second channel lies 6 dB lower everywhere; its average at the device is told so
    document = made.document
    over = document["files"][0]["channels"][1]["mean_dbfs"] - document["mean_dbfs"]
    assert over == pytest.approx(-6, abs=0.1)
    assert f"{-20 + over:.2f} dBm" in sheet
    assert "EXCEEDED by" in sheet
    assert ", accepted" in sheet


def test_a_carrier_in_real_samples_is_shaded_where_it_stands(tmp_path):
    real = "output: {iq: [{format: wav, datatype: ri16_le, real: {centre: 1.2 MHz}}]}\n"
    made = make(loaded(real), out=tmp_path)
    write_stimulus_reports(made, Wanted(report=True))
    page = (made.folder / "car.report.html").read_text()
    (panel,) = [
        panel
        for found in re.findall(r'class="readings">(.*?)</script>', page, re.DOTALL)
        for panel in json.loads(found)
        if panel["x"]["name"].startswith("frequency")
    ]
    assert panel["x"]["name"] == "frequency, MHz"
    assert (panel["x"]["from"], panel["x"]["to"]) == (0, 2)
    (curve,) = panel["curves"]
    highest = curve["x"][max(range(len(curve["y"])), key=lambda k: curve["y"][k])]
    assert highest == pytest.approx(1.2, abs=0.6)  # a carrier 1.2 MHz wide
