import shutil
from pathlib import Path

import numpy as np
import pytest

RECORDINGS = Path(__file__).parents[1] / "files" / "recordings"


@pytest.fixture
def made(call, recipe, tmp_path):
    assert call("make", recipe()).status == 0
    return tmp_path / "output" / "pier" / "pier.sigmf-data"


def test_a_stimulus(call, made, tmp_path):
    said = call("convert", made, "--to", "wav")
    assert said.status == 0
    assert "this loop" in said.out
    assert "agrees" in said.out
    assert max(map(len, said.out.splitlines())) <= 80
    folder = tmp_path / "output" / "pier-wav"
    assert str(folder.relative_to(tmp_path)) in said.out
    assert call("check", folder).status == 0
    assert "converted" in call("show", folder).out
    assert call("measure", folder / "pier-wav.wav", "--json").json()["is"] == "this loop"


def test_as_json(call, made):
    document = call("convert", made, "--to", "npy", "--name", "x", "--json").json()
    assert document["converted"]["from"] == "pier.sigmf-data"
    assert document["folder"].endswith("x")


def test_level_and_rate(call, made):
    document = call(
        "convert", made, "--to", "wav", "--gain", "-3dB", "--sample-rate", "6MHz", "--json"
    ).json()
    assert document["converted"]["gain_db"] == -3
    assert document["sample_rate_hz"] == 6e6
    document = call("convert", made, "--to", "npy", "--peak", "-2 dBFS", "--json").json()
    assert document["peak_between_samples_dbfs"] == pytest.approx(-2, abs=1e-3)
    assert call("convert", made, "--to", "mat", "--peak", "-2dBFS", "--gain", "1dB").status == 2


@pytest.mark.parametrize(
    ("options", "rate_hz", "n_samples"),
    [
        (("--sample-rate", "10kHz"), 10_000, 10_000),
        (("--input-sample-rate", "10kHz"), 10_000, 10_000),
        (("--input-sample-rate", "10kHz", "--sample-rate", "20kHz"), 20_000, 20_000),
    ],
)
def test_the_rate_of_a_file_without_one(call, options, rate_hz, n_samples):
    path = RECORDINGS / "rxnoise_440mhz_10ksps.ci16_le"
    document = call("convert", path, "--to", "sigmf", *options, "--json").json()
    assert (document["sample_rate_hz"], document["n_samples"]) == (rate_hz, n_samples)
    assert document["is"] == "a recording"


def test_a_recording_with_annotations(call, tmp_path):
    path = RECORDINGS / "nbiot_uplink_832mhz_640ksps_cut.sigmf-data"
    said = call(
        "convert", path, "--to", "sigmf", "--sample-rate", "1.28 MHz", "--datatype", "cf32_le"
    )
    assert said.status == 0
    assert "ends" in said.err
    made = tmp_path / "output" / f"{path.stem}-sigmf" / f"{path.stem}-sigmf"
    shown = call("show", made, "--json").json()
    assert (shown["n_annotations"], shown["datatype"]) == (9, "cf32_le")
    assert shown["centre_frequency_hz"] == 832_344_126
    assert shown["n_samples"] == 156_000


def test_words_in_and_out(call, tmp_path):
    codes = np.arange(-2048, 2048, dtype="<i2")
    codes.tofile(tmp_path / "x.iq")
    told = ("--format", "ci16_le", "--input-bits", "12", "--input-align", "right")
    out = ("--bits", "12", "--align", "left", "--sample-rate", "1MHz")
    assert call("convert", "x.iq", "--to", "raw", *told, *out).status == 0
    found = np.fromfile(tmp_path / "output" / "x-raw" / "x-raw.ci16_le", "<i2")
    np.testing.assert_array_equal(found, codes * 16)


