import json
import math

import numpy as np
import pytest

RATE = ("--sample-rate", "1 MHz")


def numpy_figures(samples):
    power = np.abs(samples.astype(np.complex128)) ** 2
    mean_db = 10 * math.log10(power.mean())
    return mean_db, 10 * math.log10(power.max()) - mean_db


def test_a_recording(call, noise):
    said = call("measure", noise(), *RATE)
    assert said.status == 0
    assert "a recording" in said.out
    assert "noise.cf32_le" in said.out
    assert "too few samples" in said.out
    assert said.err == ""
    assert max(map(len, said.out.splitlines())) <= 80


@pytest.mark.parametrize("scale", [1e-25, 1e-10, 1.0, 1e25])
def test_figures_at_any_scale(call, noise, scale):
    path = noise(scale)
    document = call("measure", path, *RATE, "--json").json()
    mean_db, papr_db = numpy_figures(np.fromfile(path, "<c8"))
    assert document["mean_dbfs"] == pytest.approx(mean_db, abs=1e-3)
    assert document["papr_db"] == pytest.approx(papr_db, abs=1e-3)
    assert document["papr_between_samples_db"] >= document["papr_db"]
    assert (document["n_samples"], document["is"]) == (5000, "a recording")


def test_keys_of_the_document(call, noise):
    document = call("measure", noise(), *RATE, "--json").json()
    for key in ("mean_dbfs", "peak_dbfs", "papr_db", "levels", "ccdf", "law", "warnings"):
        assert key in document
    assert (document["file_format"], document["datatype"]) == ("raw", "cf32_le")


@pytest.mark.parametrize(
    ("content", "problem"),
    [
        (np.zeros(100, "<c8"), "zero"),
        (np.array([1, 2, np.nan], "<c8"), "sample 2"),
        (np.array([np.inf, 2, 1], "<c8"), "sample 0"),
        (np.zeros(0, "<c8"), "empty"),
        (np.zeros(3, "u1"), "3 bytes"),
    ],
)
def test_files_without_figures(call, tmp_path, content, problem):
    path = tmp_path / "odd.cf32_le"
    content.tofile(path)
    said = call("measure", path, *RATE)
    assert said.status == 4
    assert said.out == ""
    assert "odd.cf32_le" in said.err
    assert problem in said.err


def test_one_sample(call, tmp_path):
    path = tmp_path / "one.cf32_le"
    np.array([0.5j], "<c8").tofile(path)
    said = call("measure", path, *RATE)
    assert said.status == 0
    assert "1 sample\n" in said.out
    assert "-6.02 dBFS" in said.out


@pytest.mark.parametrize(
    ("name", "text"),
    [("notes.txt", "hello\n"), ("x.bin", "\x01\x02\x03"), ("x.wav", "RIFF"), ("x.iq", "")],
)
def test_files_of_another_kind(call, tmp_path, name, text):
    path = tmp_path / name
    path.write_text(text)
    said = call("measure", path)
    assert said.status == 4
    assert name in said.err


def test_a_folder(call, tmp_path):
    assert call("measure", tmp_path).status == 4
    assert call("make", tmp_path).status == 3


def test_a_recipe_given_as_data_is_measured_as_a_recipe(call, recipe):
    document = call("measure", recipe(), "--json").json()
    assert document["is"] == "this loop"
    assert document["mean_dbfs"] == pytest.approx(0, abs=1e-4)
    assert document["seam"]["is_clean"]


def test_a_recipe_under_another_name_is_no_data(call, recipe):
    said = call("measure", recipe(name="recipe.txt"))
    assert said.status == 4
    assert "text" in said.err


def test_data_given_as_a_recipe(call, noise):
    said = call("make", noise())
    assert said.status == 3
    assert "noise.cf32_le" in said.err


@pytest.mark.parametrize(
    "option",
    [
        ("--format", "ci16_le"),
        ("--sample-rate", "1 MHz"),
        ("--full-scale", "2048"),
        ("--reference-level", "0 dBm"),
        ("--from", "0 ms"),
        ("--to", "1 ms"),
        ("--period", "1 ms"),
        ("--loop",),
    ],
)
def test_options_that_do_not_fit_a_recipe(call, recipe, option):
    said = call("measure", recipe(), *option)
    assert said.status == 2
    assert option[0] in said.err


