"""The document against its schema and against NumPy: tests/production/test_sidecar.py."""

import pytest
from jsonschema import Draft202012Validator

from wavegen.production.sidecar import schema

TWO = """\
output:
  iq: [{format: raw, datatype: cf32_le}, {format: raw, datatype: ci8, name: coarse}]
  peak: -1 dBFS
"""


def checked(document):
    Draft202012Validator(schema()).validate(document)
    return document


def test_loop_and_process_stand_side_by_side(lab, tmp_path):
    document = checked(lab.make(lab.NOISE + TWO, tmp_path).document)
    process = document["process"]
    assert process["is"] == "the process it samples"
    for exact, row in zip(document["levels"], process["levels"], strict=True):
        assert row["level_db"] == pytest.approx(exact["level_db"], abs=1e-4)
        assert row["low_db"] <= row["level_db"]
    assert document["law"]["about"] == "the process it samples"
    assert document["no_law"] is None
    for item in document["files"]:
        assert item["process"]["n_samples"] == 8000
        assert item["against_law"]["verdict"] in {"agrees", "undecided"}


def test_a_loop_that_is_alike_for_every_seed_has_no_process(lab, tmp_path):
    document = checked(lab.make(lab.TONES, tmp_path).document)
    assert document["process"] is None
    assert document["law"]["about"] == "this loop"
    assert document["law"]["statement"] == "agrees at every level"
    assert document["law"]["compared"] == []


def test_no_law_is_told_by_name(lab, tmp_path):
    text = lab.SINGLE + "stages: [{kind: filter, bandwidth: 1.5 MHz}]\n"
    document = checked(lab.make(text, tmp_path).document)
    assert document["law"] is None
    assert "filter" in document["no_law"]
    assert document["files"][0]["against_law"] is None
    assert document["process"] is None


def test_data_that_come_round_again_are_counted_once(lab, tmp_path):
    pattern = "data: {kind: prbs, sequence: pn15}"
    text = lab.SINGLE.replace("qpsk", f"qpsk, {pattern}").replace("2 ms", "4 PRBS periods")
    document = checked(lab.make(text, tmp_path).document)
    # 2^15 - 1 bits repeat too soon to stand for random ones: the law is that of the pattern.
    assert document["law"]["about"] == "this loop"
    assert "finite pattern" in document["law"]["name"]


def test_bursts_are_judged_by_their_on_time(lab, tmp_path):
    gate = "stages: [{kind: gate, duty: 50 %, period: 1 ms}]\n"
    document = checked(lab.make(lab.NOISE + gate, tmp_path, overrides=["duration=20 ms"]).document)
    assert document["law"]["of"] == "the on-time, ramps excluded"
    assert document["law"]["name"].endswith("the whole")
    assert document["process"]["n_samples"] == document["on_time"]["n_samples"]
    assert document["law"]["verdict"] != "differs"


def test_each_channel_has_its_own(lab, tmp_path):
    second = "second_channel: {signal: {kind: carrier}}\n"
    document = checked(lab.make(lab.NOISE + second, tmp_path).document)
    assert document["law"]["holds"] == "over seeds"
    assert document["second_channel"]["law"]["holds"] == "every loop"
    channels = document["files"][0]["channels"]
    assert channels[1]["against_law"]["statement"] == "agrees at every level"
    assert channels[0]["process"] is not None
    assert channels[1]["process"] is None
