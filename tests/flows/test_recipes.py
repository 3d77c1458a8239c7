"""Every shipped recipe from its name to its files, through the command line."""

import json

import numpy as np
import pytest
from jsonschema import Draft202012Validator

from wavegen.cli.main import run
from wavegen.production.sidecar import schema
from wavegen.recipe.find import shipped_recipes

SHIPPED = {name: path for name, _, path in shipped_recipes()}
DTYPES = {"ci16_le": "<i2", "cf32_le": "<f4", "float32": "<f4", "int16": "<i2", "ci8": "i1"}
SHORTER = {
    "receiver-noise-floor": "5 ms",
    "valley-cell-20mhz": "1 ms",
    "valley-cell-clipped": "1 ms",
    "ferry-two-carriers": "1 ms",
    "festival-cell-mixed": "1 ms",
}
"""Loops that would take long; each is still whole in every part of the recipe."""


def codes(path, item):
    """Read the samples at the end of a data file, full scale 1.0, with NumPy alone."""
    dtype = np.dtype(DTYPES[item["datatype"]])
    rails = np.frombuffer(path.read_bytes()[-2 * dtype.itemsize * item["n_samples"] :], dtype)
    scale = 1.0 if dtype.kind == "f" else 2.0 ** (8 * dtype.itemsize - 1)
    pairs = rails.astype(np.float64).reshape(-1, 2) / scale
    return pairs[:, 0] + 1j * pairs[:, 1]


def test_there_are_enough():
    assert len(SHIPPED) >= 8


@pytest.mark.parametrize("name", SHIPPED)
def test_each_has_a_title_and_says_what_is_invented_or_what_for(name):
    lines = SHIPPED[name].read_text(encoding="utf-8").splitlines()
    assert lines[0] == "wavegen: 1"
    (title,) = [line for line in lines if line.startswith("title: ")]
    assert len(title) > 20
    comment = " ".join(line.lstrip("# ") for line in lines if line.startswith("#"))
    assert len(comment.split()) >= 8


@pytest.mark.parametrize("name", SHIPPED)
def test_made_measured_and_told(name, tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    options = ["--set", f"duration={SHORTER[name]}"] if name in SHORTER else []
    assert run(["make", name, *options]) == 0
    shown = capsys.readouterr()
    assert shown.err == "" or "error" not in shown.err
    assert max(map(len, shown.out.splitlines())) <= 80
    folder = tmp_path / "output" / name
    document = json.loads((folder / f"{name}.ccdf.json").read_text(encoding="utf-8"))
    Draft202012Validator(schema()).validate(document)
    assert document["loop"]["seam"]["is_clean"]
    if name in SHORTER:
        assert not [note for note in document["rounded"] if note["where"] == "duration"]
    if document["law"]:
        assert document["law"]["verdict"] == "agrees"
    for item in document["files"]:
        power = np.abs(codes(folder / item["name"], item)) ** 2
        assert item["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=1e-4)
        assert item["peak_dbfs"] == pytest.approx(10 * np.log10(power.max()), abs=1e-4)
        assert item["peak_between_samples_dbfs"] <= 0.001

    capsys.readouterr()
    for item in document["files"]:
        assert run(["measure", str(folder / item["name"]), "--json"]) == 0
        measured = json.loads(capsys.readouterr().out)
        assert measured["is"] == "this loop"
        assert measured["levels"] == item["levels"]
        assert measured["mean_dbfs"] == item["mean_dbfs"]


def test_a_recipe_and_its_measurement_tell_the_same(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    name = "harbour-link-qpsk"
    assert run(["measure", name, "--json"]) == 0
    predicted = json.loads(capsys.readouterr().out)
    assert run(["make", name, "--json"]) == 0
    made = json.loads(capsys.readouterr().out)
    # Rounding to 16 bits at -6 dBFS moves a level by less than 0.001 dB.
    assert predicted["papr_db"] == pytest.approx(made["papr_db"], abs=0.002)
    for before, after in zip(predicted["levels"], made["levels"], strict=True):
        assert before["level_db"] == pytest.approx(after["level_db"], abs=0.01)