def test_set_does_not_fit_data(call, noise):
    said = call("measure", noise(), *RATE, "--set", "seed=2")
    assert said.status == 2
    assert "--set" in said.err


def test_set_changes_a_measured_recipe(call, recipe):
    document = call("measure", recipe(), "--json", "--set", "signal.count=1").json()
    assert document["papr_db"] == pytest.approx(0, abs=1e-4)


def test_a_shipped_recipe_by_name_and_a_file_of_that_name(call, tmp_path):
    shipped = "power-reference-carrier"
    assert call("measure", shipped, "--json").json()["name"] == shipped
    (tmp_path / shipped).write_text("hello\n")
    assert call("measure", shipped).status == 4


def part(call, path, *options):
    return call("measure", path, *RATE, "--json", *options).json()


def test_parts_of_a_file(call, noise):
    path = noise()
    samples = np.fromfile(path, "<c8")
    for options, stretch in (
        (("--from", "1 ms"), samples[1000:]),
        (("--to", "1000samples"), samples[:1000]),
        (("--from", "1000 samples", "--to", "4 ms"), samples[1000:4000]),
        (("--from", "4999 samples"), samples[4999:]),
        (("--period", "3 ms"), samples[:3000]),
        (("--from", "1 ms", "--period", "2000 samples"), samples[1000:3000]),
    ):
        document = part(call, path, *options)
        mean_db, papr_db = numpy_figures(stretch)
        assert document["n_samples"] == stretch.size
        assert document["mean_dbfs"] == pytest.approx(mean_db, abs=1e-4)
        assert document["papr_db"] == pytest.approx(papr_db, abs=1e-3)
        is_loop = "--period" in options
        assert document["is"] == ("this loop" if is_loop else "a recording")


@pytest.mark.parametrize(
    "options",
    [
        ("--from", "5 ms"),
        ("--from", "2 ms", "--to", "2 ms"),
        ("--from", "2 ms", "--to", "1 ms"),
        ("--to", "5001 samples"),
        ("--period", "5001 samples"),
        ("--period", "0 samples"),
        ("--from", "3 ms", "--period", "3 ms"),
        ("--from", "-1 samples"),
        ("--from", "1.5 us"),
        ("--from", "0.5 samples"),
        ("--to", "5 MHz"),
        ("--to", "5"),
        ("--to", "soon"),
        ("--to", "1e99 s"),
    ],
)
def test_parts_that_are_not_there(call, noise, options):
    said = call("measure", noise(), *RATE, *options)
    assert said.status == 2
    assert said.out == ""


def test_loop_reads_on_over_the_end(call, tmp_path):
    # A complex tone of 2.5 cycles: read cyclically it jumps to its negative at the seam.
    path = tmp_path / "tone.cf32_le"
    np.exp(2j * np.pi * 2.5 * np.arange(1000) / 1000).astype("<c8").tofile(path)
    once, loop = part(call, path), part(call, path, "--loop")
    assert (once["is"], loop["is"]) == ("a recording", "this loop")
    assert once["papr_between_samples_db"] == pytest.approx(0, abs=0.01)
    assert loop["papr_between_samples_db"] > 0.5


@pytest.mark.parametrize("separate", [True, False])
def test_reference_level_gives_mean_and_peak_with_the_warning(call, noise, separate):
    option = ["--reference-level", "-20dBm"] if separate else ["--reference-level=-20 dBm"]
    path = noise(0.1)
    said = call("measure", path, *RATE, *option)
    assert said.status == 0
    document = part(call, path, *option)
    for key in ("mean", "peak_between_samples"):
        shown = document[f"{key}_dbfs"] - 20
        assert f"{shown:.2f} dBm" in said.out
    assert "peak envelope power" in said.out
    assert "qualified people" in said.out
    assert document["mean_dbm"] == pytest.approx(document["mean_dbfs"] - 20, abs=1e-6)
    assert "dBm" not in call("measure", path, *RATE).out


