from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.files.analytic import looped
from wavegen.files.datatypes import CF32_LE
from wavegen.files.format import ReadHints
from wavegen.files.mat import Mat
from wavegen.files.read import open_recording
from wavegen.meters.power import measure_samples
from wavegen.production.intermediate import (
    folded_db,
    notes_of_folding,
    snapped_centre,
    spectrum_of,
)
from wavegen.production.measure import Subject, measure

GRID = {"sample_rate_hz": Fraction(4_000_000), "n_samples": 8000, "where": "x"}
REAL = "output: {iq: [{format: raw, real: {centre: CENTRE}}, {format: raw, name: iq}]}\n"


def test_the_centre_goes_to_whole_cycles_with_a_note():
    assert snapped_centre(Fraction(1_000_500), **GRID) == (Fraction(1_000_500), [])
    made, (note,) = snapped_centre(Fraction(1_000_300), **GRID)
    assert made == 1_000_500  # the grid is 500 Hz
    assert (note.kind, note.asked, note.given) == ("rounded", "1.0003 MHz", "1.0005 MHz")


@pytest.mark.parametrize("centre", [200, 2_000_000, 1_999_900, 3_000_000])
def test_a_centre_without_room(centre):
    with pytest.raises(RecipeError, match="room") as caught:
        snapped_centre(Fraction(centre), **GRID)
    assert "2 MHz" in caught.value.allowed


def test_the_spectrum_of_a_tone_and_what_of_it_would_fold(lab):
    text = lab.HEAD + (
        "signal: {kind: sum, parts: [{signal: {kind: carrier}},"
        " {frequency_offset: 500 kHz, level: -50 dB, signal: {kind: carrier}}]}\n"
    )
    signal = lab.held(text)
    power = spectrum_of(signal, measure_samples(signal.samples))
    about = {"sample_rate_hz": signal.sample_rate_hz}
    assert int(power.argmax()) == 0
    # 500 kHz above a centre of 1.6 MHz lies 100 kHz beyond half the rate; the window's sidelobes
    # are 118 dB down, its 3 bins of width 3 kHz.
    beyond = folded_db(power, centre_hz=Fraction(1_600_000), **about)
    assert beyond == pytest.approx(-50, abs=0.01)
    assert folded_db(power, centre_hz=Fraction(1_000_000), **about) < -100
    (note,) = notes_of_folding(beyond, centre_hz=Fraction(1_600_000), where="x")
    assert note.kind == "warning"
    assert "-50.0 dB" in note.text
    assert notes_of_folding(-60.1, centre_hz=Fraction(1), where="x") == []
    assert notes_of_folding(-np.inf, centre_hz=Fraction(1), where="x") == []
    with pytest.raises(RecipeError, match="fold back"):
        notes_of_folding(-39.9, centre_hz=Fraction(1), where="x")


