import numpy as np
import pytest

RATE = ("--sample-rate", "1MHz")


@pytest.fixture
def device(noise, tmp_path):
    """Noise and what a Rapp amplifier makes of it."""
    path = noise(scale=0.5, name="in.cf32_le", n=40_000)
    samples = np.fromfile(path, "<c8")
    output = tmp_path / "out.cf32_le"
    (samples / (1 + np.abs(samples) ** 4) ** 0.25).astype("<c8").tofile(output)
    return path, output


def test_tables_and_statuses(call, device):
    said = call("gain-curve", *device, *RATE, "--loop")
    assert said.status == 5
    assert max(map(len, said.out.splitlines())) <= 80
    for word in ("Gain down by 1 dB", "Nearest Rapp curve: p = 2.0", "One signal: holds"):
        assert word in said.out
    # White noise fills the whole rate: once the occupied bandwidth, and it is said so.
    assert "mimics compression" in said.err
    assert call("gain-curve", device[0], device[0], *RATE, "--loop").status == 0
    assert call("gain-curve", device[0], device[0], *RATE).status == 6


def test_levels_are_absolute_where_both_sides_say_so(call, device):
    references = ("--input-reference-level", "-20dBm", "--output-reference-level", "20dBm")
    said = call("gain-curve", *device, *RATE, "--loop", *references)
    assert "dBm" in said.out
    assert "licence" in said.out  # levels in dBm come with the warning
    document = call("gain-curve", *device, *RATE, "--loop", *references, "--json").json()
    assert document["small_signal_gain_db"] == pytest.approx(40, abs=0.02)
    assert document["input_p1db_dbm"] == pytest.approx(-21.17, abs=0.05)
    assert 20 < document["output"]["peak_dbm"] < 24  # between samples
    assert {"input_db", "gain_db", "low_db", "high_db"} <= set(document["gain"][0])


def test_a_model_that_a_recipe_can_use(call, device, recipe, tmp_path):
    path = tmp_path / "device.csv"
    said = call("gain-curve", *device, *RATE, "--loop", "--model", path)
    assert said.status == 5
    assert "Written:" in said.out
    assert call("gain-curve", *device, *RATE, "--loop", "--model", path).status == 4
    again = ("--model", path, "--overwrite", "--model-from", "rapp")
    assert call("gain-curve", *device, *RATE, "--loop", *again).status == 5
    assert "fitted Rapp curve" in path.read_text()
    text = recipe().read_text()
    stage = "stages: [{kind: measured_amplifier, path: device.csv, input_power: -8 dBm}]\n"
    assert call("make", recipe(text + stage)).status == 0


CELL = """wavegen: 1
title: Pier cell, for a device as measured
sample_rate: 7.68 MHz
duration: 28 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {subcarriers: "-36..-1, 1..36", constellation: 64qam}
  cyclic_prefix: 36/512
  edge_window: 32/512
"""


def test_tune_drives_the_device_as_measured(call, device, recipe, tmp_path):
    """From other captures than loops, with the levels of the bench: 30 dB gain, 30 dBm at most.

    The device saturates at 30 dBm, so that a signal with levels of 9 dB and an EVM of some percent
    comes out of it between 20 and 30 dBm.
    """
    path = tmp_path / "device.csv"
    references = ("--input-reference-level", "0dBm", "--output-reference-level", "30dBm")
    assert call("gain-curve", *device, *RATE, *references, "--model", path).status == 5
    said = call(
        "tune", recipe(CELL, "pier.yaml"), "--device", path, "--evm-limit", "8%",
        "--aclr-limit", "33dB", "--method", "clip_filter", "--seconds", "4", "--json",
    )  # fmt: skip
    document = said.json()
    found = document["best"] or document["nearest"]
    assert document["device"] == "device.csv"
    assert 20 < found["output_dbm"] < 30
    assert found["evm_percent"] <= 8


@pytest.mark.parametrize(
    "options",
    [("--overwrite",), ("--model-from", "rapp"), ("--tolerance", "0dB"), ("--down-to", "2")],
)
def test_arguments_that_are_none(call, device, options):
    assert call("gain-curve", *device, *RATE, *options).status == 2


def test_files_that_are_none(call, device, noise, tmp_path):
    assert call("gain-curve", tmp_path / "none.wav", device[1]).status == 4
    short = noise(name="short.cf32_le", n=20)
    assert call("gain-curve", short, short, *RATE).status == 4