def test_full_scale_and_format(call, tmp_path):
    path = tmp_path / "capture.bin"
    np.full(400, 1024, "<i2").tofile(path)
    document = part(call, path, "--format", "ci16_le", "--full-scale", "2048")
    assert document["mean_dbfs"] == pytest.approx(10 * math.log10(0.5), abs=1e-4)
    said = call("measure", path, "--format", "ci61_le", *RATE)
    assert said.status == 2
    assert "ci16_le" in said.err
    assert call("measure", path, "--format", "ci16_le").status == 4


def test_a_written_stimulus_is_a_loop(call, recipe, tmp_path):
    made = call("make", recipe(), "--json").json()
    folder = tmp_path / "output" / "pier"
    for name in ("pier.sigmf-data", "pier.sigmf-meta", "pier"):
        document = call("measure", folder / name, "--json").json()
        assert document["is"] == "this loop"
        assert document["seam"]["is_clean"]
        for key in ("mean_dbfs", "peak_dbfs", "peak_between_samples_dbfs", "levels", "ccdf"):
            assert document[key] == made[key]
    cut = call("measure", folder / "pier", "--from", "1 ms", "--json").json()
    assert cut["is"] == "a recording"
    (folder / "pier.ccdf.json").unlink()
    assert call("measure", folder / "pier", "--json").json()["is"] == "a recording"


def test_a_file_that_its_sidecar_does_not_describe(call, recipe, tmp_path):
    call("make", recipe(), "--set", "output.iq=[{format: raw, datatype: ci8}]")
    path = tmp_path / "output" / "pier" / "pier.ci8"
    path.write_bytes(path.read_bytes()[:-2])
    said = call("measure", path, "--sample-rate", "4 MHz")
    assert said.status == 0
    assert "a recording" in said.out
    assert "8000 samples" in said.err


def test_a_broken_sidecar(call, recipe, tmp_path):
    call("make", recipe())
    folder = tmp_path / "output" / "pier"
    (folder / "other.ccdf.json").write_text("{")
    assert call("measure", folder / "pier.sigmf-data").status == 0
    (folder / "pier.ccdf.json").write_text('{"name": "pier.sigmf-data"')
    said = call("measure", folder / "pier.sigmf-data")
    assert said.status == 4
    assert "pier.ccdf.json" in said.err
    assert call("measure", folder / "pier.ccdf.json").status == 4


def test_a_disagreeing_rate_is_told(call, recipe, tmp_path):
    call("make", recipe())
    path = tmp_path / "output" / "pier" / "pier.sigmf-data"
    said = call("measure", path, "--sample-rate", "5 MHz", "--json")
    assert "5 MHz" in json.dumps(said.json()["warnings"])


def test_words_are_as_told(call, tmp_path):
    path = tmp_path / "words.ci16_le"
    np.full(400, 1024, "<i2").tofile(path)
    for options, power in (
        (("--bits", "12", "--align", "right"), 0.5),  # 1024 of 2048 on both rails
        (("--bits", "12", "--align", "left"), 2 / 1024),
        ((), 2 / 1024),
    ):
        document = part(call, path, *options)
        assert document["mean_dbfs"] == pytest.approx(10 * math.log10(power), abs=1e-4)
    assert document["datatype"] == "ci16_le"
    document = part(call, path, "--bits", "12", "--align", "right")
    assert document["datatype"] == "ci16_le_12bit_right"
    assert call("measure", path, *RATE, "--bits", "13", "--align", "left").status == 2
    assert call("measure", path, *RATE, "--bits", "12").status == 2


REAL = "output={iq: [{format: raw, real: {centre: 1 MHz}}]}"
WORDS = "output={iq: [{format: raw, bits: 14, align: right}]}"
BOTH = "second_channel={level: -6 dB, signal: {kind: carrier}}"
PIER = ("--sample-rate", "4 MHz", "--json")