@pytest.mark.parametrize("n", [100_000, 3000])
def test_the_ends_of_a_recording_are_no_jump(lab, n):
    """A tone of 1000.5 cycles a recording: around its ends it would spread over all bins."""
    samples = np.exp(2j * np.pi * (n // 100 + 0.5) * np.arange(n) / n).astype("<c8")
    signal = replace(lab.held(lab.CARRIER), samples=samples, n_samples=n)
    about = {"centre_hz": Fraction(1_000_000), "sample_rate_hz": signal.sample_rate_hz}
    found = [
        folded_db(spectrum_of(signal, measure_samples(samples), loops=loops), **about)
        for loops in (False, True)
    ]
    # the window's sidelobes are 118 dB down; float32 samples round at -140 dB
    assert found[0] < -110
    assert found[1] > -60


def test_the_file_is_the_real_part_at_the_centre(lab, tmp_path):
    made = lab.make(lab.SINGLE + REAL.replace("CENTRE", "1000.3 kHz"), tmp_path)
    item, plain = made.document["files"]
    real = np.fromfile(made.folder / item["name"], "<i2")
    baseband = lab.read_ci16(made.folder / plain["name"])
    turn = np.exp(2j * np.pi * 1_000_500 / 4e6 * np.arange(real.size))
    # Both are rounded: a half code here, 0.71 there.
    assert np.abs(real / 32768 - (baseband * turn).real).max() * 32768 < 1.25
    assert item["datatype"] == "ri16_le"
    assert item["real"] == {"centre_hz": 1_000_500.0}
    assert plain["real"] is None
    (note,) = [one for one in made.document["rounded"] if "real" in one["where"]]
    assert note["where"].endswith("output.iq[0].real.centre")
    for key in ("mean_dbfs", "peak_dbfs", "peak_between_samples_dbfs"):
        assert item[key] == pytest.approx(plain[key], abs=0.002), key
    levels = [row["level_db"] for row in item["levels"][:4]]
    assert levels == pytest.approx([row["level_db"] for row in plain["levels"][:4]], abs=0.02)


def test_what_is_read_back_measures_what_the_sidecar_says(lab, tmp_path):
    made = lab.make(lab.SINGLE + REAL.replace("CENTRE", "1 MHz"), tmp_path)
    path = made.folder / made.document["files"][0]["name"]
    recording = open_recording(path, ReadHints(sample_rate_hz=Fraction(4_000_000)))
    found = measure(Subject(name="x", signal=looped(recording), loops=True))
    for key in ("mean_dbfs", "peak_dbfs", "peak_between_samples_dbfs", "levels", "ccdf"):
        assert found[key] == made.document["files"][0][key]


def test_real_samples_are_held_against_the_law(lab, tmp_path):
    text = lab.TONES + REAL.replace("CENTRE", "1 MHz")
    made = lab.make(text, tmp_path)
    assert made.document["law"]["verdict"] == "agrees"
    made = lab.make(lab.CARRIER + REAL.replace("CENTRE", "1 MHz"), tmp_path / "carrier")
    assert made.document["law"]["verdict"] == "agrees"
    assert made.document["files"][0]["papr_db"] < 0.01  # the envelope, not the cosine's 3.01 dB


@pytest.mark.parametrize(
    ("centre", "where"),
    [
        ("500 kHz", "output.iq[0].real.centre"),  # 610 kHz to each side: passes 0
        ("1.5 MHz", "output.iq[0].real.centre"),  # passes 2 MHz
        ("3 MHz", "output.iq[0].real.centre"),
    ],
)
def test_what_would_fold_is_refused_at_its_place(lab, tmp_path, centre, where):
    with pytest.raises(RecipeError) as caught:
        lab.make(lab.SINGLE + REAL.replace("CENTRE", centre), tmp_path)
    assert where in caught.value.where
    assert caught.value.where.startswith("case.yaml:")
    assert lab.left_in(tmp_path) == []


def test_gated_real_samples_have_an_on_time(lab, tmp_path):
    text = lab.CARRIER + "stages: [{kind: gate, duty: 25 %, period: 1 ms, ramp: 50 us}]\n"
    made = lab.make(text + REAL.replace("CENTRE", "1 MHz"), tmp_path, workers=2)
    item, plain = made.document["files"]
    assert item["on_time"]["n_samples"] == plain["on_time"]["n_samples"]
    assert item["on_time"]["mean_dbfs"] == pytest.approx(plain["on_time"]["mean_dbfs"], abs=0.01)


@pytest.mark.parametrize("form", ["sigmf", "sigmf_archive", "wav", "npy", "csv", "mat", "raw"])
def test_real_files_of_every_format(lab, tmp_path, form):
    text = lab.SINGLE + f"output: {{iq: [{{format: {form}, real: {{centre: 1 MHz}}}}]}}\n"
    made = lab.make(text, tmp_path)
    assert made.document["files"][0]["datatype"].startswith("r")
    recording = open_recording(made.files[0], ReadHints(sample_rate_hz=Fraction(4_000_000)))
    assert recording.is_real


def test_a_format_without_real_samples(lab, monkeypatch):
    monkeypatch.setattr(Mat, "datatypes", {"cf32_le": CF32_LE})
    with pytest.raises(RecipeError, match="does not write real samples"):
        lab.load(lab.SINGLE + "output: {iq: [{format: mat, real: {centre: 1 MHz}}]}\n")
