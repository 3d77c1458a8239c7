import json
import shutil
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.format import ReadHints
from wavegen.production.show import (
    is_curve,
    is_sidecar,
    show_curve,
    show_recipe,
    show_recording,
    show_sidecar,
)
from wavegen.production.stimulus import find_stimulus

RECORDINGS = Path(__file__).parents[1] / "files" / "recordings"
NO_HINTS = ReadHints()
RAW = "output: {iq: [{format: raw, datatype: cf32_le}, wav]}\n"


@pytest.fixture
def made(lab, tmp_path):
    return lab.make("title: A carrier\n" + lab.TONES + RAW, tmp_path)


def test_a_recording_by_its_header():
    found = show_recording(RECORDINGS / "nbiot_uplink_832mhz_640ksps_cut.sigmf-meta", NO_HINTS)
    assert found["is"] == "recording"
    assert (found["file_format"], found["datatype"]) == ("sigmf", "ci16_le")
    assert found["sample_rate_hz"] == 640_000
    assert found["n_samples"] == 78_000
    assert found["duration_s"] == pytest.approx(0.121875)
    assert found["centre_frequency_hz"] == 832_344_126
    assert found["n_annotations"] == sum(found["labels"].values()) == 9
    assert found["hash"] == "equal"
    assert found["level"] is found["sidecar"] is found["law"] is None
    assert json.loads(json.dumps(found, allow_nan=False)) == found


def test_a_recording_whose_bytes_have_changed(tmp_path):
    for end in ("meta", "data"):
        name = f"nbiot_uplink_832mhz_640ksps_cut.sigmf-{end}"
        shutil.copy(RECORDINGS / name, tmp_path / name)
    with (tmp_path / name).open("r+b") as file:
        file.write(b"\1")
    found = show_recording(tmp_path / name, NO_HINTS)
    assert found["hash"] == "differs"
    assert any("levels are left out" in text for text in found["warnings"])


def test_a_file_without_a_header():
    path = RECORDINGS / "rxnoise_440mhz_10ksps.ci16_le"
    with pytest.raises(FileError, match="rate"):
        show_recording(path, NO_HINTS)
    found = show_recording(path, ReadHints(sample_rate_hz=Fraction(10_000)))
    assert (found["n_samples"], found["hash"]) == (10_000, "none stated")


@pytest.mark.parametrize("number", [0, 1])
def test_a_stimulus_by_its_sidecar(made, number):
    found = show_recording(made.files[number], NO_HINTS)
    assert found["is"] == "stimulus"
    assert found["hash"] == "equal"
    assert found["level_from"] == "sidecar"
    item = made.document["files"][number]
    assert found["level"]["mean_dbfs"] == item["mean_dbfs"]
    assert found["level"]["peak_between_samples_dbfs"] == item["peak_between_samples_dbfs"]
    law = made.document["law"]
    assert found["law"] == {"name": law["name"], "verdict": "agrees"}


def test_levels_of_other_bytes_are_left_out(made):
    np.zeros(16000, "<f4").tofile(made.files[0])
    found = show_recording(made.files[0], NO_HINTS)
    assert (found["hash"], found["level"]) == ("differs", None)
    np.zeros(1600, "<f4").tofile(made.files[0])
    found = show_recording(made.files[0], NO_HINTS)
    assert any("800" in text for text in found["warnings"])


def test_a_header_of_our_own_without_its_sidecar(lab, tmp_path):
    made = lab.make(lab.TONES, tmp_path)
    find_stimulus(made.folder).path.unlink()
    found = show_recording(made.files[0], NO_HINTS)
    assert (found["is"], found["level_from"]) == ("recording", "header")
    assert found["level"]["papr_db"] == made.document["papr_db"]


def test_a_sidecar(made):
    found = show_sidecar(find_stimulus(made.folder))
    assert (found["is"], found["title"], found["recipe"]) == ("sidecar", "A carrier", "case")
    assert found["papr_db"] == made.document["papr_db"]
    assert [item["is_there"] for item in found["files"]] == [True, True]
    made.files[1].unlink()
    assert len(made.document["files"][1]["all_names"]) == 1
    found = show_sidecar(find_stimulus(made.folder))
    assert [item["is_there"] for item in found["files"]] == [True, False]


