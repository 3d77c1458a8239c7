"""The verb `shape` on the command line."""

import json

import numpy as np
import pytest

from wavegen.cli.main import run


@pytest.fixture
def field(tmp_path):
    n = 1 << 14
    rng = np.random.default_rng(5)
    spectrum = np.where(np.abs(np.fft.fftfreq(n)) < 0.2, 1, 0) * (
        rng.standard_normal(n) + 1j * rng.standard_normal(n)
    )
    x = np.fft.ifft(spectrum)
    x *= 0.1 / np.sqrt(np.mean(np.abs(x) ** 2))
    path = tmp_path / "field.ci16"
    np.rint(np.stack([x.real, x.imag], 1) * 32768).astype("<i2").tofile(path)
    return path


def test_a_field_becomes_a_stimulus(field, tmp_path, capsys):
    words = ["shape", str(field), "--format", "ci16_le", "--sample-rate", "1MHz"]
    words += ["--out", str(tmp_path / "out"), "--duration", "16384samples"]
    assert run([*words, "--json"]) == 0
    document = json.loads(capsys.readouterr().out)
    assert document["verdict"] == "match"
    assert document["name"] == "field-shaped"
    assert run(words) == 4  # nothing is replaced unasked
    capsys.readouterr()
    assert run([*words, "--overwrite", "--seed", "2"]) == 0
    assert "match: every level" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("words", "status"),
    [
        (["--name", "../x"], 2),
        (["--seed", "-1"], 2),
        (["--bandwidth", "5"], 2),
        (["--tolerance", "0dB"], 2),
        (["--duration", "1.5samples"], 2),
        (["--duration", "10samples"], 2),
        (["--duration", "1e9samples"], 2),
        (["--set", "seed=2"], 2),
    ],
)
def test_wrong_options_are_refused(field, tmp_path, capsys, words, status):
    base = ["shape", str(field), "--format", "ci16_le", "--sample-rate", "1MHz"]
    try:
        found = run([*base, "--out", str(tmp_path / "out"), *words])
    except SystemExit as ended:
        found = ended.code
    assert found == status
    assert capsys.readouterr().err
    assert not (tmp_path / "out").exists()


def test_no_such_field(tmp_path, capsys):
    assert run(["shape", str(tmp_path / "none.sigmf-meta"), "--out", str(tmp_path / "o")]) == 4
    assert "none" in capsys.readouterr().err