def test_real_output_and_back(call, made, tmp_path):
    options = ("--to", "wav", "--real-centre", "1.00001 MHz")
    said = call("convert", made, *options)
    assert said.status == 0
    assert "complex to real around 1 MHz" in said.out
    assert "moved by -10 Hz" in said.err
    assert "around 1 MHz" in call("show", tmp_path / "output" / "pier-wav" / "pier-wav.wav").out
    real = tmp_path / "output" / "pier-wav" / "pier-wav.wav"
    said = call("convert", real, "--to", "sigmf", "--datatype", "ci16_le")
    assert (said.status, "moved from 1 MHz to 0 Hz" in said.err) == (0, True)
    assert "real around 1 MHz to complex" in said.out
    assert call("check", tmp_path / "output" / "pier-wav-sigmf").status == 0
    shutil.copy(real, tmp_path / "field.wav")
    told = ("--input-real-centre", "1MHz")
    said = call("convert", "field.wav", "--to", "npy", "--real-centre", "0.9MHz", *told)
    words = " ".join(said.out.split())
    assert (said.status, "real around 1 MHz to real around 900 kHz" in words) == (0, True)
    for more, status in (
        (("--real-centre", "1MHz"), 2),
        (("--input-real-centre", "3MHz", "--datatype", "cf32_le"), 2),
        (("--input-real-centre", "1"), 2),
    ):
        assert call("convert", "field.wav", "--to", "npy", "--name", "x", *more).status == status
    assert not (tmp_path / "output" / "x").exists()


def test_what_exists_and_what_is_read_stay(call, made):
    assert call("convert", made, "--to", "wav").status == 0
    assert call("convert", made, "--to", "wav").status == 4
    assert call("convert", made, "--to", "wav", "--overwrite").status == 0
    said = call("convert", made, "--to", "sigmf", "--name", "pier", "--overwrite")
    assert said.status == 2
    assert call("check", made).status == 0


@pytest.mark.parametrize(
    ("options", "status"),
    [
        (("--to", "wavv"), 2),
        ((), 2),
        (("--to", "wav", "--datatype", "ci8"), 4),
        (("--to", "wav", "--sample-rate", "4.000001 MHz"), 2),
        (("--to", "wav", "--sample-rate", "4"), 2),
        (("--to", "wav", "--gain", "3"), 2),
        (("--to", "wav", "--gain", "30dB", "--datatype", "int16"), 2),
        (("--to", "wav", "--peak", "1dBFS"), 2),
        (("--to", "wav", "--name", "../x"), 4),
        (("--to", "wav", "--bits", "13"), 2),
        (("--to", "wav", "--channel", "1"), 4),
    ],
)
def test_statuses(call, made, options, status):
    said = call("convert", made, *options)
    assert said.status == status
    assert said.out == ""


@pytest.mark.parametrize(
    ("name", "content"),
    [("x.wav", b"RIFF"), ("x.sigmf-meta", b"{"), ("x.npy", b"\x93NUMPY\1\0"), ("x.iq", b"")],
)
def test_hostile_files(call, tmp_path, name, content):
    (tmp_path / name).write_bytes(content)
    said = call("convert", name, "--to", "wav")
    assert said.status == 4
    assert name in said.err
    assert not (tmp_path / "output").exists()


@pytest.mark.parametrize("value", [np.nan, np.inf, 0.0])
def test_samples_without_figures(call, tmp_path, value):
    np.full(100, value, "<c8").tofile(tmp_path / "x.cf32_le")
    for datatype in ("int16", "float32"):
        said = call(
            "convert", "x.cf32_le", "--to", "wav", "--sample-rate", "1MHz", "--datatype", datatype
        )
        assert said.status == 4
    assert not (tmp_path / "output").exists()


def test_a_folder_and_nothing(call, tmp_path):
    assert call("convert", tmp_path, "--to", "wav").status == 4
    assert call("convert", "missing.wav", "--to", "wav").status == 4
    assert call("convert", "x" * 300 + ".wav", "--to", "wav").status == 4


def test_an_output_that_cannot_be(call, made, tmp_path):
    (tmp_path / "file").write_text("")
    assert call("convert", made, "--to", "wav", "--out", tmp_path / "file").status == 4


def test_a_sidecar_that_is_broken(call, made):
    sidecar = made.parent / "pier.ccdf.json"
    sidecar.write_text('{"name": "pier.sigmf-data"')
    assert call("convert", made, "--to", "wav").status == 4
    sidecar.unlink()
    assert call("convert", made, "--to", "wav").status == 0


def test_a_copy_under_another_name_is_a_recording(call, made, tmp_path):
    for end in ("data", "meta"):
        shutil.copy(made.with_suffix(f".sigmf-{end}"), tmp_path / f"copy.sigmf-{end}")
    assert "a recording" in call("convert", "copy.sigmf-data", "--to", "wav").out
