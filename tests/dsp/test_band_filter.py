import pickle

import numpy as np
import pytest

from wavegen.dsp.band_filter import BandFilter
from wavegen.dsp.occupied_bands import Band, design_bands

TAPS = design_bands((Band(-0.2, -0.1), Band(0.05, 0.3)), transition=0.02)


@pytest.fixture(scope="module")
def samples():
    rng = np.random.default_rng(2)
    return rng.normal(size=40_000).astype(np.float32).view(np.complex64)


@pytest.mark.parametrize("n_out", [1, 7, 1_000, 9_001])
def test_is_a_convolution(samples, n_out):
    band = BandFilter(TAPS)
    half = band.half_length
    stretch = samples[: n_out + 2 * half]
    got = band.apply(stretch, n_out)
    want = np.convolve(stretch.astype(np.complex128), TAPS, "valid")
    # complex64 transforms of unit-power samples: -130 dB
    assert np.max(np.abs(got - want)) < 3e-6
    base = samples[half : half + n_out]
    left = band.apply(stretch, n_out, base=base)
    assert np.array_equal(left, base - got)


def test_rows_do_not_depend_on_where_the_range_begins(samples):
    band = BandFilter(TAPS)
    hop, half = band.hop, band.half_length
    whole = band.apply(samples[: 9 * hop + 2 * half], 9 * hop)
    for first in (1, 4, 8):
        stretch = samples[first * hop : 9 * hop + 2 * half]
        assert np.array_equal(band.apply(stretch, (9 - first) * hop), whole[first * hop :])


def test_one_tap_is_a_factor(samples):
    got = BandFilter(np.ones(1)).apply(samples[:5_000], 5_000)
    assert np.max(np.abs(got - samples[:5_000])) < 2e-6


def test_the_pickle_holds_the_taps_only(samples):
    band = BandFilter(TAPS)
    size = len(pickle.dumps(band))
    band.apply(samples[: 10 + 2 * band.half_length], 10)
    assert len(pickle.dumps(band)) == size
    again = pickle.loads(pickle.dumps(band))  # noqa: S301 - our own bytes
    assert np.array_equal(again.taps, band.taps)