def test_real_samples_of_a_stimulus_are_a_loop_without_ends(call, recipe, tmp_path):
    made = call("make", recipe(), "--set", REAL, "--json").json()
    path = tmp_path / "output" / "pier" / made["files"][0]["name"]
    document = call("measure", path, *PIER).json()
    assert (document["is"], document["is_real"], document["warnings"]) == ("this loop", True, [])
    for key in ("mean_dbfs", "peak_between_samples_dbfs", "levels", "ccdf"):
        assert document[key] == made[key]
    cut = call("measure", path, *PIER, "--from", "0.5 ms").json()
    assert "beyond its ends" in cut["warnings"][0]["text"]


def test_the_sidecar_tells_the_words(call, recipe, tmp_path):
    made = call("make", recipe(), "--set", WORDS, "--json").json()
    path = tmp_path / "output" / "pier" / made["files"][0]["name"]
    document = call("measure", path, *PIER).json()
    assert document["mean_dbfs"] == made["mean_dbfs"]
    assert document["datatype"] == "ci16_le_14bit_right"
    told = call("measure", path, *PIER, "--bits", "16", "--align", "right").json()
    assert told["mean_dbfs"] == pytest.approx(made["mean_dbfs"] - 20 * math.log10(4), abs=1e-5)


def test_channels_are_measured_one_at_a_time(call, recipe, tmp_path):
    path = recipe()
    made = call("make", path, "--set", BOTH, "--set", "output.iq=[raw, sigmf]", "--json").json()
    assert "channel 1" in call("make", path, "--set", BOTH, "--out", "other").out
    for item in made["files"]:
        file = tmp_path / "output" / "pier" / item["name"]
        said = call("measure", file, *PIER)
        assert said.status == 4
        assert "--channel 0" in said.err
        for number in (0, 1):
            document = call("measure", file, *PIER, "--channel", number).json()
            assert (document["is"], document["channel"]) == ("this loop", number)
            assert document["mean_dbfs"] == item["channels"][number]["mean_dbfs"]
        assert call("measure", file, *PIER, "--channel", "2").status == 4
    assert "channel 1, this loop" in call("measure", file, "--channel", "1").out


def test_channels_of_a_recipe(call, recipe):
    path = recipe()
    said = call("measure", path, "--set", BOTH)
    assert said.status == 2
    assert "--channel 0" in said.err
    document = call("measure", path, "--set", BOTH, "--channel", "1", "--json").json()
    assert document["mean_dbfs"] == pytest.approx(10 * math.log10(10**-0.6), abs=1e-4)
    assert document["channel"] == 1
    assert call("measure", path, "--set", BOTH, "--channel", "2").status == 2
    assert call("measure", path, "--channel", "1").status == 2
    assert "channel" not in call("measure", path, "--channel", "0", "--json").json()


@pytest.mark.parametrize(
    ("heading", "factor_db"), [("power_dBm", 0.0), ("power (mW)", 0.0), ("power (W)", 30.0)]
)
def test_a_power_series_has_no_peak_between_samples(call, tmp_path, heading, factor_db):
    power = np.array([1.0, 2.0, 4.0, 1.0] * 100)
    column = 10 * np.log10(power) if "dBm" in heading else power
    rows = "".join(f"{n * 1e-6:.6f},{x:.9f}\n" for n, x in enumerate(column))
    path = tmp_path / "sensor.csv"
    path.write_text(f"time (s),{heading}\n{rows}")
    said = call("measure", path)
    assert said.status == 0
    assert "power series" in said.out
    assert "none" in said.out
    document = call("measure", path, "--json").json()
    assert document["is_power"]
    assert document["peak_between_samples_dbfs"] is document["papr_between_samples_db"] is None
    assert document["mean_dbm"] == pytest.approx(10 * math.log10(2) + factor_db, abs=1e-4)
    assert document["peak_envelope_dbm"] == pytest.approx(10 * math.log10(4) + factor_db, abs=1e-4)
    assert f"{document['peak_envelope_dbm']:.2f} dBm, of the largest sample" in said.out


def burst_file(tmp_path, name="bursts.ci16_le", n=64_000):
    """Noise, on for 500 of 2000 samples; 10 000 to full scale."""
    rng = np.random.default_rng(3)
    rails = rng.standard_normal((n, 2)) * 2000
    rails[np.arange(n) % 2000 >= 500] *= 0.01
    path = tmp_path / name
    np.round(rails).astype("<i2").tofile(path)
    return path


