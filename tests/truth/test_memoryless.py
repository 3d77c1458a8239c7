"""Memoryless steps on Gaussian signals: published closed forms, a table, and simulation.

Clipping: Bussgang 1952; Rowe 1982; Ochiai and Imai 2002; the table with its source is
``data/clipped_gaussian.json``. The cubic curve is a closed form of our own derivation.
"""

import json
from pathlib import Path

import numpy as np
import pytest
from scipy.special import erfc

from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.mapped import MappedLaw, clip_law
from wavegen.laws.memoryless import MemorylessStep, polar_clip

TABLE = json.loads(
    (Path(__file__).parent / "data" / "clipped_gaussian.json").read_text(encoding="utf-8")
)["rows"]
RATIOS = [row["clip_ratio_db"] for row in TABLE]


def clipped(ratio_db):
    curve, kinks = polar_clip(ratio_db)
    return MemorylessStep.of(curve, kinks=kinks)


@pytest.mark.parametrize("ratio_db", [-3.0, *RATIOS, 13.0])
def test_gain_and_power_of_a_clip_in_closed_form(ratio_db):
    g = 10 ** (ratio_db / 10)
    step = clipped(ratio_db)
    gain = -np.expm1(-g) + np.sqrt(np.pi * g) / 2 * erfc(np.sqrt(g))
    assert step.gain == pytest.approx(gain, rel=1e-12)
    assert step.output_power == pytest.approx(-np.expm1(-g), rel=1e-12)
    assert step.error_power == pytest.approx(1 + step.output_power - 2 * gain, abs=1e-12)


@pytest.mark.parametrize("row", TABLE, ids=[f"{ratio} dB" for ratio in RATIOS])
def test_the_table_of_clipping(row):
    """Tolerance: its seven digits; spectra to what 30 terms leave out (0.01 dB, second 0.04)."""
    step = clipped(row["clip_ratio_db"])
    assert step.gain.real == pytest.approx(row["gain"], abs=1e-7)
    assert step.terms[:6].real == pytest.approx(row["terms"], abs=2e-7)
    assert step.output_power == pytest.approx(row["output_power"], abs=1e-7)
    assert step.evm_percent == pytest.approx(row["evm_percent"], rel=1e-6)
    assert step.evm_unfitted_percent == pytest.approx(row["evm_unfitted_percent"], rel=1e-6)
    assert step.distortion_share(-0.5, 0.5) == pytest.approx(row["in_band_share"], abs=1e-3)
    assert step.evm_in_band_percent == pytest.approx(row["evm_in_band_percent"], rel=1e-3)
    assert step.aclr_db() == pytest.approx(row["aclr_db"], abs=0.01)
    assert step.aclr_db(offset=2.0) == pytest.approx(row["aclr_second_db"], abs=0.04)


@pytest.mark.parametrize("row", TABLE, ids=[f"{ratio} dB" for ratio in RATIOS])
def test_levels_of_a_clipped_signal(row):
    # Seven digits of the table.
    law = clip_law(GaussianLaw(), row["papr_db"])
    for probability, level_db in row["levels_db"].items():
        assert float(law.level_db(float(probability))) == pytest.approx(level_db, abs=2e-6)
    assert law.share_clipped == pytest.approx(row["share_clipped"], rel=1e-5)


@pytest.mark.parametrize("row", [row for row in TABLE if "simulated" in row])
def test_the_series_agrees_with_the_simulation_of_the_table(row):
    # 0.1 dB: one record's spread, and at 8 dB the few peaks that were clipped (1 in 550).
    step, seen = clipped(row["clip_ratio_db"]), row["simulated"]
    ratio_db = 20 * np.log10(100 / step.evm_in_band_percent)
    assert ratio_db == pytest.approx(seen["in_band_ratio_db"], abs=0.11)
    assert step.aclr_db() == pytest.approx(seen["aclr_db"], abs=0.11)
    assert step.aclr_db(offset=2.0) == pytest.approx(seen["aclr_second_db"], abs=0.11)


