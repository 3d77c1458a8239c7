import json

import numpy as np
import pytest

RATE = ("--sample-rate", "1MHz")


@pytest.fixture
def pair(noise):
    return noise(name="one.cf32_le"), noise(name="two.cf32_le")


def test_statuses(call, pair, noise):
    said = call("match", *pair, *RATE, "--loop")
    assert said.status == 0
    assert "Match:" in said.out
    assert max(map(len, said.out.splitlines())) <= 80
    assert call("match", *pair, *RATE).status == 6
    clipped = noise(name="clipped.cf32_le")
    samples = np.fromfile(clipped, "<c8")
    (samples / np.maximum(np.abs(samples), 1)).astype("<c8").tofile(clipped)
    said = call("match", pair[0], clipped, *RATE, "--loop")
    assert said.status == 5
    assert "DIFFER" in said.out
    assert call("match", pair[0], clipped, *RATE, "--loop", "--tolerance", "20dB").status == 0


def test_document(call, pair):
    document = call("match", *pair, *RATE, "--loop", "--down-to", "1%", "--json").json()
    assert document["verdict"] == "match"
    assert document["largest_difference_db"] == 0
    assert document["tolerance_db"] == 0.2
    assert [row["probability"] for row in document["levels"]] == [0.5, 0.2, 0.1, 0.05, 0.02, 0.01]
    json.dumps(document, allow_nan=False)


def test_records_as_they_stand(call, noise, tmp_path):
    """Two short records of one process: open as samples of it, different as records."""
    first, second = noise(name="one.cf32_le"), tmp_path / "two.cf32_le"
    np.fromfile(noise(name="long.cf32_le", n=10_000), "<c8")[5000:].tofile(second)
    said = call("match", first, second, *RATE)
    assert said.status == 6
    assert "Undecided: as recorded one.cf32_le stands" in " ".join(said.out.split())
    said = call("match", first, second, *RATE, "--as-recorded")
    assert said.status == 5
    assert "Differ: as recorded, one.cf32_le stands" in said.out
    assert call("match", first, first, *RATE, "--as-recorded").status == 0


def test_options_of_one_side_win_over_those_for_both(call, pair):
    document = call(
        "match",
        *pair,
        *RATE,
        "--loop",
        "--stimulus-reference-level",
        "-20dBm",
        "--json",
        "--field-period",
        "1000samples",
    ).json()
    assert "mean_dbm" in document["stimulus"]
    assert "mean_dbfs" in document["field"]
    assert document["stimulus"]["n_samples"] == 5000
    assert document["field"]["n_samples"] == 1000


def test_a_recipe_against_its_own_loop(call, recipe, tmp_path):
    path = recipe()
    assert call("make", path).status == 0
    said = call("match", tmp_path / "output" / "pier", path)
    assert said.status == 0
    assert "the law of a recipe" in said.out


def test_a_curve_against_noise(call, noise, tmp_path):
    level = np.arange(-20, 10, 0.5)
    rows = [f"{x:g};{100 * np.exp(-(10 ** (x / 10))):.9g}" for x in level]
    path = tmp_path / "screen.csv"
    path.write_text("Level [dB];Probability [%]\n" + "\n".join(rows) + "\n")
    said = call("match", noise(n=400_000), path, *RATE, "--down-to", "1%")
    assert said.status == 0
    assert "unknown" in said.err
    assert call("match", path, noise(), *RATE, "--field-curve-samples", "1e6").status == 6


@pytest.mark.parametrize(
    "options",
    [
        ("--tolerance", "0"),
        ("--tolerance", "0dB"),
        ("--down-to", "60%"),
        ("--down-to", "x"),
        ("--curve-samples", "0"),
        ("--curve-samples", "1.5"),
        ("--reading", "-1dB"),
        ("--threshold", "-3dB"),
        ("--gate", "2"),
        ("--set", "seed=2"),
        ("--field-set", "seed=2"),
    ],
)
def test_arguments_that_are_none(call, pair, options):
    said = call("match", *pair, *RATE, *options)
    assert said.status == 2
    assert said.out == ""


def test_options_that_mean_nothing_for_a_recipe(call, recipe, noise):
    said = call("match", recipe(), noise(), "--sample-rate", "1MHz")
    assert said.status == 2
    said = call("match", recipe(), noise(), "--field-sample-rate", "1MHz", "--remove-dc")
    assert said.status == 2
    assert "--remove-dc" in said.err


def test_files_that_are_none(call, noise, tmp_path):
    assert call("match", tmp_path / "none.wav", noise(), *RATE).status == 4
    silent = tmp_path / "silent.cf32_le"
    np.zeros(5000, "<c8").tofile(silent)
    assert call("match", silent, noise(), *RATE).status == 4
    assert call("match", noise(), silent, "--stimulus-sample-rate", "1MHz").status == 4
    assert call("match", "no-such-recipe.yaml", noise()).status == 3
