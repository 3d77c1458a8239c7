import json
from fractions import Fraction

import numpy as np
import pytest
from jsonschema import Draft202012Validator

from wavegen.core.errors import ArgumentsError, FileError, SignalError, TargetMissed
from wavegen.files import FORMATS
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording
from wavegen.production import convert as room
from wavegen.production.check import check
from wavegen.production.conversion import Conversion
from wavegen.production.convert import convert
from wavegen.production.judgement import Question
from wavegen.production.sidecar import schema
from wavegen.production.stimulus import find_stimulus

NO_HINTS = ReadHints()
FLOAT = "output: {iq: [{format: sigmf, datatype: cf32_le}]}\n"
BENCH = """\
bench:
  average_power_at_device: -10 dBm
  path: [{name: amplifier, role: device, gain: 30 dB, peak_limit: LIMIT dBm}]
"""
GATE = "stages: [{kind: gate, duty: 25 %, period: 0.5 ms, ramp: 16 samples}]\n"


def run(path, out, hints=NO_HINTS, *, overwrite=False, **wanted):
    return convert(path, Conversion(**wanted), hints=hints, out=out, overwrite=overwrite)


@pytest.fixture
def made(lab, tmp_path):
    return lab.make(lab.TONES, tmp_path / "a")


@pytest.fixture
def recording(tmp_path):
    """5000 samples of complex noise in float32, mean -12 dBFS."""
    rng = np.random.default_rng(11)
    path = tmp_path / "noise.cf32_le"
    (rng.standard_normal(10_000) * 0.25 * np.sqrt(0.5)).astype("<f4").tofile(path)
    return path


def samples(path):
    found = open_recording(path)
    return found.signal.compute(0, found.n_samples)


def is_valid(document):
    return Draft202012Validator(schema()).is_valid(document)


@pytest.mark.parametrize("name", FORMATS)
def test_a_stimulus_to_every_format_and_checked(made, tmp_path, name):
    done = run(made.files[0], tmp_path / "b", format=name)
    assert done.folder == tmp_path / "b" / f"case-{name}"
    assert sorted(done.folder.iterdir()) == sorted(done.files)
    assert is_valid(done.document)
    assert not done.differs
    assert done.document["law"]["verdict"] == "agrees"
    assert done.document["recipe"] == made.document["recipe"]
    assert done.document["loop"]["cycle_samples"] == made.document["loop"]["cycle_samples"]
    assert done.document["loop"]["seam"]["is_clean"]
    before = made.document
    for key in ("mean_dbfs", "peak_dbfs", "peak_between_samples_dbfs", "papr_db", "levels"):
        assert done.document[key] == before[key] == done.document["files"][0][key]
    converted = done.document["converted"]
    assert converted["from"] == "case.sigmf-data"
    assert converted["sha512"] == before["files"][0]["sha512"]
    assert (converted["rate_factor"], converted["gain_db"]) == ("1", 0)
    assert converted["before"] is None
    assert check(find_stimulus(done.folder))["verdict"] == "match"
    written = json.loads((done.folder / f"case-{name}.ccdf.json").read_text())
    assert written == done.document


def test_byte_order_follows_the_datatype(made, tmp_path):
    done = run(made.files[0], tmp_path / "b", format="raw", datatype="ci16_be")
    plain = np.fromfile(made.files[0], "<i2")
    np.testing.assert_array_equal(np.fromfile(done.files[0], ">i2"), plain)


def test_the_datatype_stays_where_the_format_has_it(recording, tmp_path):
    hints = ReadHints(sample_rate_hz=Fraction(1_000_000))
    done = run(recording, tmp_path / "b", hints, format="wav")
    assert done.document["files"][0]["datatype"] == "cf32_le"
    np.testing.assert_array_equal(samples(done.files[0]), np.fromfile(recording, "<c8"))
    done = run(done.files[0], tmp_path / "c", format="sigmf", datatype="ci8")
    assert done.document["files"][0]["datatype"] == "ci8"


