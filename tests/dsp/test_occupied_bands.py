from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest
from numpy.typing import NDArray

from wavegen.core.signal import Signal
from wavegen.dsp.occupied_bands import (
    N_BINS,
    WHOLE,
    Band,
    band_span,
    design_bands,
    design_pulse,
    merge_bands,
    narrowest_gap,
    occupied_bands,
    stretch_spectrum,
)


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    """Samples in memory."""

    samples: NDArray[np.complex64]

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


def filled(bands, n=1 << 17):
    rng = np.random.default_rng(4)
    place = np.fft.fftfreq(n)
    lines = np.zeros(n, np.complex128)
    for low, high, level_db in bands:
        inside = (place - low) % 1.0 < high - low
        size = int(inside.sum())
        lines[inside] = 10 ** (level_db / 20) * (rng.normal(size=size) + 1j * rng.normal(size=size))
    samples = np.fft.ifft(lines).astype(np.complex64)
    return Held(sample_rate_hz=Fraction(1_000_000), n_samples=n, samples=samples)


def response(taps, f):
    lag = np.arange(taps.size) - taps.size // 2
    return np.exp(-2j * np.pi * np.outer(f, lag)) @ taps


@pytest.mark.parametrize(
    "bands", [[(-0.125, 0.125, 0)], [(-0.3, -0.1, 0), (0.05, 0.2, -6)], [(0.4, 0.55, 0)]]
)
def test_bands_are_found_to_a_few_bins(bands):
    found = occupied_bands(stretch_spectrum(filled(bands)))
    assert len(found) == len(bands)
    for got, (low, high, _) in zip(found, bands, strict=True):
        assert got.low == pytest.approx(low, abs=5 / N_BINS)
        assert got.high == pytest.approx(high, abs=5 / N_BINS)


def test_what_lies_deeper_is_left_out():
    spectrum = stretch_spectrum(filled([(-0.3, -0.1, 0), (0.05, 0.2, -30)]))
    assert len(occupied_bands(spectrum)) == 1
    assert len(occupied_bands(spectrum, depth_db=40)) == 2
    assert occupied_bands(np.zeros(16)) == ()


def test_short_loops_are_repeated():
    held = Held(sample_rate_hz=Fraction(1), n_samples=4, samples=np.array([1, 1j, -1, -1j], "c8"))
    (band,) = occupied_bands(stretch_spectrum(held))  # one line at a quarter of the rate
    assert band.centre == pytest.approx(0.25, abs=1e-9)
    assert band.width < 12 / N_BINS


def test_merging_goes_round_the_ends():
    bands = [Band(0.4, 0.49), Band(-0.48, -0.3), Band(1.0, 1.1)]
    joined = merge_bands(bands, gap=0.05)
    assert joined[0] == pytest.approx((0.0, 0.1))
    assert joined[1] == pytest.approx((0.4, 0.7))
    assert narrowest_gap(joined) == pytest.approx(0.3)
    assert band_span(joined) == pytest.approx(0.7)
    assert merge_bands([Band(-0.5, 0.1), Band(0.1, 0.49)], gap=0.02) == WHOLE


@pytest.mark.parametrize(
    "bands", [(Band(-0.1, 0.1),), (Band(-0.3, -0.15), Band(0.0, 0.1)), (Band(0.4, 0.6),)]
)
def test_a_filter_passes_its_bands_and_nothing_else(bands):
    transition = 0.02
    taps = design_bands(bands, transition=transition)
    f = np.linspace(-0.5, 0.5, 4001)
    got = response(taps, f)
    assert np.max(np.abs(got.imag)) < 1e-10
    inside, near = np.zeros(f.size, bool), np.zeros(f.size, bool)
    for band in bands:
        inside |= (f - band.low) % 1.0 <= band.width
        near |= (f - band.low + transition) % 1.0 <= band.width + 2 * transition
    assert np.max(np.abs(got[inside] - 1)) < 1e-5
    assert np.max(np.abs(got[~near])) < 1e-5  # -100 dB
    assert np.isrealobj(taps) == (bands == (Band(-0.1, 0.1),))


def test_a_filter_of_the_whole_spectrum_is_one_tap():
    assert design_bands(WHOLE, transition=0.01).tolist() == [1]


def test_a_pulse_has_the_shape_of_the_spectrum():
    bands = (Band(-0.2, 0.0), Band(0.1, 0.3))
    spectrum = np.zeros(4096)
    f = np.fft.fftfreq(4096)
    spectrum[(f >= -0.2) & (f < 0)] = 1.0
    spectrum[(f >= 0.1) & (f < 0.3)] = 0.25
    spectrum[(f >= 0.35) & (f < 0.4)] = 1.0  # outside: left out
    taps = design_pulse(spectrum, bands, half_length=400)
    assert taps[400] == 1
    assert np.allclose(taps, taps[::-1].conj())
    low, high, out = np.abs(response(taps, np.array([-0.1, 0.2, 0.375])))
    assert high / low == pytest.approx(0.5, rel=1e-4)  # amplitude
    assert out < 1e-4 * low