def test_levels_of_a_recording_have_intervals(call, noise):
    document = part(call, noise(n=100_000))
    first = document["levels"][0]
    assert first["low_db"] < first["level_db"] < first["high_db"]
    assert first["low_db"] < 3.622 < first["high_db"]
    assert set(document["ccdf"]) == {"level_db", "probability", "low", "high"}
    assert document["process"]["is"] == "the process it samples"
    assert document["process"]["next_decade"]["times"] > 1
    assert "process, 95 %" in call("measure", noise(), *RATE).out


def test_a_loop_makes_two_statements(call, tmp_path):
    rng = np.random.default_rng(4)
    path = tmp_path / "loop.cf32_le"
    np.tile(rng.standard_normal(2 * 5110), 10).astype("<f4").tofile(path)
    said = call("measure", path, *RATE, "--loop")
    assert "this loop" in said.out
    assert "repeat after 5110 samples" in " ".join(said.out.split())
    document = part(call, path, "--loop")
    assert "low_db" not in document["levels"][0]
    assert (document["process"]["n_samples"], document["process"]["n_data_periods"]) == (5110, 10)
    assert document["process"]["levels"][0]["low_db"] is not None
    # Measured as one period it is the same.
    once = part(call, path, "--period", "5110samples")
    assert once["process"]["levels"] == document["process"]["levels"]
    for one, many in zip(once["levels"][:3], document["levels"][:3], strict=True):
        assert one["level_db"] == many["level_db"]


def test_levels_at_other_probabilities(call, noise):
    path = noise(n=100_000)
    document = part(call, path, "--at", "0.05", "--at", "0.2%")
    assert [row["probability"] for row in document["levels"]][:4] == [0.1, 0.05, 0.01, 0.002]
    assert "0.2 %" in call("measure", path, *RATE, "--at", "0.2%").out


def test_too_little_data_for_any_level_asked(call, noise):
    path = noise()
    assert call("measure", path, *RATE, "--at", "1e-6").status == 6
    assert call("measure", path, *RATE, "--at", "1e-6", "--at", "0.1").status == 0
    assert call("measure", path, *RATE).status == 0
    assert call("measure", path, *RATE, "--at", "1e-6", "--loop").status == 0


def test_time_above_a_level(call, noise):
    path = noise(n=100_000)
    options = ("--above", "3dB", "--above", "0dBm", "--reference-level", "-20dBm")
    over, absolute = part(call, path, *options)["time_shares"]
    # exp(-10^0.3) and exp(-100): 3 sigma of 1e5.
    assert over["above_percent"] == pytest.approx(100 * math.exp(-(10**0.3)), abs=0.35)
    assert absolute["above_percent"] == 0
    said = call("measure", path, *RATE, "--above", "0dBm")
    assert said.status == 2
    assert "--reference-level" in said.err
    assert "Share of the time" in call("measure", path, *RATE, *options).out


def test_levels_in_dbm(call, noise):
    document = part(call, noise(), "--reference-level", "-20dBm")
    absolute = document["absolute"]
    level = document["levels"][0]["level_db"] + document["mean_dbm"]
    assert absolute["levels"][0]["level_dbm"] == pytest.approx(level, abs=1e-3)
    assert len(absolute["level_dbm"]) == len(document["ccdf"]["level_db"])


