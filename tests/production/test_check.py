import json
import math

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.production import check as room
from wavegen.production.check import TOLERANCE_DB, check, compare_figures
from wavegen.production.sidecar import in_db
from wavegen.production.stimulus import find_stimulus

TWO = "output: {iq: [sigmf, {format: raw, datatype: cf32_le}]}\n"


@pytest.fixture
def made(lab, tmp_path):
    """A stimulus of 8000 samples in two files."""
    return lab.make(lab.NOISE + TWO, tmp_path).folder


def codes(folder):
    return np.fromfile(folder / "case.sigmf-data", "<i2")


def write(folder, rails):
    np.asarray(rails, "<i2").tofile(folder / "case.sigmf-data")


def first(folder, **options):
    stimulus = find_stimulus(folder / "case.sigmf-data")
    return check(stimulus, **options)["files"][0]


def test_as_it_was_made_nothing_is_measured(made, monkeypatch):
    monkeypatch.setattr(room, "measure", None)
    document = check(find_stimulus(made))
    assert document["verdict"] == "match"
    assert document["is_complete"]
    for row in document["files"]:
        assert (row["hash"], row["verdict"], row["compared_by"]) == ("equal", "match", "hash")
        assert row["largest_difference_db"] == 0
    assert [row["name"] for row in document["files"]] == ["case.sigmf-data", "case.cf32_le"]
    assert json.loads(json.dumps(document, allow_nan=False)) == document


