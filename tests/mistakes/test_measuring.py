"""Remedies of mistakes in measuring, as they are reached from the command line.

The sizes of the mistakes are those of the tests of each remedy beside this file.
"""

import json
import math

import numpy as np
import pytest
import scipy.fft

from wavegen.cli.main import run

RATE_HZ = 1_000_000
OFDM = """wavegen: 1
sample_rate: 15.36 MHz
duration: 400 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups: [{subcarriers: "-512..-1, 0..511", constellation: 16qam}]
  cyclic_prefix: [72/1024]
"""


@pytest.fixture
def measure(capsys):
    def measure(*words):
        capsys.readouterr()
        assert run(["measure", *map(str, words)]) == 0
        shown = capsys.readouterr().out
        assert run(["measure", *map(str, words), "--json"]) == 0
        return json.loads(capsys.readouterr().out), " ".join(shown.split())

    return measure


@pytest.fixture
def noise(tmp_path):
    """Complex Gaussian noise that fills a quarter of the rate."""

    def noise(n, seed=1):
        rng = np.random.default_rng(seed)
        spectrum = np.zeros(n, np.complex128)
        lines = np.arange(-n // 8, n // 8)
        spectrum[lines] = rng.standard_normal(lines.size) + 1j * rng.standard_normal(lines.size)
        samples = scipy.fft.ifft(spectrum)
        path = tmp_path / f"noise{n}_{seed}.cf32_le"
        (samples / np.sqrt(np.mean(np.abs(samples) ** 2)) / 4).astype("<c8").tofile(path)
        return path

    return noise


def rate(*words):
    return (*words, "--sample-rate", f"{RATE_HZ}Hz")


def test_mistake_6_the_peak_of_a_record_stands_beside_what_its_length_makes_likely(measure, noise):
    spans = {}
    for n in (1 << 14, 1 << 20):
        document, shown = measure(*rate(noise(n)))
        expected = document["record_peak"]
        # A quarter of the rate, within what spectra of stretches can tell.
        assert expected["time_bandwidth"] == pytest.approx(n / 4, rel=0.03)
        assert expected["low_db"] < document["papr_between_samples_db"] < expected["high_db"]
        assert f"{expected['low_db']:.2f} to {expected['high_db']:.2f} dB" in shown
        spans[n] = expected["median_db"], document["levels"][1]["level_db"]
    (short, level), (long, same) = spans.values()
    assert long - short > 1.2
    assert same == pytest.approx(level, abs=0.3)


def test_mistake_7_symbols_and_instantaneous_power_are_two_statistics(measure, tmp_path):
    recipe = tmp_path / "two-statistics.yaml"
    recipe.write_text(OFDM)
    document, shown = measure(recipe)
    per_symbol = document["per_symbol"]["over"][0]["levels"][0]["papr_db"]
    assert per_symbol - document["levels"][0]["level_db"] > 5
    assert "CCDF of instantaneous envelope power" in shown
    assert "CCDF of the PAPR of each symbol" in shown
    assert "not that of the power above" in shown
    law = document["per_symbol"]["law"]["levels"][0]["papr_db"]
    assert per_symbol == pytest.approx(law, abs=0.3)  # 3 sigma of 40 symbols beyond: 0.24 dB


def test_mistake_9_each_mean_is_named(measure, tmp_path):
    recipe = tmp_path / "two-means.yaml"
    recipe.write_text(OFDM.replace("-512..-1, 0..511", "-8..-1, 1..8"))
    document, shown = measure(recipe)
    ensemble, symbol = document["per_symbol"]["over"]
    assert "mean power of all symbols" in ensemble["is"]
    assert "symbol's own mean" in symbol["is"]
    # Of 16 subcarriers of 16QAM the symbol's own mean scatters by 0.5 dB.
    assert ensemble["highest_db"] != symbol["highest_db"]
    assert "over the mean of all" in shown
    assert "over each one's own" in shown


def test_mistake_10_what_a_slow_sensor_would_read(measure, noise):
    path, shortfall = noise(1 << 18), []
    for width in ("250kHz", "125kHz", "25kHz"):
        document, shown = measure(*rate(path, "--video-bandwidth", width))
        rows = {row["probability"]: row for row in document["sensor"]["levels"]}
        shortfall.append(rows[1e-3]["shortfall_db"])
        assert f"video bandwidth {width[:-3]} kHz" in shown
    assert 0.1 < shortfall[0] < shortfall[1] < shortfall[2]
    assert shortfall[2] > 2.5  # a pole at a tenth of the bandwidth


def test_mistake_12_power_alone_is_averaged_and_the_others_are_told(measure, noise):
    path = noise(1 << 18)
    document, shown = measure(*rate(path))
    samples = np.fromfile(path, "<c8").astype(np.complex128)
    power = np.abs(samples) ** 2
    assert document["mean_dbfs"] == pytest.approx(10 * math.log10(power.mean()), abs=1e-4)
    of_db = np.mean(10 * np.log10(power)) - document["mean_dbfs"]
    of_volts = 20 * math.log10(np.mean(np.abs(samples))) - document["mean_dbfs"]
    found = document["averages"]
    # Bins of 0.0085 dB.
    assert found["of_decibels_db"] == pytest.approx(of_db, abs=0.01)
    assert found["of_volts_db"] == pytest.approx(of_volts, abs=0.01)
    assert found["of_decibels_db"] == pytest.approx(-2.507, abs=0.05)
    assert "average of dB, of volts" in shown