def test_bursts_found_by_level(call, tmp_path):
    path = burst_file(tmp_path)
    document = part(call, path, "--gate", "auto")
    on = document["on_time"]
    assert on["bursts"]["n_bursts"] == 32
    assert on["duty"] == pytest.approx(0.25, abs=0.02)
    assert on["mean_dbfs"] - document["mean_dbfs"] == pytest.approx(6.02, abs=0.1)
    assert on["levels"][0]["level_db"] == pytest.approx(3.62, abs=0.1)
    tuned = part(
        call, path, "--gate", "auto", "--threshold", "-12dB", "--hysteresis", "2dB",
        "--dead-time", "50us", "--guard", "20us", "--gate-window", "32us",
        "--shortest-burst", "100us", "--bursts", "each",
    )["on_time"]  # fmt: skip
    assert tuned["guard_samples"] == 20
    assert tuned["search"]["window_samples"] == 32
    over = tuned["search"]["threshold_dbfs"] - tuned["search"]["on_level_dbfs"]
    assert over == pytest.approx(-12, abs=0.05)  # the on-level is that above the threshold
    assert len(tuned["bursts"]["each"]) == 32
    assert tuned["one_by_one"]["levels"][0]["level_db"] == pytest.approx(3.62, abs=0.1)
    said = call("measure", path, *RATE, "--gate", "auto", "--bursts", "each")
    assert "The on-time" in said.out
    assert "Bursts one by one" in said.out
    assert max(map(len, said.out.splitlines())) <= 80


def test_bursts_by_markers_or_pattern(call, tmp_path):
    path = burst_file(tmp_path)
    pattern = part(call, path, "--gate", "1000", "--slot", "0.5ms")["on_time"]
    assert (pattern["n_samples"], pattern["duty"]) == (16_000, 0.25)
    late = part(call, path, "--gate", "0100", "--slot", "0.5ms", "--gate-delay", "1.5ms")
    assert late["on_time"]["mean_dbfs"] == pattern["mean_dbfs"]
    said = call("measure", path, *RATE, "--gate", "markers")
    assert said.status == 4
    assert "no marker" in said.err
    marks = "".join(f"{start},500,burst on\n" for start in range(0, 64_000, 2000))
    (tmp_path / "bursts.markers.csv").write_text("start_sample,n_samples,label\n" + marks)
    marked = part(call, path, "--gate", "markers")["on_time"]
    assert marked["mean_dbfs"] == pattern["mean_dbfs"]
    assert call("measure", path, *RATE, "--gate", "markers", "--marker", "x").status == 4


@pytest.mark.parametrize(
    ("options", "word"),
    [
        (("--threshold", "-10dB"), "--gate auto"),
        (("--gate", "markers", "--hysteresis", "1dB"), "--gate auto"),
        (("--gate", "auto", "--threshold", "10dB"), "below 0 dB"),
        (("--gate", "auto", "--hysteresis", "-1dB"), "hysteresis"),
        (("--gate", "auto", "--marker", "x"), "--gate markers"),
        (("--gate", "auto", "--slot", "1ms"), "pattern"),
        (("--gate", "10"), "--slot"),
        (("--gate", "10", "--slot", "1.5us"), "--slot"),
        (("--gate", "sometimes"), "auto, markers"),
        (("--bursts", "each"), "--gate"),
        (("--guard", "1us"), "--gate"),
        (("--video-shape", "one-pole"), "--video-bandwidth"),
        (("--video-bandwidth", "9MHz"), "video bandwidth"),
        (("--sensor-rate", "2MHz"), "sensor rate"),
        (("--at", "2"), "probability"),
        (("--above", "3"), "level"),
    ],
)
def test_options_that_do_not_go_together(call, noise, options, word):
    said = call("measure", noise(), *RATE, *options)
    assert said.status == 2
    assert said.out == ""
    assert word in said.err


@pytest.mark.parametrize("option", [("--remove-dc",), ("--gate", "markers"), ("--marker", "x")])
def test_more_options_that_do_not_fit_a_recipe(call, recipe, option):
    said = call("measure", recipe(), *option)
    assert said.status == 2
    assert option[0] in said.err


def test_faults_are_told_and_an_offset_goes_when_asked(call, tmp_path):
    rng = np.random.default_rng(5)
    rails = rng.standard_normal((100_000, 2)) * 1000 + (3000, -1000)
    path = tmp_path / "field.ci16_le"
    np.round(rails).astype("<i2").tofile(path)
    said = call("measure", path, *RATE)
    assert said.status == 0
    assert "DC offset" in said.err
    assert "--remove-dc" in said.err
    (fault,) = part(call, path)["faults"]
    assert (fault["kind"], fault["file"]) == ("dc_offset", "field.ci16_le")
    assert fault["size"] == pytest.approx(10 * math.log10(5), abs=0.05)
    document = part(call, path, "--remove-dc")
    assert document["faults"] == []
    assert "taken off" in document["warnings"][0]["text"]
    assert document["removed_offset"]["i"] == pytest.approx(3000 / 32768, abs=5e-4)
    assert document["mean_dbfs"] == pytest.approx(20 * math.log10(1000 / 32768) + 3.01, abs=0.03)
    assert document["levels"][0]["level_db"] == pytest.approx(3.62, abs=0.03)
    assert "DC offset taken off" in call("measure", path, *RATE, "--remove-dc").out


