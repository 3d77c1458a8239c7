"""Spectrum and distribution at once."""

import numpy as np
import pytest

from wavegen.dsp.shaped_envelope import _order, shape_envelope

N = 1 << 14


def flat_band(share):
    amplitudes = np.zeros(N)
    half = int(N * share / 2)
    amplitudes[:half] = amplitudes[-half:] = 1
    return amplitudes


def phases(seed=1):
    return np.random.default_rng(seed).uniform(0, 2 * np.pi, N)


def clipped_envelopes():
    """Envelope values of a signal that exists: noise in a band, clipped and filtered again."""
    rng = np.random.default_rng(2)
    band = flat_band(0.25)
    spectrum = band * (rng.standard_normal(N) + 1j * rng.standard_normal(N))
    for _ in range(6):
        x = np.fft.ifft(spectrum)
        x /= np.sqrt(np.mean(np.abs(x) ** 2))
        x /= np.maximum(np.abs(x) / 10 ** (5.5 / 20), 1)
        spectrum = np.fft.fft(x) * band
    return np.sort(np.abs(np.fft.ifft(spectrum)))


def test_an_envelope_that_exists_is_reached():
    found = shape_envelope(flat_band(0.25), clipped_envelopes(), phases=phases())
    assert found.level_error_db < 0.05
    assert np.mean(np.abs(found.samples) ** 2) == pytest.approx(1, rel=1e-5)
    spectrum = np.abs(np.fft.fft(found.samples)) ** 2
    band = flat_band(0.25) > 0
    assert spectrum[~band].sum() / spectrum.sum() < 1e-11  # float32 samples
    assert np.ptp(spectrum[band]) / spectrum[band].mean() < 1e-3


def test_levels_told_are_those_of_the_samples():
    wanted = clipped_envelopes()
    found = shape_envelope(flat_band(0.25), wanted, phases=phases())
    have = np.sort(np.abs(found.samples.astype(np.complex128)))
    have /= np.sqrt(np.mean(have**2))
    wanted = wanted / np.sqrt(np.mean(wanted**2))
    for share in (0.5, 0.1, 0.01, 0.001):
        k = int((1 - share) * N)
        assert abs(20 * np.log10(have[k] / wanted[k])) <= found.level_error_db + 0.002


def test_what_no_band_limited_signal_can_be_ends_at_the_nearest():
    found = shape_envelope(flat_band(0.25), np.ones(N), phases=phases(), most_rounds=40)
    assert found.level_error_db > 0.1
    assert np.isfinite(found.beyond_band_db)
    noise = shape_envelope(flat_band(0.25), np.ones(N), phases=phases(), most_rounds=0)
    assert found.level_error_db < noise.level_error_db


def test_other_phases_give_another_loop_of_the_same_statistics():
    one, two = (
        shape_envelope(flat_band(0.25), clipped_envelopes(), phases=phases(seed)) for seed in (1, 2)
    )
    likeness = abs(np.vdot(one.samples, two.samples)) / N
    assert likeness < 0.05


def test_only_what_a_gate_keeps_follows_the_envelope():
    within = np.arange(N) % 4096 < 1100
    wanted = np.sort(clipped_envelopes()[:: N // within.sum()][: within.sum()])
    found = shape_envelope(flat_band(0.25), wanted, phases=phases(), within=within)
    assert found.level_error_db < 0.05
    have = np.sort(np.abs(found.samples[within].astype(np.complex128)))
    have /= np.sqrt(np.mean(have**2))
    wanted = wanted / np.sqrt(np.mean(wanted**2))
    for share in (0.5, 0.1, 0.01):
        k = int((1 - share) * wanted.size)
        assert abs(20 * np.log10(have[k] / wanted[k])) < 0.06


@pytest.mark.parametrize("n", [1, 2, 3, 1000, 1 << 17])
def test_order_is_that_of_a_sort(n):
    power = np.random.default_rng(n).exponential(size=n)
    power[::7] = 0.0
    found = power[_order(power)]
    # Equal to within the bits that the index takes: 2^17 in 2^52.
    assert np.all(np.diff(found) >= -1e-9 * found[1:])
    assert np.array_equal(np.sort(_order(power)), np.arange(n))
