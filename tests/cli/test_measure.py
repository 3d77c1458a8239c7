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
    assert "1 sample " in said.out
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