def test_what_a_sensor_would_read(call, noise):
    path = noise(n=100_000)
    options = ("--video-bandwidth", "100kHz", "--sensor-rate", "250kHz")
    document = part(call, path, *options)
    assert document["sensor"]["n_samples"] == pytest.approx(25_000, abs=50)
    assert document["sensor"]["levels"][0]["shortfall_db"] > 1
    said = call("measure", path, *RATE, *options, "--video-shape", "brick-wall")
    assert "what a sensor of limited bandwidth reads" in said.out
    first = document["sensor"]["levels"][0]
    assert first["low_db"] < first["level_db"] < first["high_db"]
    assert said.out.count("process, 95 %") == 2
    assert "brick wall" in " ".join(said.out.split())


def test_rf_levels_beside_those_of_the_envelope(call, noise, tmp_path):
    document = part(call, noise(n=100_000), "--rf")
    assert document["rf"]["levels"][0]["level_db"] == pytest.approx(4.323, abs=0.05)
    assert "rf" not in part(call, noise())
    rng = np.random.default_rng(6)
    real = tmp_path / "real.rf32_le"
    rng.standard_normal(20_000).astype("<f4").tofile(real)
    document = part(call, real)
    assert document["rf"]["peak_over_envelope_db"] == pytest.approx(3.0103, abs=1e-4)
    assert "RF waveform" in call("measure", real, *RATE).out


def test_several_files_are_one_population(call, noise):
    paths = [noise(name="a.cf32_le", n=5000), noise(name="b.cf32_le", n=20_000)]
    document = call("measure", *paths, *RATE, "--json").json()
    assert document["is"] == "a population of 2 recordings"
    assert document["n_samples"] == 25_000
    samples = np.concatenate([np.fromfile(path, "<c8") for path in paths])
    mean_db, papr_db = numpy_figures(samples)
    assert document["mean_dbfs"] == pytest.approx(mean_db, abs=1e-4)
    assert document["papr_db"] == pytest.approx(papr_db, abs=1e-3)
    said = call("measure", *paths, *RATE)
    assert "Files of the population" in said.out
    assert "b.cf32_le" in said.out
    loops = call("measure", *paths, *RATE, "--loop", "--json").json()
    assert loops["is"] == "a population of 2 loops"
    assert "low_db" not in loops["levels"][0]


def test_files_that_are_no_population(call, noise, recipe, tmp_path):
    path = noise()
    said = call("measure", path, recipe(), *RATE)
    assert said.status == 2
    assert "pier.yaml" in said.err
    call("make", recipe())
    said = call("measure", tmp_path / "output" / "pier" / "pier.sigmf-data", path, *RATE)
    assert said.status == 0  # the rate that is told holds for both
    power = tmp_path / "power.csv"
    power.write_text(
        "time (s),power_dBm\n" + "".join(f"{k * 1e-6:.6f},{k % 7}\n" for k in range(90))
    )
    said = call("measure", path, power, *RATE)
    assert said.status == 2
    assert "one by one" in said.err


OFDM = """wavegen: 1
sample_rate: 1.92 MHz
duration: 140 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups: [{subcarriers: "-30..-1, 1..30", constellation: qpsk}]
  cyclic_prefix: [10/128, 6 x 9/128]
"""


