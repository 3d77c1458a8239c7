import numpy as np
import pytest

from wavegen.meters.stretches import look_at_stretches

N = 200_000


def unbalanced(samples, gain_db, phase_deg):
    """I and Q of unequal gain, axes not square; the ratio E y^2 / E |y|^2 beside it."""
    gain, phase = 10 ** (gain_db / 20), np.deg2rad(phase_deg)
    real = samples.real * gain
    imag = samples.imag * np.cos(phase) + samples.real * np.sin(phase)
    return (real + 1j * imag).astype(np.complex64)


@pytest.mark.parametrize(("gain_db", "phase_deg"), [(0.5, 0.0), (0.0, 3.0), (-0.3, -2.0)])
def test_imbalance_adds_the_same_ratio_at_every_frequency(held, band_noise, gain_db, phase_deg):
    signal = unbalanced(band_noise(3, N, 0.4), gain_db, phase_deg)
    seen = look_at_stretches(held(signal))
    x = signal.astype(np.complex128)
    # Stretches and the whole see the same samples; shapes weigh differently: 2 sigma.
    want = np.mean(x**2) / np.mean(np.abs(x) ** 2)
    assert abs(seen.pseudo_ratio - want) < 2 * seen.pseudo_sigma
    assert abs(seen.pseudo_ratio) > 6 * seen.pseudo_sigma


def test_balanced_noise_has_none(held, band_noise):
    for seed in range(8):
        seen = look_at_stretches(held(band_noise(seed, N, 0.4)))
        assert abs(seen.pseudo_ratio) < 4 * seen.pseudo_sigma
        assert seen.pseudo_sigma < 0.01


def test_symmetric_tones_of_any_phase_are_no_imbalance(held):
    # Products X(f) X(-f) of 100 pairs point anywhere: their mean is no systematic ratio.
    rng = np.random.default_rng(5)
    lines = np.concatenate([np.arange(-100, 0), np.arange(1, 101)])
    spectrum = np.zeros(20_480, np.complex128)
    spectrum[lines * 40] = np.exp(2j * np.pi * rng.random(lines.size))
    samples = np.fft.ifft(spectrum)
    ratio = abs(np.mean(samples**2)) / np.mean(np.abs(samples) ** 2)
    seen = look_at_stretches(held(samples))
    assert ratio > 0.01  # it would pass for 0.2 dB
    assert abs(seen.pseudo_ratio) < 4 * seen.pseudo_sigma


def test_a_signal_that_is_one_sided_by_nature_is_not_judged(held, band_noise):
    real = band_noise(3, N, 0.4).real
    assert look_at_stretches(held(real)).pseudo_sigma == np.inf
    two = np.exp(0.3j * np.arange(N)) + np.exp(-0.3j * np.arange(N))
    assert look_at_stretches(held(two)).pseudo_sigma == np.inf


def test_the_offset_is_not_moved_by_a_stray_sample(held, band_noise):
    samples = band_noise(1, 10_000, 0.9) + np.complex64(3 - 2j)
    samples[0] = 1e6
    # A stretch of 128 or 512 samples has a mean of 0.09 RMS at most; the median of 19, less.
    assert look_at_stretches(held(samples)).offset == pytest.approx(3 - 2j, abs=0.1)


def test_lines_are_seen_and_noise_has_none(held, band_noise):
    noise = band_noise(7, N, 0.9)
    assert look_at_stretches(held(noise)).strongest_line == 0
    index = np.arange(N)
    tone = 2 * np.exp(2j * np.pi * 0.125 * index)  # on a bin of the transform
    assert look_at_stretches(held(0.01 * noise + tone)).strongest_line == pytest.approx(4, rel=0.01)


def test_short_records_and_what_is_not_finite(held, band_noise):
    short = band_noise(1, 100, 0.9) + np.complex64(1)
    short[3] = np.nan
    seen = look_at_stretches(held(short))
    assert (seen.n_stretches, seen.pseudo_sigma) == (0, np.inf)
    assert seen.offset == pytest.approx(1, abs=0.4)
    samples = band_noise(2, N, 0.9)
    samples[100] = np.inf
    assert look_at_stretches(held(samples)).n_stretches == N // 512 - 1
