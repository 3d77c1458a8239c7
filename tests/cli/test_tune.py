import argparse
import json
import math

import pytest

from wavegen.cli.tune import probability, share
from wavegen.recipe.load import load_recipe

CELL = """wavegen: 1
title: Pier cell   # for the tests
seed: 5
sample_rate: 7.68 MHz
duration: 28 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {subcarriers: "-36..-1, 1..36", constellation: 64qam}
  cyclic_prefix: 36/512
  edge_window: 32/512   # leaves room
"""
LIMITS = ("--evm-limit", "8%", "--aclr-limit", "45dB", "--at", "1%", "--seconds", "20")
ONE = ("--method", "clip_filter")


def test_a_cell_is_tuned(call, recipe, tmp_path):
    said = call("tune", recipe(CELL, "pier.yaml"), *LIMITS, *ONE)
    assert said.status == 0
    assert "clip filter" in said.out
    assert "as it is" in said.out
    assert "onfirmed on other data" in said.out
    assert "between samples" in said.err
    assert max(map(len, said.out.splitlines())) <= 80
    found = load_recipe(tmp_path / "output" / "pier" / "pier-tuned.yaml")
    assert "# leaves room" in found.text
    assert len(found.recipe.stages) == 1
    assert call("tune", "pier.yaml", *LIMITS, *ONE).status == 4, "existing files are kept"


def test_json_of_two_methods_and_gone_on_with(call, recipe):
    path = recipe(CELL, "pier.yaml")
    methods = ("--method", "peak_cancellation", "--method", "selected_mapping")
    said = call("tune", path, *LIMITS, *methods, "--json", "--out", "made")
    assert said.status == 0
    document = said.json()
    best = document["best"]
    assert set(best) >= {
        "method", "settings", "level_db", "evm_percent", "aclr_db", "bound_db",
    }  # fmt: skip
    assert best["method"] in {"peak_cancellation", "selected_mapping"}
    assert best["evm_percent"] <= 8
    assert {row["method"] for row in document["evaluations"]} >= {
        "peak_cancellation",
        "selected_mapping",
    }
    (once,) = [row for row in document["methods"] if row["method"] == "peak_cancellation"]
    assert once["state"] == "kept"
    again = call("tune", path, *LIMITS, *methods, "--json", "--out", "made", "--overwrite")
    assert json.loads(again.out)["n_resumed"] >= len(document["evaluations"])


def test_limits_out_of_reach_end_with_5_and_the_nearest(call, recipe, tmp_path):
    said = call(
        "tune", recipe(CELL, "pier.yaml"), "--evm-limit", "8%", "--aclr-limit", "80dB", *ONE
    )
    assert said.status == 5
    assert "Nearest" in said.out
    assert "misses its limit" in said.out
    assert not (tmp_path / "output" / "pier" / "pier-tuned.yaml").exists()
    document = call(
        "tune", "pier.yaml", "--evm-limit", "8%", "--aclr-limit", "80dB", *ONE, "--json"
    ).json()
    assert document["best"] is None
    assert document["nearest"]["aclr_db"] < 80


def test_no_time_is_undecided(call, recipe):
    arguments = ("--evm-limit", "8%", "--method", "clip", "--seconds", "0.000001")
    assert call("tune", recipe(CELL, "pier.yaml"), *arguments).status == 6


def test_standards_reserve_and_their_channels(call, recipe):
    arguments = ("--evm-limit", "NR BS FR1", "--evm-reserve", "4.8%", "--at", "1%", "--json")
    document = call("tune", recipe(CELL, "pier.yaml"), *arguments, *ONE).json()
    assert document["limits"]["evm_standard"] == "NR BS FR1"
    assert document["best"]["evm_percent"] <= 6.4


def test_the_mask_of_the_recipe_is_kept(call, recipe):
    mask = (
        "mask: {points: [{offset: 700 kHz, level: -28 dB}, {offset: 3 MHz, level: -40 dB}], "
        "measurement_bandwidth: 60 kHz}\n"
    )
    said = call("tune", recipe(CELL + mask, "pier.yaml"), "--method", "clip", "--json")
    document = said.json()
    assert document["limits"]["keeps_mask"]
    found = document["best"] or document["nearest"]
    assert (found["mask_margin_db"] >= 0) == (said.status == 0)
    assert document["best"]["binding"] == "mask"


def test_the_highest_power_behind_an_amplifier(call, recipe, tmp_path):
    rows = [f"{x},{x + 30 - 5 * math.log10(1 + 10 ** (x / 5)):.4f},0" for x in range(-30, 13, 3)]
    (tmp_path / "amp.csv").write_text(
        "\n".join(["input_dbm,output_dbm,phase_deg", *rows]) + "\n", encoding="utf-8"
    )
    said = call(
        "tune", recipe(CELL, "pier.yaml"), "--evm-limit", "8%", "--aclr-limit", "33dB", *ONE,
        "--device", "amp.csv", "--json", "--seconds", "12",
    )  # fmt: skip
    document = said.json()
    best = document["best"]
    assert best["output_dbm"] > document["before"]["output_dbm"]
    assert best["gained_db"] == pytest.approx(
        best["output_dbm"] - document["before"]["output_dbm"], abs=1e-3
    )
    assert best["evm_percent"] <= 8
    assert best["aclr_db"] >= 33
    assert document["confirmation"]["output_dbm"] == pytest.approx(best["output_dbm"], abs=0.1)


def test_an_interruption_says_what_is_kept(call, recipe, monkeypatch):
    def interrupt(*_, **__):
        raise KeyboardInterrupt

    monkeypatch.setattr("wavegen.tuning.tune.set_up", interrupt)
    said = call("tune", recipe(CELL, "pier.yaml"), *LIMITS)
    assert said.status == 130
    assert "goes on with it" in said.err


@pytest.mark.parametrize(
    ("arguments", "status"),
    [
        ((), 2),
        (("--evm-limit", "8"), 2),
        (("--evm-limit", "-8%"), 2),
        (("--evm-limit", "NR BS FR9"), 2),
        (("--evm-limit", "8%", "--evm-reserve", "9%"), 2),
        (("--evm-limit", "8%", "--at", "2"), 2),
        (("--evm-limit", "8%", "--method", "clipp"), 2),
        (("--evm-limit", "8%", "--seconds", "0"), 2),
        (("--evm-limit", "8%", "--device", "nowhere.csv"), 4),
        (("--evm-limit", "8%", "--mask", "nowhere.yaml"), 4),
        (("--evm-limit", "8%", "--set", "seed=x"), 3),
        (("--aclr-limit", "45dB", "--set", "sample_rate=1.92 MHz"), 4),
    ],
)
def test_what_is_refused(call, recipe, arguments, status):
    assert call("tune", recipe(CELL, "pier.yaml"), *arguments).status == status


def test_a_recipe_that_is_missing(call):
    assert call("tune", "nowhere.yaml", *LIMITS).status == 3


def test_shares_and_probabilities():
    assert share("8 %") == 8.0
    assert probability("0.01%") == pytest.approx(1e-4)
    assert probability("1e-3") == 1e-3
    for text in ("100%", "0%", "x"):
        with pytest.raises(argparse.ArgumentTypeError):
            probability(text)