def test_half_of_a_pair_is_missing(lab, tmp_path):
    made = lab.make(lab.TONES, tmp_path)
    made.files[1].unlink()
    (item,) = show_sidecar(find_stimulus(made.folder))["files"]
    assert (item["name"], item["is_there"]) == ("case.sigmf-data", False)


@pytest.mark.parametrize("form", ["raw", "sigmf"])
def test_two_channels(lab, tmp_path, form):
    second = "second_channel: {signal: {kind: noise, bandwidth: 1 MHz}}\n"
    made = lab.make(lab.TONES + second + f"output: {{iq: [{form}]}}\n", tmp_path)
    figures = made.document["files"][0]["channels"]
    for hints, channel in ((NO_HINTS, 0), (ReadHints(channel=1), 1)):
        found = show_recording(made.files[0], hints)
        assert (found["n_channels"], found["channel"]) == (2, channel)
        assert found["level"]["papr_db"] == figures[channel]["papr_db"]
    find_stimulus(made.folder).path.unlink()
    if form == "sigmf":
        found = show_recording(made.files[0], NO_HINTS)
        assert (found["n_channels"], found["channel"], found["is"]) == (2, 0, "recording")
    with pytest.raises(FileError):
        show_recording(made.files[0], ReadHints(channel=2))


def test_what_is_a_sidecar_or_a_curve(made, tmp_path):
    assert is_sidecar(made.folder)
    assert is_sidecar(made.folder / "case.ccdf.json")
    assert not is_sidecar(made.files[0])
    assert is_curve(made.folder / "case.ccdf.csv")
    assert not is_curve(made.folder / "case.wav")
    samples = tmp_path / "samples.csv"
    samples.write_text("i,q\n0,1\n1,0\n")
    assert not is_curve(samples)


def test_a_curve(made):
    found = show_curve(made.folder / "case.ccdf.csv")
    assert found["is"] == "ccdf curve"
    assert found["n_points"] == len(made.document["ccdf"]["level_db"])
    assert found["lowest_level_db"] == -30
    assert 0 < found["lowest_probability"] <= found["highest_probability"] <= 1


TREE = """\
title: Two
signal:
  kind: sum
  parts:
    - name: wide
      frequency_offset: 300.0001 kHz
      signal: {kind: noise, bandwidth: 1 MHz}
      stages: [{kind: scale, gain: -1 dB}]
    - level: -3 dB
      signal:
        kind: sum
        parts:
          - signal: {kind: carrier}
          - signal: {kind: tones, count: 4, spacing: 100 kHz, phases: newman}
stages: [{kind: clip, ceiling: 7 dB}]
"""


def test_a_recipe(lab):
    found = show_recipe(lab.prepared(lab.HEAD + TREE))
    assert (found["is"], found["title"], found["seed"]) == ("recipe", "Two", 1)
    assert found["n_samples"] == found["n_cycles"] * found["cycle_samples"] == 8000
    assert [note["where"] for note in found["rounded"]] == ["signal.parts[0].frequency_offset"]
    rows = [(row["depth"], row["kind"], row["name"]) for row in found["tree"]]
    assert rows == [
        (0, "sum", None),
        (1, "part", "wide"),
        (2, "noise", None),
        (2, "scale", None),
        (1, "part", None),
        (2, "sum", None),
        (3, "part", None),
        (4, "carrier", None),
        (3, "part", None),
        (4, "tones", None),
        (0, "clip", None),
    ]
    by_path = {row["path"]: row["says"] for row in found["tree"]}
    assert by_path["signal.parts[0]"] == "frequency_offset 300.0001 kHz"
    assert by_path["signal.parts[1]"] == "level -3 dB"
    assert by_path["signal.parts[0].stages[0]"] == "gain -1 dB"
    assert by_path["stages[0]"] == "ceiling 7 dB"
    assert json.loads(json.dumps(found, allow_nan=False)) == found


def test_nested_settings_are_told_too(lab):
    found = show_recipe(lab.prepared(lab.SINGLE))
    (row,) = found["tree"]
    assert "constellation qpsk" in row["says"]
    assert "symbol_rate 1 MHz" in row["says"]
    assert "span" in row["says"]