def test_a_cubic_curve_in_closed_form():
    """``y = x + c x |x|^2``: gain ``1 + 2 c``, distortion ``2 |c|^2``, a third-order spectrum.

    Derivation: ``E|x|^4 = 2``, ``E|x|^6 = 6``; the distortion is the term ``c_1`` alone, whose
    spectrum is three rectangles convolved: 2/3 in the band, 1/6 in each channel beside it.
    """
    c = -0.05 + 0.02j
    step = MemorylessStep.of(lambda r: r + c * r**3)
    assert step.gain == pytest.approx(1 + 2 * c, abs=1e-12)
    assert step.distortion_power == pytest.approx(2 * abs(c) ** 2, rel=1e-10)
    assert abs(step.terms[1]) ** 2 == pytest.approx(2 * abs(c) ** 2, rel=1e-10)
    assert step.distortion_share(-0.5, 0.5) == pytest.approx(2 / 3, abs=1e-9)
    inside = abs(1 + 2 * c) ** 2 + 4 / 3 * abs(c) ** 2
    assert step.aclr_db() == pytest.approx(10 * np.log10(inside / (abs(c) ** 2 / 3)), abs=1e-6)


def curved(r):
    """An amplifier with AM/AM and AM/PM that saturates and then folds back."""
    return 2 * r / (1 + r**2) * np.exp(0.5j * r**2 / (1 + r**2))


@pytest.fixture(scope="module")
def record():
    """A flat band of 1/16 of the rate, 2^20 samples, unit mean."""
    rng = np.random.default_rng(11)
    n, half = 1 << 20, 1 << 15
    spectrum = np.zeros(n, complex)
    spectrum[np.arange(-half, half)] = rng.normal(size=(2 * half, 2)) @ (1, 1j)
    x = np.fft.ifft(spectrum)
    return x / np.sqrt(np.mean(np.abs(x) ** 2))


def test_a_curve_with_phase_against_simulation(record):
    # 0.1 dB and 1 %: 65536 independent samples.
    amplitude = np.abs(record)
    y = curved(amplitude) * record / amplitude
    step = MemorylessStep.of(curved)
    gain = np.vdot(record, y) / np.vdot(record, record)
    assert step.gain == pytest.approx(gain, abs=0.005)
    assert step.mean_shift_db == pytest.approx(10 * np.log10(np.mean(np.abs(y) ** 2)), abs=0.02)
    power = np.abs(np.fft.fft(y)) ** 2
    place = np.fft.fftfreq(record.size) * 16
    channel = [power[np.abs(place - k) < 0.5].sum() for k in (0, 1, 2, -1)]
    ratio_db = 10 * np.log10(channel[0] / np.array(channel[1:]))
    assert step.aclr_db() == pytest.approx(ratio_db[0], abs=0.1)
    assert step.aclr_db() == pytest.approx(ratio_db[2], abs=0.1)
    assert step.aclr_db(offset=2.0) == pytest.approx(ratio_db[1], abs=0.1)
    error = np.fft.fft(y / gain - record)
    inside = np.abs(place) < 0.5
    share = np.sum(np.abs(error[inside]) ** 2) / np.sum(np.abs(np.fft.fft(record)) ** 2)
    assert step.evm_in_band_percent == pytest.approx(100 * np.sqrt(share), rel=0.01)


def test_the_distribution_behind_a_curve_that_folds_back(record):
    # 4 sigma of a share of 65536 independent samples.
    law = MappedLaw(source=GaussianLaw(), curve=curved)
    power = np.abs(curved(np.abs(record))) ** 2
    power /= power.mean()
    for level_db in (-15, -8, -3, 0, 0.5, 1.0):
        want = float(law.ccdf(level_db))
        sigma = np.sqrt(want * (1 - want) / 65536)
        assert np.mean(power > 10 ** (level_db / 10)) == pytest.approx(want, abs=4 * sigma)
    assert law.peak_db == pytest.approx(10 * np.log10(power.max()), abs=1e-3)