def test_papr_per_symbol_of_a_recipe_and_of_its_stimulus(call, recipe, tmp_path):
    path = recipe(OFDM)
    document = call("measure", path, "--json").json()
    found = document["per_symbol"]
    assert found["n_symbols"] == 140
    assert [item["mean"] for item in found["over"]] == ["ensemble", "symbol"]
    high, law = found["over"][0]["levels"][0]["papr_db"], found["law"]["levels"][0]["papr_db"]
    # 14 of 140 symbols lie beyond: 3 sqrt(0.1 0.9 / 140) over a slope of 0.25 a dB.
    assert high == pytest.approx(law, abs=0.35)
    assert high > document["levels"][0]["level_db"] + 3
    call("make", path)
    made = call("measure", tmp_path / "output" / "pier" / "pier.sigmf-data", "--json").json()
    stimulus = made["per_symbol"]["over"][0]["levels"][0]["papr_db"]
    assert stimulus == pytest.approx(high, abs=0.02)
    said = call("measure", tmp_path / "output" / "pier" / "pier.sigmf-data").out
    assert "PAPR of each symbol" in said
    assert "too few symbols" in said
    cut = tmp_path / "output" / "pier" / "pier.sigmf-data"
    assert "per_symbol" not in call("measure", cut, "--from", "1samples", "--json").json()


def test_the_gate_of_a_recipe_is_shown_unasked(call, recipe, tmp_path):
    text = OFDM + "stages: [{kind: gate, pattern: '10', slot: 2.5 ms}]\n"
    document = call("measure", recipe(text), "--json").json()
    assert document["on_time"]["duty"] == 0.5
    call("make", recipe(text))
    made = call("measure", tmp_path / "output" / "pier" / "pier.sigmf-data", "--json").json()
    assert made["on_time"]["duty"] == 0.5
    difference = made["on_time"]["papr_db"] - document["on_time"]["papr_db"]
    assert difference == pytest.approx(0, abs=0.01)


def test_the_bench_says_what_full_scale_is(call, recipe, texts, tmp_path):
    path = recipe(texts.RECIPE + texts.BENCH.replace("LIMIT", "30"))
    document = call("measure", path, "--json").json()
    assert document["mean_dbm"] == pytest.approx(-10, abs=1e-5)
    assert "bench" in document["reference_is"]
    call("make", path)
    made = call("measure", tmp_path / "output" / "pier" / "pier.sigmf-data", "--json").json()
    assert made["mean_dbm"] == pytest.approx(-10, abs=1e-4)
    told = call(
        "measure", tmp_path / "output" / "pier" / "pier.sigmf-data", "--json",
        "--reference-level", "3dBm",
    ).json()  # fmt: skip
    assert told["reference_level_dbm"] == 3.0


def test_a_power_series_has_intervals_and_no_faults(call, tmp_path):
    rng = np.random.default_rng(7)
    power = rng.exponential(size=5000)
    path = tmp_path / "sensor.csv"
    rows = "".join(f"{k * 1e-6:.6f},{p:.9f}\n" for k, p in enumerate(power))
    path.write_text(f"time (s),power (mW)\n{rows}")
    document = call("measure", path, "--json", "--video-bandwidth", "50kHz").json()
    assert document["levels"][0]["low_db"] < 3.622 < document["levels"][0]["high_db"]
    assert document["faults"] == []
    assert document["sensor"]["papr_db"] < document["papr_db"]
    said = call("measure", path, "--remove-dc")
    assert said.status == 2
    assert "--remove-dc" in said.err


@pytest.mark.parametrize("n", [1, 2, 40, 64, 65])
def test_a_record_of_few_samples(call, tmp_path, n):
    path = tmp_path / "short.ci16_le"
    np.random.default_rng(n).integers(-9000, 9000, 2 * n).astype("<i2").tofile(path)
    said = call("measure", path, *RATE)
    assert said.status == 0
    assert "CCDF" in said.out


def test_bursts_without_a_gate_are_pointed_out(call, tmp_path):
    rng = np.random.default_rng(4)
    rails = (
        rng.standard_normal((60_000, 2))
        * np.where(np.arange(60_000) % 20_000 < 5000, 900, 9)[:, None]
    )
    path = tmp_path / "bursts.ci16_le"
    rails.astype("<i2").tofile(path)
    assert "--gate auto" in call("measure", path, *RATE).err
    assert "--gate auto" not in call("measure", path, *RATE, "--gate", "auto").err
