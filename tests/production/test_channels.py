"""Two coherent channels: one loop, one gain, both in every file."""

import hashlib
import json
import multiprocessing
from concurrent.futures import ProcessPoolExecutor
from fractions import Fraction

import numpy as np
import pytest
from jsonschema import Draft202012Validator

from wavegen.core import render as render_room
from wavegen.core.errors import FileError, RecipeError, TargetMissed
from wavegen.core.render import samples_of
from wavegen.files.analytic import looped
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording
from wavegen.production.measure import Subject, completed_hints, measure, measure_recipe
from wavegen.production.sidecar import schema

SECOND = "second_channel: {SECOND, signal: {QPSK}}\n"
FILES = "output: {iq: [raw, sigmf], peak: -1 dBFS}\n"
BENCH = """bench:
  average_power_at_device: -10 dBm
  path: [{name: amplifier, role: device, gain: 30 dB, peak_limit: LIMIT dBm}]
"""


def channels(path):
    """Return both channels of an interleaved 16-bit file: I0 Q0 I1 Q1."""
    rails = np.fromfile(path, "<i2").astype(float).reshape(-1, 4) / 32768
    return rails[:, 0] + 1j * rails[:, 1], rails[:, 2] + 1j * rails[:, 3]


@pytest.fixture(scope="module")
def text(lab):
    second = SECOND.replace("SECOND", "level: -6 dB").replace("QPSK", lab.QPSK)
    return lab.SINGLE + second + FILES


@pytest.fixture(scope="module")
def made(lab, text, tmp_path_factory):
    return lab.make(text, tmp_path_factory.mktemp("channels"))


def test_both_stand_in_the_file_as_they_are_built(lab, text, made):
    prepared = lab.prepared(text)
    gain = 10 ** (made.document["scaling"]["gain_db"] / 20)
    assert len(prepared.channels) == 2
    for found, channel in zip(channels(made.files[0]), prepared.channels, strict=True):
        wanted = samples_of(channel.built.signal) * gain
        # half a code a rail, and float32's 24 bits
        assert np.abs(found - wanted).max() < 0.71 / 32768 + 1e-6
    plain = samples_of(lab.prepared(lab.SINGLE).built.signal)
    assert np.array_equal(samples_of(prepared.built.signal), plain)  # the first is left alone


def test_each_draws_its_own_data_unless_told(lab, text):
    first, second = (samples_of(one.built.signal) for one in lab.prepared(text).channels)
    correlation = np.abs(np.vdot(first, second)) / np.linalg.norm(first) / np.linalg.norm(second)
    assert correlation < 4 / np.sqrt(2000)  # 2000 symbols, 4 sigma
    shared = text.replace(f"signal: {{{lab.QPSK}}}}}", f"signal: {{{lab.QPSK}, {SHARE}}}}}")
    assert shared != text
    first, second = (samples_of(one.built.signal) for one in lab.prepared(shared).channels)
    assert np.array_equal(second, first * np.float32(10 ** (-6 / 20)))


LONG_RAMP = "{kind: gate, duty: 50 %, period: 1 ms, ramp: 2 ms}"
SHARE = "data: {kind: random, share: signal}"


def test_parts_of_both_are_one_space_of_names(lab):
    part = f"{{name: a, signal: {{{lab.QPSK}}}}}"
    both = f"signal: {{kind: sum, parts: [{part}]}}\n"
    shares = f"second_channel: {{signal: {{{lab.QPSK}, data: {{share: NAME}}}}}}\n"
    prepared = lab.prepared(lab.HEAD + both + shares.replace("NAME", "a"))
    first, second = (samples_of(one.built.signal) for one in prepared.channels)
    assert np.allclose(first, second, atol=1e-6)
    with pytest.raises(RecipeError, match="no part is named"):  # a sum is no source
        lab.prepared(lab.HEAD + both + shares.replace("NAME", "signal"))
    again = f"second_channel: {{signal: {{kind: sum, parts: [{part}]}}}}\n"
    with pytest.raises(RecipeError, match="taken") as caught:
        lab.prepared(lab.HEAD + both + again)
    assert "second_channel.signal.parts[0].name" in caught.value.where
    named = again.replace("name: a", "name: signal")
    with pytest.raises(RecipeError, match="taken"):  # the first draws under that name
        lab.prepared(lab.SINGLE + named)