def test_words_in_their_containers(made, tmp_path):
    for align, step in (("left", 16), ("right", 1)):
        done = run(
            made.files[0], tmp_path / align, format="raw", datatype="ci16_le", bits=12, align=align
        )
        codes = np.fromfile(done.files[0], "<i2")
        assert not (codes % step).any()
        assert np.abs(codes // step).max() <= 2048
        again = run(done.files[0], tmp_path / "again", format="npy", name=align)
        expected = codes.astype(np.float64) / step / 2048
        found = samples_at(again.files[0], 4_000_000).view(np.float32)
        np.testing.assert_allclose(found, expected, atol=1e-7)


def samples_at(path, rate_hz):
    found = open_recording(path, ReadHints(sample_rate_hz=Fraction(rate_hz)))
    return found.signal.compute(0, found.n_samples)


@pytest.mark.parametrize("gain_db", [-6.0, -0.5])
def test_a_gain(made, tmp_path, gain_db):
    done = run(made.files[0], tmp_path / "b", format="sigmf", gain_db=gain_db)
    assert done.document["mean_dbfs"] == pytest.approx(
        made.document["mean_dbfs"] + gain_db, abs=1e-3
    )
    assert done.document["converted"]["gain_db"] == gain_db
    before, after = made.document["scaling"], done.document["scaling"]
    for key in ("gain_db", "i_peak_dbfs", "q_peak_dbfs"):
        assert after[key] == pytest.approx(before[key] + gain_db, abs=1e-5)
    for key in ("peak_dbfs", "average_dbfs"):
        assert after[key] == pytest.approx(before[key] + gain_db, abs=1e-3)
    assert done.document["law"]["verdict"] == "agrees"


def test_a_peak(made, recording, tmp_path):
    done = run(made.files[0], tmp_path / "b", format="sigmf", peak_dbfs=-3.0, datatype="cf32_le")
    assert done.document["peak_between_samples_dbfs"] == pytest.approx(-3, abs=1e-4)
    assert done.document["converted"]["gain_db"] == pytest.approx(-2, abs=1e-3)
    hints = ReadHints(sample_rate_hz=Fraction(1_000_000))
    done = run(recording, tmp_path / "b", hints, format="wav", peak_dbfs=0.0)
    assert done.document["peak_between_samples_dbfs"] == pytest.approx(0, abs=1e-4)


@pytest.mark.parametrize(
    ("factor", "cycle"), [(Fraction(5, 4), 1000), (Fraction(1, 2), 400), (Fraction(9, 8), 900)]
)
def test_a_loop_at_another_rate(lab, tmp_path, factor, cycle):
    made = lab.make(lab.TONES + FLOAT, tmp_path / "a")
    assert made.document["loop"]["cycle_samples"] == 800
    rate_hz = 4_000_000 * factor
    done = run(made.files[0], tmp_path / "b", format="sigmf", sample_rate_hz=rate_hz)
    document = done.document
    assert is_valid(document)
    assert (document["n_samples"], document["sample_rate_hz"]) == (8000 * factor, rate_hz)
    assert document["duration_s"] == made.document["duration_s"]
    assert document["loop"]["cycle_samples"] == cycle
    assert document["loop"]["seam"]["is_clean"]
    assert document["converted"]["rate_factor"] == str(factor)
    assert document["law"] is None
    assert any("law" in note["text"] for note in document["warnings"])
    assert document["mean_dbfs"] == pytest.approx(made.document["mean_dbfs"], abs=1e-4)
    assert document["papr_between_samples_db"] == pytest.approx(
        made.document["papr_between_samples_db"], abs=0.05
    )
    # The waveform at every sample: eight Newman tones of 10 kHz spacing.
    spectrum = np.fft.fft(samples(made.files[0])) / 8000
    lines = np.flatnonzero(np.abs(spectrum) > 1e-4)
    numbers = np.where(lines > 4000, lines - 8000, lines)
    times = np.arange(document["n_samples"]) / document["n_samples"]
    exact = sum(
        spectrum[k] * np.exp(2j * np.pi * n * times) for k, n in zip(lines, numbers, strict=True)
    )
    assert np.abs(samples(done.files[0]) - exact).max() < 4e-6


def test_there_and_back(made, tmp_path):
    away = run(
        made.files[0],
        tmp_path / "b",
        format="npy",
        datatype="cf32_le",
        sample_rate_hz=Fraction(6_000_000),
    )
    back = run(away.files[0], tmp_path / "c", format="sigmf", sample_rate_hz=Fraction(4_000_000))
    assert np.abs(samples(back.files[0]) - samples(made.files[0])).max() < 4e-6
    converted = back.document["converted"]
    assert (converted["rate_factor"], converted["before"]["rate_factor"]) == ("2/3", "3/2")
    assert back.document["loop"]["cycle_samples"] == made.document["loop"]["cycle_samples"]
    assert is_valid(back.document)


def test_a_rate_at_which_the_loop_is_not_whole(made, tmp_path):
    with pytest.raises(ArgumentsError, match="whole"):
        run(made.files[0], tmp_path / "b", format="sigmf", sample_rate_hz=Fraction(4_000_001))
    assert not (tmp_path / "b").exists()


def test_a_gated_stimulus_keeps_its_on_time(lab, tmp_path):
    made = lab.make(lab.SINGLE + GATE, tmp_path / "a")
    same = run(made.files[0], tmp_path / "b", format="wav").document
    assert same["on_time"] == made.document["on_time"]
    twice = run(
        made.files[0], tmp_path / "b", format="npy", sample_rate_hz=Fraction(8_000_000)
    ).document
    assert twice["on_time"]["duty"] == 0.25
    marks = [
        np.genfromtxt(folder / f"{name}.markers.csv", int, delimiter=",", skip_header=1)[:, :2]
        for folder, name in ((made.folder, "case"), (tmp_path / "b" / "case-npy", "case-npy"))
    ]
    np.testing.assert_array_equal(marks[1], 2 * marks[0])
    assert twice["on_time"]["mean_dbfs"] == pytest.approx(
        made.document["on_time"]["mean_dbfs"], abs=0.05
    )
    assert is_valid(twice)


def test_a_recipe_that_cannot_be_built_any_more_is_told(made, tmp_path):
    path = made.folder / "case.ccdf.json"
    document = json.loads(path.read_text())
    document["recipe"]["text"] = document["recipe"]["text"].replace("tones", "tonnes")
    path.write_text(json.dumps(document))
    done = run(made.files[0], tmp_path / "b", format="wav")
    assert done.document["law"] is None
    assert any("cannot be built" in note["text"] for note in done.document["warnings"])
    assert is_valid(done.document)


def test_the_bench_is_looked_at_again(lab, tmp_path):
    """The average at the device stays, the peak over it is that of the new codes."""
    made = lab.make(lab.SINGLE + BENCH.replace("LIMIT", "3"), tmp_path / "a")
    done = run(made.files[0], tmp_path / "b", format="sigmf", datatype="ci8")
    (row,) = done.document["bench"]["path"]
    papr_db = done.document["papr_between_samples_db"]
    assert row["peak_envelope_dbm"] == pytest.approx(-10 + papr_db, abs=1e-3)
    path = made.folder / "case.ccdf.json"
    document = json.loads(path.read_text())
    document["bench"]["path"][0]["peak_limit_dbm"] = -9.0
    path.write_text(json.dumps(document))
    with pytest.raises(TargetMissed):
        run(made.files[0], tmp_path / "c", format="sigmf", datatype="ci8")
    assert not (tmp_path / "c").exists()


def test_changed_bytes_are_a_recording(made, tmp_path):
    content = bytearray(made.files[0].read_bytes())
    content[0] ^= 1
    made.files[0].write_bytes(content)
    done = run(made.files[0], tmp_path / "b", format="wav")
    assert done.document["is"] == "a recording"
    assert any("as a recording" in note["text"] for note in done.document["warnings"])
    assert [path.name for path in done.files] == ["case-wav.wav", "case-wav.markers.csv"]


def test_a_recording(recording, tmp_path):
    hints = ReadHints(sample_rate_hz=Fraction(1_000_000))
    done = run(recording, tmp_path / "b", hints, format="sigmf")
    assert [path.name for path in done.files] == [
        "noise-sigmf.sigmf-data",
        "noise-sigmf.sigmf-meta",
    ]
    plain = np.abs(np.fromfile(recording, "<c8")) ** 2
    document = done.document
    assert document["mean_dbfs"] == pytest.approx(10 * np.log10(plain.mean()), abs=1e-4)
    assert (document["law"], document["is"]) == (None, "a recording")
    assert json.loads(json.dumps(document, allow_nan=False)) == document
    done = run(done.files[0], tmp_path / "b", format="wav", sample_rate_hz=Fraction(1_500_000))
    assert done.document["n_samples"] == 7500
    assert any("ends" in note["text"] for note in done.document["warnings"])


def test_a_recording_does_not_go_round(tmp_path):
    """A tone of 2.5 cycles would jump at a seam: read cyclically it peaks 1 dB higher there."""
    path = tmp_path / "tone.cf32_le"
    (0.5 * np.exp(2j * np.pi * 2.5 * np.arange(1000) / 1000)).astype("<c8").tofile(path)
    hints = ReadHints(sample_rate_hz=Fraction(1000))
    for number, wanted in enumerate(({}, {"peak_dbfs": -6.0206})):
        done = run(path, tmp_path / str(number), hints, format="sigmf", **wanted)
        assert done.document["peak_between_samples_dbfs"] == pytest.approx(-6.02, abs=0.01)
        assert done.document["converted"]["gain_db"] == pytest.approx(0, abs=0.01)


def test_a_stimulus_of_real_samples_goes_round(lab, tmp_path):
    real = "output: {iq: [{format: wav, datatype: ri16_le, real: {centre: 1 MHz}}]}\n"
    made = lab.make(lab.SINGLE.replace("1 MHz,", "0.5 MHz,") + real, tmp_path / "a")
    done = run(made.files[0], tmp_path / "b", format="sigmf", datatype="cf32_le")
    assert done.document["loop"]["seam"]["is_clean"]
    assert done.document["warnings"] == made.document["warnings"]
    for key in ("mean_dbfs", "peak_dbfs", "papr_between_samples_db"):
        assert done.document[key] == pytest.approx(made.document[key], abs=1e-3)
    assert check(find_stimulus(done.folder))["verdict"] == "match"


TWO = (
    "second_channel: {level: 2 dB, signal: {kind: tones, count: 4, spacing: 10 kHz},"
    " stages: [{kind: gate, duty: 25 %, period: 0.5 ms}]}\n"
)


@pytest.fixture
def pair(lab, tmp_path):
    """Tones, and at 2 dB over them gated tones."""
    bench = BENCH.replace("LIMIT", "20")
    return lab.make(lab.TONES + TWO + bench + "output: {iq: [sigmf, raw]}\n", tmp_path / "a")


def channel(path, number):
    found = open_recording(path, ReadHints(channel=number, sample_rate_hz=Fraction(4_000_000)))
    return found.signal.compute(0, found.n_samples)


@pytest.mark.parametrize("name", FORMATS)
@pytest.mark.parametrize("source", ["case.sigmf-data", "case.ci16_le"])
def test_two_channels_stay_together(pair, tmp_path, source, name):
    done = run(pair.folder / source, tmp_path / "b", format=name)
    document, before = done.document, pair.document
    assert is_valid(document)
    for number in (0, 1):
        np.testing.assert_array_equal(
            channel(done.files[0], number), channel(pair.files[0], number)
        )
    for key in ("loop", "mean", "scaling"):
        assert document["second_channel"][key].keys() == before["second_channel"][key].keys()
    own = "rounding_noise_dbc"  # the same codes, but none where floats are written
    for old, new in zip(
        before["files"][0]["channels"], document["files"][0]["channels"], strict=True
    ):
        assert old == new | {own: new[own] or old[own]}
    assert document["law"]["verdict"] == "agrees"
    assert document["second_channel"]["law"]["name"] == before["second_channel"]["law"]["name"]
    assert document["second_channel"]["mean"] == before["second_channel"]["mean"]
    assert document["bench"] == before["bench"]
    assert document["converted"]["channel"] is None
    checked = check(find_stimulus(done.folder))
    assert checked["verdict"] == "match"
    assert len(checked["files"][0]["against_law"]["channels"]) == 2


def test_two_channels_keep_one_scale(pair, tmp_path):
    done = run(
        pair.files[0],
        tmp_path / "b",
        format="sigmf",
        datatype="cf32_le",
        peak_dbfs=-6.0,
        sample_rate_hz=Fraction(6_000_000),
    )
    first, second = done.document["files"][0]["channels"]
    peaks = [item["peak_between_samples_dbfs"] for item in (first, second)]
    assert max(peaks) == pytest.approx(-6, abs=1e-3)
    # a pulse of hard edges is not kept exactly by a change of rate: its own mean moves by 0.02 dB
    old = pair.document["files"][0]["channels"]
    between = [rows[1]["mean_dbfs"] - rows[0]["mean_dbfs"] for rows in (old, [first, second])]
    assert between[1] == pytest.approx(between[0], abs=0.05)
    assert second["on_time"]["duty"] == 0.25
    assert done.document["second_channel"]["loop"]["cycle_samples"] == (
        pair.document["second_channel"]["loop"]["cycle_samples"] * 1.5
    )
    assert is_valid(done.document)


@pytest.mark.parametrize("number", [0, 1])
def test_one_of_two_channels_is_a_stimulus(pair, tmp_path, number):
    hints = ReadHints(channel=number)
    done = run(pair.files[0], tmp_path / "b", hints, format="wav", gain_db=-1)
    document = done.document
    assert is_valid(document)
    assert document["second_channel"] is None
    assert document["converted"]["channel"] == number
    old = pair.document["files"][0]["channels"][number]
    law = pair.document["second_channel"]["law"] if number else pair.document["law"]
    assert document["law"]["name"] == law["name"]
    assert document["law"]["level_db"] == law["level_db"]
    assert (document["on_time"] is None) == (old["on_time"] is None)
    assert document["papr_db"] == pytest.approx(old["papr_db"], abs=1e-3)
    scaling = (pair.document["second_channel"] if number else pair.document)["scaling"]
    assert document["scaling"]["i_peak_dbfs"] == pytest.approx(scaling["i_peak_dbfs"] - 1)
    plain = run(pair.files[0], tmp_path / "c", hints, format="sigmf")
    about = open_recording(plain.files[0]).description
    assert about.endswith(f"; channel {number} of 2")
    assert "two coherent" not in about
    (row,) = document["bench"]["path"]
    assert "channel" not in row
    assert row["average_dbm"] == pair.document["bench"]["path"][number]["average_dbm"]
    assert check(find_stimulus(done.folder), question=Question(down_to=0.01))["verdict"] == "match"


def test_what_was_one_of_two_stays_so(pair, tmp_path):
    """Taken, then converted and checked again: law and on-time are those of its channel."""
    one = run(pair.files[0], tmp_path / "b", ReadHints(channel=1), format="wav")
    again = run(one.files[0], tmp_path / "c", format="npy", sample_rate_hz=Fraction(8_000_000))
    assert again.document["on_time"]["duty"] == 0.25
    assert again.document["converted"]["before"]["channel"] == 1
    marks = (again.folder / "case-wav-npy.markers.csv").read_text().splitlines()
    assert marks[1:4] == ["0,1000,burst on", "0,16000,period start", "4000,1000,burst on"]
    changed = one.folder / "case-wav.wav"
    content = bytearray(changed.read_bytes())
    content[-1] ^= 1
    changed.write_bytes(content)
    (row,) = check(find_stimulus(one.folder))["files"]
    (against,) = row["against_law"]["channels"]
    assert against["verdict"] != "differs"  # as it would from the law of the other channel


def test_a_recipe_with_fewer_channels_than_its_files(pair, tmp_path):
    path = pair.folder / "case.ccdf.json"
    document = json.loads(path.read_text())
    text = document["recipe"]["text"]
    document["recipe"]["text"] = text.replace(TWO, "")
    path.write_text(json.dumps(document))
    done = run(pair.files[0], tmp_path / "b", ReadHints(channel=1), format="wav")
    assert any("cannot be built" in note["text"] for note in done.document["warnings"])


def test_two_channels_of_a_recording(pair, tmp_path):
    (pair.folder / "case.ccdf.json").unlink()
    done = run(pair.files[0], tmp_path / "b", format="wav")
    assert done.document["is"] == "a recording"
    assert len(done.document["files"][0]["channels"]) == 2
    for number in (0, 1):
        np.testing.assert_array_equal(
            channel(done.files[0], number), channel(pair.files[0], number)
        )
    one = run(done.files[0], tmp_path / "c", ReadHints(channel=1), format="npy")
    np.testing.assert_array_equal(samples_at(one.files[0], 4_000_000), channel(pair.files[0], 1))
    assert one.document["converted"]["channel"] == 1


def test_two_real_channels_and_back(lab, tmp_path):
    second = "second_channel: {level: -3 dB, signal: {kind: tones, count: 4, spacing: 15 kHz}}\n"
    made = lab.make(lab.TONES + second + FLOAT, tmp_path / "a")
    centre = Fraction(1_000_000)
    with pytest.raises(FileError, match="two real channels"):
        run(made.files[0], tmp_path / "b", format="wav", real_centre_hz=centre)
    real = run(made.files[0], tmp_path / "b", format="sigmf", real_centre_hz=centre)
    assert real.document["files"][0]["real"] == {"centre_hz": 1e6}
    assert real.document["second_channel"]["law"]["verdict"] == "agrees"
    back = run(real.folder, tmp_path / "c", format="npy", datatype="cf32_le")
    assert is_valid(back.document)
    for number in (0, 1):  # images 100 dB down, float32 samples
        found, exact = channel(back.files[0], number), channel(made.files[0], number)
        assert np.abs(found - exact).max() < 2e-5
    one = run(real.folder, tmp_path / "d", ReadHints(channel=1), format="wav")
    assert one.document["converted"]["channel"] == 1
    assert one.document["converted"]["real"] == {"from_hz": 1e6, "to_hz": 1e6}
    assert check(find_stimulus(one.folder))["verdict"] == "match"


@pytest.mark.parametrize("name", FORMATS)
def test_real_output_is_what_make_writes(lab, tmp_path, name):
    text = lab.TONES
    both = f"output: {{iq: [sigmf, {{format: {name}, name: real, real: {{centre: 1 MHz}}}}]}}\n"
    made = lab.make(text + both, tmp_path / "a")
    stated = made.document["files"][1]
    done = run(
        made.files[0],
        tmp_path / "b",
        format=name,
        datatype=stated["datatype"],
        real_centre_hz=Fraction(1_000_000),
    )
    (found,) = done.document["files"]
    assert found["real"] == stated["real"] == {"centre_hz": 1e6}
    assert is_valid(done.document)
    for key in ("mean_dbfs", "peak_dbfs", "peak_between_samples_dbfs"):
        assert found[key] == pytest.approx(stated[key], abs=1e-3)
    assert done.document["loop"]["seam"]["is_clean"]
    assert check(find_stimulus(done.folder))["verdict"] == "match"
    # the codes of `make` are rounded once, those of a conversion twice: one code apart at most
    real = [
        open_recording(path, ReadHints(sample_rate_hz=Fraction(4_000_000)))
        for path in (made.folder / stated["name"], done.files[0])
    ]
    first, second = (item.signal.compute(0, item.n_samples).real for item in real)
    assert np.abs(first - second).max() <= 1.01 / 32768


def test_real_and_back_is_the_baseband(lab, tmp_path):
    made = lab.make(lab.NOISE + FLOAT, tmp_path / "a")
    away = run(made.files[0], tmp_path / "b", format="npy", real_centre_hz=Fraction(1_100_000))
    assert away.document["files"][0]["datatype"] == "rf32_le"
    assert away.document["converted"]["real"] == {"from_hz": None, "to_hz": 1.1e6}
    moved = run(
        away.files[0],
        tmp_path / "c",
        format="npy",
        sample_rate_hz=Fraction(5_000_000),
        real_centre_hz=Fraction(1_300_000),
    )
    assert moved.document["converted"]["real"] == {"from_hz": 1.1e6, "to_hz": 1.3e6}
    back = run(
        moved.files[0],
        tmp_path / "d",
        format="sigmf",
        datatype="cf32_le",
        sample_rate_hz=Fraction(4_000_000),
    )
    # images 100 dB down, two changes of rate whose ripple is 1e-5, float32 samples
    assert np.abs(samples(back.files[0]) - samples(made.files[0])).max() < 4e-5
    assert back.document["files"][0]["real"] is None
    assert any("1.3 MHz to 0 Hz" in note["text"] for note in back.document["notes"])
    assert is_valid(back.document)


def test_real_samples_stay_real_byte_by_byte(lab, tmp_path):
    text = lab.TONES
    made = lab.make(text + "output: {iq: [{format: raw, real: {centre: 1 MHz}}]}\n", tmp_path / "a")
    done = run(made.files[0], tmp_path / "b", format="wav")
    again = run(done.files[0], tmp_path / "c", format="raw")
    assert again.files[0].read_bytes() == made.files[0].read_bytes()
    assert again.document["files"][0]["real"] == {"centre_hz": 1e6}


def test_a_real_recording_is_measured_without_going_round(tmp_path):
    """A tone of 2.5 cycles a recording: round it would jump."""
    path = tmp_path / "tone.cf32_le"
    n = np.arange(4000)
    (0.5 * np.exp(2j * np.pi * 2.5 * n / 4000)).astype("<c8").tofile(path)
    hints = ReadHints(sample_rate_hz=Fraction(1_000_000))
    done = run(path, tmp_path / "b", hints, format="wav", real_centre_hz=Fraction(200_001))
    found = open_recording(done.files[0]).signal.compute(0, 4000)
    exact = 0.5 * np.exp(2j * np.pi * n * (2.5 / 4000 + 0.200001))
    np.testing.assert_allclose(found.real, exact.real, atol=1e-6)
    np.testing.assert_allclose(found[400:-400], exact[400:-400], atol=1e-5)
    (row,) = done.document["files"]
    assert row["real"] == {"centre_hz": 200_001}
    # the envelope as it is read again: zeros beyond the ends
    power = np.abs(found) ** 2
    assert row["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=1e-4)


def test_the_centre_frequency_moves_along(tmp_path):
    path = tmp_path / "x.sigmf-meta"
    np.exp(2j * np.pi * np.arange(1000) / 1000).astype("<c8").tofile(tmp_path / "x.sigmf-data")
    fields = {"core:datatype": "cf32_le", "core:sample_rate": 1e6, "core:version": "1.2.5"}
    capture = {"core:sample_start": 0, "core:frequency": 100e6}
    path.write_text(json.dumps({"global": fields, "captures": [capture], "annotations": []}))
    done = run(path, tmp_path / "b", format="sigmf", real_centre_hz=Fraction(250_000), gain_db=-1)
    assert open_recording(done.files[0]).centre_frequency_hz == 99.75e6
    back = run(
        done.files[0],
        tmp_path / "c",
        format="sigmf",
        datatype="cf32_le",
        input_real_centre_hz=Fraction(250_000),
    )
    assert open_recording(back.files[0]).centre_frequency_hz == 100e6


def test_real_samples_become_their_envelope(tmp_path):
    """A real carrier of amplitude a half has the envelope a half; where it stands is not known."""
    import soundfile

    n = np.arange(20_000)
    soundfile.write(tmp_path / "real.wav", 0.5 * np.cos(2 * np.pi * n / 8), 48_000, "PCM_16")
    done = run(tmp_path / "real.wav", tmp_path / "b", format="sigmf", datatype="ci16_le")
    inside = samples(done.files[0])[1000:-1000]
    exact = 0.5 * np.exp(2j * np.pi * n[1000:-1000] / 8)
    np.testing.assert_allclose(inside, exact, atol=1e-4)
    (note,) = [note for note in done.document["notes"] if "analytic" in note["text"]]
    assert "--input-real-centre" in note["text"]


def test_codes_that_would_be_cut_are_refused(recording, tmp_path):
    hints = ReadHints(sample_rate_hz=Fraction(1_000_000))
    with pytest.raises(ArgumentsError) as caught:
        run(recording, tmp_path / "b", hints, format="wav", datatype="int16", gain_db=12)
    assert caught.value.where == "--gain"
    assert not (tmp_path / "b").exists()
    done = run(recording, tmp_path / "b", hints, format="wav", gain_db=12)
    assert done.document["peak_dbfs"] > 0


def test_a_gain_beyond_the_range_of_floats(recording, tmp_path):
    hints = ReadHints(sample_rate_hz=Fraction(1_000_000))
    raised = run(recording, tmp_path / "a", hints, format="sigmf", gain_db=300)
    twice = run(raised.files[0], tmp_path / "b", format="sigmf", gain_db=300)
    with pytest.raises(SignalError, match="finite"):
        run(twice.files[0], tmp_path / "c", format="sigmf", gain_db=300)
    assert not (tmp_path / "c").exists()


def test_full_scale_itself_is_cut_by_one_code_and_told(tmp_path):
    path = tmp_path / "full.cf32_le"
    np.array([1, -1, 1j, -1j] * 100, "<c8").tofile(path)
    hints = ReadHints(sample_rate_hz=Fraction(1000))
    done = run(path, tmp_path / "b", hints, format="wav", datatype="int16")
    codes = samples(done.files[0])
    assert codes.real.max() == pytest.approx(32767 / 32768)
    assert any("200 I or Q codes" in note["text"] for note in done.document["warnings"])


@pytest.mark.parametrize(
    ("wanted", "where"),
    [
        ({"format": "wavv"}, "--to"),
        ({"format": "wav", "datatype": "ri16_le"}, "--datatype"),
        ({"format": "wav", "datatype": "cf32_le", "real_centre_hz": Fraction(10**6)}, "--datatype"),
        ({"format": "wav", "real_centre_hz": Fraction(2_000_000)}, "--real-centre"),
        ({"format": "wav", "real_centre_hz": Fraction(10_000)}, "--real-centre"),
        ({"format": "wav", "input_real_centre_hz": Fraction(10_000)}, "--input-real-centre"),
        ({"format": "wav", "peak_dbfs": 0.1}, "--peak"),
        ({"format": "wav", "peak_dbfs": float("-inf")}, "--peak"),
        ({"format": "wav", "gain_db": 1e9}, "--gain"),
        ({"format": "wav", "gain_db": float("nan")}, "--gain"),
        ({"format": "wav", "sample_rate_hz": Fraction(1)}, "--sample-rate"),
    ],
)
def test_what_cannot_be_honoured(made, tmp_path, wanted, where):
    with pytest.raises(ArgumentsError) as caught:
        run(made.files[0], tmp_path / "b", **wanted)
    assert caught.value.where == where
    assert not (tmp_path / "b").exists()


@pytest.mark.parametrize(
    "wanted",
    [
        {"format": "wav", "datatype": "ci8"},
        {"format": "wav", "name": "../x"},
        {"format": "wav", "name": "a/b"},
        {"format": "wav", "name": ".."},
        {"format": "wav", "name": ""},
        {"format": "wav", "bits": 12},
        {"format": "wav", "sample_rate_hz": Fraction(9_999_000, 7)},
    ],
)
def test_what_the_format_or_the_disk_does_not_take(made, tmp_path, wanted):
    with pytest.raises((FileError, ArgumentsError)):
        run(made.files[0], tmp_path / "b", **wanted)
    assert not (tmp_path / "b").exists()


def test_what_exists_is_kept(made, tmp_path):
    done = run(made.files[0], tmp_path / "b", format="wav")
    before = done.files[0].read_bytes()
    with pytest.raises(FileError, match="exists"):
        run(made.files[0], tmp_path / "b", format="wav", gain_db=-3)
    assert done.files[0].read_bytes() == before
    run(made.files[0], tmp_path / "b", format="wav", gain_db=-3, overwrite=True)
    assert done.files[0].read_bytes() != before


@pytest.mark.parametrize("name", ["sigmf", "wav"])
def test_the_source_and_its_sidecar_are_never_written_over(made, tmp_path, name):
    content = {path: path.read_bytes() for path in made.folder.iterdir()}
    with pytest.raises(ArgumentsError, match="belongs to the file"):
        run(made.files[0], tmp_path / "a", format=name, name="case", overwrite=True)
    assert {path: path.read_bytes() for path in made.folder.iterdir()} == content


def test_the_bytes_do_not_depend_on_the_workers(made, tmp_path):
    wanted = Conversion(format="sigmf", sample_rate_hz=Fraction(5_000_000))
    found = [
        convert(made.files[0], wanted, hints=NO_HINTS, out=tmp_path / str(n), workers=n)
        for n in (1, 3)
    ]
    assert found[0].document == found[1].document


def test_nothing_is_left_of_one_that_fails_half_way(made, tmp_path, monkeypatch):
    monkeypatch.setattr(room, "export", None)
    with pytest.raises(TypeError):
        run(made.files[0], tmp_path / "b", format="wav", sample_rate_hz=Fraction(5_000_000))
    assert not (tmp_path / "b").exists()
