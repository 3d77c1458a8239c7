"""Baseband on an intermediate frequency, and its envelope read back."""

from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
from numpy.typing import NDArray

from wavegen.core.errors import SignalError
from wavegen.core.evaluate import evaluate
from wavegen.core.signal import Signal
from wavegen.files.analytic import analytic_loop
from wavegen.files.datatypes import RI16_LE, encode
from wavegen.files.real_if import real_if, real_part, turned

N = 10_000
RATE = Fraction(1_000_000)


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples at hand."""

    held: NDArray[np.complex64]

    def compute(self, start, stop, *arrays):
        return self.held[start:stop].copy()


def held(samples):
    samples = samples.astype(np.complex64)
    return Held(sample_rate_hz=RATE, n_samples=samples.size, mean_power=None, held=samples)


def all_of(signal):
    return evaluate({signal: (0, signal.n_samples)})[signal]


def band_limited(n=N, occupied=0.2):
    """Cyclic noise within a tenth of the rate on either side."""
    rng = np.random.default_rng(8)
    lines = np.zeros(n, complex)
    half = int(n * occupied / 2)
    for part in (slice(0, half), slice(-half, None)):
        lines[part] = rng.standard_normal(half) + 1j * rng.standard_normal(half)
    samples = np.fft.ifft(lines)
    return 0.3 * samples / np.abs(samples).max()


def test_definition_and_mean_power():
    baseband = band_limited()
    signal = real_if(held(baseband), Fraction(250_000), "output")
    samples = all_of(signal)
    turns = np.exp(2j * np.pi * 0.25 * np.arange(N))
    np.testing.assert_allclose(samples, (baseband * turns).real, atol=3e-7)
    assert not samples.imag.any()
    # nothing folds, so the squared carrier averages to half the squared envelope
    halved = np.mean(np.abs(baseband) ** 2) / 2
    assert np.mean(samples.real.astype(float) ** 2) == pytest.approx(halved, rel=1e-6)


def test_a_full_scale_carrier_peaks_at_full_scale():
    samples = all_of(real_if(held(np.ones(1000)), Fraction(100_000), "output"))
    assert samples.real.max() == 1
    codes, n_saturated = encode(samples, RI16_LE)
    assert codes.shape == (1000, 1)
    assert (codes.max(), codes.min(), n_saturated) == (32767, -32768, 100)


def test_the_envelope_comes_back():
    baseband = band_limited()
    back = all_of(analytic_loop(real_if(held(baseband), Fraction(250_000), "output")))
    turns = np.exp(2j * np.pi * 0.25 * np.arange(N))
    # images 100 dB down (twice, for 1 + g and 1 - g), and rounding
    np.testing.assert_allclose(back, baseband * turns, atol=0.3 * 3e-5)


@pytest.mark.parametrize("n_cycles", [1, 4095, 123_457, 499_999])
def test_any_cut_gives_the_same_bits_and_phases_stay_exact(n_cycles):
    n = 1_000_000
    frequency = Fraction(n_cycles, n) * RATE
    signal = real_if(held(np.ones(n)), frequency, "output")
    ones = np.ones(5000, np.complex64)
    far = signal.compute(n - 5000, n, ones)
    parts = [signal.compute(n - 5000 + a, n - 5000 + b, ones[a:b]) for a, b in ((0, 7), (7, 4100))]
    np.testing.assert_array_equal(np.concatenate(parts), far[:4100])
    exact = [n_cycles * place % n for place in range(n - 5000, n)]
    np.testing.assert_allclose(far.real, np.cos(2 * np.pi * np.array(exact) / n), atol=1e-7)


@pytest.mark.parametrize(
    ("frequency", "word"),
    [
        (Fraction(0), "half the sample rate"),
        (Fraction(-1000), "half the sample rate"),
        (RATE / 2, "half the sample rate"),
        (Fraction(250_010), "100 Hz"),
    ],
)
def test_frequencies_that_do_not_fit(frequency, word):
    with pytest.raises(SignalError) as caught:
        real_if(held(np.ones(N)), frequency, "output.iq[0].intermediate_frequency")
    assert caught.value.where == "output.iq[0].intermediate_frequency"
    assert word in caught.value.allowed
    if frequency == 250_010:
        assert "250000 Hz" in caught.value.remedy


@pytest.mark.parametrize("frequency", [Fraction(250_000), Fraction(-123_456), Fraction(1_000, 7)])
def test_turned_up_and_down_again(frequency):
    """Any frequency, also one that is no whole number of cycles: a recording has no seam."""
    baseband = band_limited()
    signal = held(baseband)
    up = all_of(turned(signal, frequency))
    phases = 2j * np.pi * np.arange(N) * float(frequency / RATE)
    # float64 phases of 2500 turns are good to 2500 * 2^-52 turns; float32 samples to 6e-8
    np.testing.assert_allclose(up, baseband * np.exp(phases), atol=1e-7)
    back = all_of(turned(turned(signal, frequency), -frequency))
    np.testing.assert_allclose(back, baseband, atol=2e-7)
    assert turned(signal, Fraction(0)) is signal


def test_the_real_part_around_nothing_is_the_real_part_exactly():
    baseband = held(band_limited())
    np.testing.assert_array_equal(
        all_of(real_part(baseband, Fraction(0))), all_of(baseband).real.astype(np.complex64)
    )


def test_a_turn_does_not_depend_on_the_cut():
    signal = turned(held(band_limited()), Fraction(1_000, 7))
    whole = all_of(signal)
    for start, stop in ((0, 1), (4095, 4097), (3, 9_999)):
        part = evaluate({signal: (start, stop)})[signal]
        assert part.tobytes() == whole[start:stop].tobytes()