def test_one_gain_keeps_the_level_between_them(made):
    document = made.document
    first, second = channels(made.files[0])
    nominal = document["second_channel"]["mean"]["nominal_db"]
    assert nominal == pytest.approx(-6, abs=1e-6)
    assert document["scaling"]["gain_db"] == document["second_channel"]["scaling"]["gain_db"]
    assert document["scaling"]["peak_dbfs"] == pytest.approx(-1, abs=1e-6)
    assert document["second_channel"]["scaling"]["peak_dbfs"] < -5
    for item in document["files"]:
        for samples, figures in zip((first, second), item["channels"], strict=True):
            mean_db = 10 * np.log10(np.mean(np.abs(samples) ** 2))
            assert figures["mean_dbfs"] == pytest.approx(mean_db, abs=1e-5)
            peak_db = 20 * np.log10(np.abs(samples).max())
            assert figures["peak_dbfs"] == pytest.approx(peak_db, abs=1e-5)
        for key in set(item["channels"][0]):
            assert item[key] == item["channels"][0][key] == document.get(key, item[key])


def test_the_larger_peak_sets_the_gain(lab, text, tmp_path):
    made = lab.make(text.replace("-6 dB", "6 dB"), tmp_path)
    assert made.document["second_channel"]["scaling"]["peak_dbfs"] == pytest.approx(-1, abs=1e-6)
    assert made.document["scaling"]["peak_dbfs"] < -6
    assert made.document["files"][0]["n_saturated"] == 0


def test_the_loop_is_whole_for_both(lab):
    second = "second_channel: {signal: {kind: tones, count: 2, spacing: 3 kHz}}\n"
    prepared = lab.prepared(lab.SINGLE + second)
    # 4 samples a symbol, and 1500 Hz (two tones about 0): 8000/3 samples, 8000 together
    assert prepared.cycle_samples == 8000
    assert all(one.site.n_samples == 8000 for one in prepared.channels)
    with pytest.raises(RecipeError, match="without symbols"):
        lab.prepared((lab.SINGLE + second).replace("2 ms", "2000 symbols"))


def test_faults_of_the_second_channel_have_their_place(lab):
    for second, where in (
        ("second_channel: {signal: {kind: noise, bandwidth: 5 MHz}}", "second_channel.signal"),
        (
            f"second_channel: {{signal: {{kind: carrier}}, stages: [{LONG_RAMP}]}}",
            "second_channel.stages[0]",
        ),
    ):
        with pytest.raises(RecipeError) as caught:
            lab.prepared(lab.SINGLE + second + "\n")
        assert caught.value.where.startswith("case.yaml:5:")
        assert where in caught.value.where


def hashes(made):
    return [hashlib.sha512(path.read_bytes()).hexdigest() for path in made.files[:2]]


def test_neither_threads_nor_processes_change_a_byte(lab, text, made, tmp_path, monkeypatch):
    monkeypatch.setattr(render_room, "strip_length", lambda _: 1 << 10)
    for workers in (1, 3):
        other = lab.make(text, tmp_path / str(workers), workers=workers)
        assert hashes(other) == hashes(made)
        assert other.document == made.document
    context = multiprocessing.get_context("spawn")
    with ProcessPoolExecutor(2, mp_context=context) as executor:
        other = lab.make(text, tmp_path / "processes", workers=2, executor=executor)
    assert hashes(other) == hashes(made)
    assert other.document == made.document


def test_the_sidecar_is_by_its_schema(made):
    document = json.loads(made.files[-3].read_text())
    validator = Draft202012Validator(schema())
    assert validator.is_valid(document)
    for item in (document["second_channel"], document["files"][0]["channels"][1]):
        item["more"] = 1
        assert not validator.is_valid(document)
        del item["more"]
    document["files"][0]["channels"].pop()
    assert not validator.is_valid(document)


def test_what_is_read_back_measures_what_the_sidecar_says(made):
    for item in made.document["files"]:
        path = made.folder / item["name"]
        for number, figures in enumerate(item["channels"]):
            hints = ReadHints(channel=number, sample_rate_hz=Fraction(4_000_000))
            recording = open_recording(path, hints)
            assert completed_hints(item, recording, hints) is hints
            found = measure(Subject(name="x", signal=looped(recording), loops=True))
            for key in ("mean_dbfs", "peak_dbfs", "peak_between_samples_dbfs", "levels"):
                assert found[key] == figures[key]