def test_files_are_read_as_loops(made, monkeypatch):
    write(made, codes(made) // 2)
    seen = []

    def measure(subject, **options):
        seen.append((subject.loops, sorted(options)))
        return {**find_stimulus(made).document}

    monkeypatch.setattr(room, "measure", measure)
    assert first(made)["verdict"] == "match"
    assert seen == [(True, ["progress", "workers"])]


TWO_CHANNELS = """\
second_channel: {signal: {kind: tones, count: 8, spacing: 10 kHz, phases: newman}}
output: {iq: [{format: raw, datatype: ci16_le}]}
"""


class TestTwoChannels:
    @pytest.fixture
    def folder(self, lab, tmp_path):
        return lab.make(lab.NOISE + TWO_CHANNELS, tmp_path).folder

    @pytest.mark.parametrize("channel", [0, 1])
    def test_each_is_compared_with_its_own_figures(self, folder, channel):
        assert check(find_stimulus(folder))["verdict"] == "match"
        path = folder / "case.ci16_le"
        rails = np.fromfile(path, "<i2").reshape(-1, 4)
        rails[0, 0] += 1
        rails.tofile(path)
        (row,) = check(find_stimulus(folder))["files"]
        assert (row["verdict"], row["hash"]) == ("match", "differs")
        rails[:, 2 * channel : 2 * channel + 2] //= 2
        rails.tofile(path)
        (row,) = check(find_stimulus(folder))["files"]
        assert row["verdict"] == "differ"
        verdicts = [one["verdict"] for one in row["channels"]]
        assert verdicts == ["differ", "match"][:: 1 if channel == 0 else -1]
        assert row["mean_difference_db"] == pytest.approx(-6.02, abs=0.01)
        assert all(reason.startswith(f"channel {channel}: ") for reason in row["reasons"])


def test_a_data_file_stands_for_itself(made):
    (made / "case.cf32_le").unlink()
    assert check(find_stimulus(made / "case.sigmf-data"))["verdict"] == "match"
    document = check(find_stimulus(made))
    assert not document["is_complete"]
    assert document["verdict"] == "undecided"
    assert document["files"][1]["hash"] == "missing"


def test_a_change_below_the_tolerance_matches(made):
    rails = codes(made)
    rails[10] += 1
    write(made, rails)
    row = first(made)
    assert (row["hash"], row["verdict"], row["compared_by"]) == ("differs", "match", "statistics")
    assert abs(row["mean_difference_db"]) < 1e-4


@pytest.mark.parametrize(
    ("gain_db", "verdict"), [(0.04, "match"), (0.06, "differ"), (-1, "differ")]
)
def test_a_change_of_level(made, gain_db, verdict):
    """The peak is at -1 dBFS; rounding adds less than 0.001 dB to a mean near -12 dBFS."""
    write(made, np.rint(codes(made) * 10 ** (gain_db / 20)))
    row = first(made)
    assert row["verdict"] == verdict
    assert row["mean_difference_db"] == pytest.approx(gain_db, abs=2e-3)
    assert row["peak_difference_db"] == pytest.approx(gain_db, abs=2e-3)
    assert row["papr_difference_db"] == pytest.approx(0, abs=2e-3)
    assert row["largest_difference_db"] == pytest.approx(0, abs=0.01)


def test_the_tolerance_is_the_callers(made):
    write(made, np.rint(codes(made) * 10 ** (-1 / 20)))
    assert first(made, tolerance_db=1.01)["verdict"] == "match"
    assert first(made, tolerance_db=0.0)["verdict"] == "differ"


def test_a_clip_shows_at_the_levels_that_it_moves(made):
    """A ceiling of 6 dB leaves the level at 10 % (3.6 dB) and moves the one at 0.1 %."""
    rails = codes(made).astype(float)
    samples = rails[::2] + 1j * rails[1::2]
    top = 10 ** (6 / 20) * np.sqrt(np.mean(np.abs(samples) ** 2))
    samples *= np.minimum(1, top / np.maximum(np.abs(samples), 1))
    write(made, np.rint(samples.view(float)))
    row = first(made)
    assert row["verdict"] == "differ"
    assert row["at_probability"] == 0.01
    shown = {level["probability"]: level for level in row["levels"]}
    before = shown[0.01]["stated_db"]
    assert shown[0.01]["difference_db"] == pytest.approx(6 - before, abs=0.2)
    assert shown[0.01]["verdict"] == "differ"
    # 8000 samples hold eight beyond 0.1 %: fewer than ten.
    assert {shown[q]["verdict"] for q in (1e-3, 1e-4, 1e-5, 1e-6)} == {"undecided"}


CELL = """\
wavegen: 1
sample_rate: 7.68 MHz
duration: 10 ms
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups: [{subcarriers: "-150..-1, 1..150", constellation: 64qam}]
  cyclic_prefix: 144/2048
"""


def test_another_constellation_is_found_where_no_ccdf_shows_it(lab, tmp_path):
    """QPSK for 64QAM on 300 subcarriers moves the level at 0.01 % by some 0.01 dB."""
    folder = lab.make(CELL, tmp_path / "a").folder
    other = lab.make(CELL.replace("64qam", "qpsk"), tmp_path / "b").folder
    write(folder, codes(other))
    row = first(folder, tolerance_db=1.0)  # one loop differs from the next by some 0.3 dB
    assert (row["verdict"], row["compared_by"]) == ("differ", "waveform")
    # Unlike data: the fitted error of what has nothing in common is far over 100 %.
    assert row["waveform"][0]["error_percent"] > 100
    assert row["waveform"][0]["evm"][0]["percent"] > 100
    assert "not those of its recipe" in row["reasons"][0]


def test_the_same_samples_rounded_anew_are_the_same(lab, tmp_path):
    folder = lab.make(CELL, tmp_path).folder
    write(folder, np.rint(codes(folder) / 64) * 64)
    row = first(folder)
    assert (row["verdict"], row["compared_by"]) == ("match", "statistics")
    # Steps of 64 codes at an RMS of some 5000 a rail: 64 / sqrt(12) / 5000.
    assert 0.1 < row["waveform"][0]["error_percent"] < 1
    assert 0.05 < row["waveform"][0]["evm"][0]["percent"] < 1


def test_another_length_is_a_difference_by_itself(made, monkeypatch):
    write(made, codes(made)[:-2])
    monkeypatch.setattr(room, "measure", None)
    row = first(made)
    assert (row["verdict"], row["compared_by"]) == ("differ", "facts")
    assert "7999" in row["reasons"][0]


def test_another_rate_is_a_difference_though_the_bytes_are_equal(made):
    meta = made / "case.sigmf-meta"
    meta.write_text(meta.read_text().replace("4000000", "4000001"))
    row = first(made)
    assert (row["hash"], row["verdict"], row["compared_by"]) == ("equal", "differ", "facts")
    assert "4.000001 MHz" in row["reasons"][0]


def test_equal_bytes_that_are_told_to_be_something_else(made):
    meta = made / "case.sigmf-meta"
    meta.write_text(meta.read_text().replace("ci16_le", "ci16_be"))
    row = first(made)
    assert (row["hash"], row["verdict"], row["compared_by"]) == ("equal", "differ", "statistics")


def test_half_a_sample_lost_is_no_readable_file(made):
    path = made / "case.sigmf-data"
    path.write_bytes(path.read_bytes()[:-1])
    row = first(made)
    assert (row["is_readable"], row["hash"], row["verdict"]) == (False, "differs", "differ")


def test_metadata_lost_is_no_readable_file(made):
    (made / "case.sigmf-meta").unlink()
    row = first(made)
    assert (row["is_readable"], row["hash"], row["verdict"]) == (False, "equal", "undecided")


@pytest.mark.parametrize("value", [0.0, np.nan, np.inf])
def test_what_has_no_statistics_differs(made, value):
    np.full(16000, value, "<f4").tofile(made / "case.cf32_le")
    row = check(find_stimulus(made / "case.cf32_le"))["files"][0]
    assert (row["verdict"], row["is_readable"]) == ("differ", True)
    assert row["reasons"]


def test_the_worst_file_gives_the_verdict(made):
    write(made, codes(made) // 2)
    document = check(find_stimulus(made))
    assert [row["verdict"] for row in document["files"]] == ["differ", "match"]
    assert document["verdict"] == "differ"


def figures(levels, **changes):
    rows = [
        {"probability": q, "level_db": level, "resolved": q >= 1e-3}
        for q, level in zip((0.1, 0.01, 1e-3, 1e-4), levels, strict=True)
    ]
    single = {"mean_dbfs": -12.0, "peak_dbfs": -1.0, "peak_between_samples_dbfs": -0.9}
    return {**single, "papr_db": 11.0, "levels": rows, **changes}


STATED = figures((3.6, 6.6, 8.4, 9.6))


@pytest.mark.parametrize(
    ("found", "verdict", "largest", "at"),
    [
        (STATED, "match", 0.0, 0.1),
        (figures((3.6, 6.65, 8.4, 9.6)), "match", 0.05, 0.01),
        (figures((3.6, 6.6, 8.34, 9.6)), "differ", -0.06, 1e-3),
        (figures((3.6, 6.6, 8.4, 9.0)), "undecided", 0.0, 0.1),
        (figures((3.6, 6.6, 8.4, None)), "undecided", 0.0, 0.1),
        (figures((None, 6.6, 8.4, 9.6)), "differ", None, 0.1),
        (figures((3.6, 6.6, 8.4, 9.6), peak_dbfs=-0.9), "differ", 0.0, 0.1),
        (figures((3.6, 6.6, 8.4, 9.6), papr_db=10.9), "differ", 0.0, 0.1),
        (figures((3.6, 6.6, 8.4, 9.6), peak_between_samples_dbfs=0), "differ", 0.0, 0.1),
        (figures((3.6, 6.6, 8.4, 9.6), mean_dbfs=-12.1), "differ", 0.0, 0.1),
        (figures((3.7, 6.6, 8.4, 9.0)), "differ", 0.1, 0.1),
    ],
)
def test_verdicts(found, verdict, largest, at):
    row = compare_figures(STATED, found, tolerance_db=0.0501)
    assert row["verdict"] == verdict
    assert row["at_probability"] == at
    assert row["largest_difference_db"] == (None if largest is None else pytest.approx(largest))
    assert bool(row["reasons"]) == (verdict != "match")


def test_a_loop_too_short_for_any_level_is_undecided():
    short = figures((1.0, 1.0, 1.0, 1.0))
    for row in short["levels"]:
        row["resolved"] = False
    row = compare_figures(short, short, tolerance_db=0.05)
    assert (row["verdict"], row["largest_difference_db"]) == ("undecided", None)
    assert compare_figures(short, {**short, "mean_dbfs": 0}, tolerance_db=1)["verdict"] == "differ"


def test_the_tolerance_is_what_its_comment_says():
    """Rounding noise of both rails, 2/12 of a squared code, over a mean of -12 dBFS."""
    for n_bits, most_db in ((8, 1e-3), (16, 2e-4)):
        code = 2.0 ** (1 - n_bits)
        assert in_db(1 + code**2 / 6 / 10**-1.2) < most_db
    peak_db = 20 * math.log10(1 + math.sqrt(0.5) / 127)
    assert peak_db < TOLERANCE_DB


class TestFinding:
    def test_every_name_of_a_stimulus(self, made):
        for name in ("case.sigmf-data", "case.sigmf-meta", "case"):
            assert find_stimulus(made / name).names == ("case.sigmf-data",)
        for path in (made, made / "case.ccdf.json"):
            assert len(find_stimulus(path).items) == 2

    def test_a_folder_with_several(self, made):
        (made / "b.ccdf.json").write_bytes((made / "case.ccdf.json").read_bytes())
        assert find_stimulus(made).path.name == "case.ccdf.json"
        (made / "case.ccdf.json").rename(made / "a.ccdf.json")
        with pytest.raises(FileError, match="2 sidecars"):
            find_stimulus(made)

    @pytest.mark.parametrize("name", ["other.wav", "missing", "\0", "case.sigmf-data/x", "x" * 300])
    def test_nothing_there(self, made, name):
        (made / "other.wav").write_bytes(b"RIFF")
        with pytest.raises(FileError):
            find_stimulus(made / name)

    def test_an_empty_folder(self, tmp_path):
        with pytest.raises(FileError, match="no sidecars"):
            find_stimulus(tmp_path)

    @pytest.mark.parametrize("name", ["../secret", "..", "a\\b", "/etc/passwd"])
    def test_a_sidecar_that_leaves_its_folder(self, made, name):
        path = made / "case.ccdf.json"
        document = json.loads(path.read_text())
        document["files"][0]["name"] = name
        path.write_text(json.dumps(document))
        with pytest.raises(FileError, match="no name beside it"):
            find_stimulus(made)
