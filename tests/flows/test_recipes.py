"""Every shipped recipe from its name to its files, through the command line."""

import json

import numpy as np
import pytest
import scipy.signal
from jsonschema import Draft202012Validator

from wavegen.cli.main import run
from wavegen.production.sidecar import schema
from wavegen.recipe.find import shipped_recipes

SHIPPED = {name: path for name, _, path in shipped_recipes()}
DTYPES = {"i16_le": "<i2", "f32_le": "<f4", "i8": "i1"}
"""NumPy's name of a rail by what follows ``c`` or ``r`` in a datatype."""
SHORTER = {
    "receiver-noise-floor": "5 ms",
    "valley-cell-20mhz": "1 ms",
    "valley-cell-clipped": "1 ms",
    "ferry-two-carriers": "1 ms",
    "festival-cell-mixed": "1 ms",
    "hillside-cell-clip-filter": "1 ms",
    "causeway-two-carriers-cancelled": "1 ms",
    "weir-link-16qam-projected": "1 ms",
    "quarry-cell-windowed": "1 ms",
}
"""Loops that would take long; each is still whole in every part of the recipe."""


def channels_of(item):
    return item["channels"] or [item]


def codes(path, item):
    """Read the channels at the end of a data file, full scale 1.0, without this program.

    Real samples give their analytic signal over the whole loop.
    """
    dtype = np.dtype(DTYPES[item["datatype"][1:]])
    is_real = item["datatype"].startswith("r")
    n_columns = (1 if is_real else 2) * len(channels_of(item))
    size = n_columns * dtype.itemsize * item["n_samples"]
    rails = np.frombuffer(path.read_bytes()[-size:], dtype).astype(np.float64)
    n_bits = item["bits"] if item["align"] == "right" else 8 * dtype.itemsize
    columns = rails.reshape(-1, n_columns).T / (1.0 if dtype.kind == "f" else 2.0 ** (n_bits - 1))
    return scipy.signal.hilbert(columns) if is_real else columns[::2] + 1j * columns[1::2]


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
        # A loop follows its own law exactly; of a process a short one may be too little to tell.
        is_process = document["law"]["about"] == "the process it samples"
        assert document["law"]["verdict"] in {"agrees", *(["undecided"] if is_process else [])}
    else:
        assert document["no_law"]
    for item in document["files"]:
        found = codes(folder / item["name"], item)
        for samples, figures in zip(found, channels_of(item), strict=True):
            power = np.abs(samples) ** 2
            assert figures["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=1e-4)
            # The quadrature of real samples is by a filter with an image 100 dB down.
            assert figures["peak_dbfs"] == pytest.approx(10 * np.log10(power.max()), abs=3e-4)
            assert figures["peak_between_samples_dbfs"] <= 0.001

    capsys.readouterr()
    for item in document["files"]:
        options = ["--sample-rate", "15.36 MHz"] if item["format"] == "raw" else []
        for number, figures in enumerate(channels_of(item)):
            channel = ["--channel", str(number)] if item["channels"] else []
            path = str(folder / item["name"])
            assert run(["measure", path, "--json", *options, *channel]) == 0
            measured = json.loads(capsys.readouterr().out)
            assert measured["is"] == "this loop"
            assert measured["warnings"] == []
            assert measured["levels"] == figures["levels"]
            assert measured["mean_dbfs"] == figures["mean_dbfs"]


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