def test_a_raw_file_of_two_channels_is_not_read_as_one(made):
    item = made.document["files"][0]
    hints = ReadHints(sample_rate_hz=Fraction(4_000_000))
    recording = open_recording(made.folder / item["name"], hints)
    with pytest.raises(FileError, match="--channel"):
        completed_hints(item, recording, hints)


def test_each_channel_of_a_recipe_is_measured(lab, text, made):
    for channel, figures in zip(
        lab.prepared(text).channels, made.document["files"][0]["channels"], strict=True
    ):
        found = measure_recipe(channel)
        assert found["papr_db"] == pytest.approx(figures["papr_db"], abs=0.002)


def test_laws_of_both_are_compared(lab, tmp_path):
    second = "second_channel: {signal: {kind: tones, count: 4, spacing: 10 kHz}}\n"
    made = lab.make(lab.TONES + second, tmp_path)
    laws = made.document["law"], made.document["second_channel"]["law"]
    assert [law["verdict"] for law in laws] == ["agrees", "agrees"]
    assert [law["n_instants"] for law in laws] == [400, 400]
    assert not made.differs
    wrong = lab.make(lab.TONES + second, tmp_path / "wrong")
    wrong.document["second_channel"]["law"]["verdict"] = "differs"
    assert wrong.differs


def test_ratings_hold_for_both(lab, text, tmp_path):
    def limited(limit):
        return text.replace("-6 dB", "6 dB") + BENCH.replace("LIMIT", str(limit))

    made = lab.make(limited(20), tmp_path)
    first, second = made.document["bench"]["path"]
    assert (first["channel"], second["channel"]) == (0, 1)
    item = made.document["files"][0]["channels"]
    between = item[1]["mean_dbfs"] - item[0]["mean_dbfs"]
    assert second["average_dbm"] - first["average_dbm"] == pytest.approx(between, abs=0.002)
    limit = (first["peak_envelope_dbm"] + second["peak_envelope_dbm"]) / 2
    with pytest.raises(TargetMissed, match="channel 1") as caught:
        lab.make(limited(round(limit, 2)), tmp_path / "over")
    assert caught.value.where == "bench.path[0]"


def test_real_samples_of_both_at_one_frequency(lab, text, tmp_path):
    ask = "output: {iq: [{format: raw, real: {centre: 1 MHz}}]}\n"
    made = lab.make(text.replace(FILES, ask), tmp_path)
    item = made.document["files"][0]
    rails = np.fromfile(made.files[0], "<i2").reshape(-1, 2) / 32768
    for number, figures in enumerate(item["channels"]):
        # The mean of a real carrier is half that of its envelope.
        mean_db = 10 * np.log10(2 * np.mean(rails[:, number] ** 2))
        assert figures["mean_dbfs"] == pytest.approx(mean_db, abs=0.01)


def test_bursts_of_each_channel_are_its_own(lab, tmp_path):
    gate = "stages: [{kind: gate, duty: DUTY %, period: 1 ms, ramp: 10 us}]"
    second = f"second_channel: {{signal: {{kind: carrier}}, {gate.replace('DUTY', '50')}}}\n"
    made = lab.make(lab.CARRIER + gate.replace("DUTY", "25") + "\n" + second, tmp_path)
    duties = [one["on_time"]["duty"] for one in made.document["files"][0]["channels"]]
    assert duties == [0.25, 0.5]


@pytest.mark.parametrize("form", ["sigmf", "sigmf_archive", "wav", "npy", "csv", "mat", "raw"])
def test_every_format_says_that_there_are_two(lab, text, tmp_path, form):
    made = lab.make(text.replace(FILES, f"output: {{iq: [{form}]}}\n"), tmp_path)
    hints = ReadHints(channel=1, sample_rate_hz=Fraction(4_000_000))
    recording = open_recording(made.files[0], hints)
    assert (recording.n_channels, recording.channel) == (2, 1)
    found = measure(Subject(name="x", signal=looped(recording), loops=True))
    assert found["mean_dbfs"] == made.document["files"][0]["channels"][1]["mean_dbfs"]
