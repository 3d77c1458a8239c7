import numpy as np
import pytest

from wavegen.dsp.envelope_excess import (
    dilate,
    excess_over,
    local_peaks,
    power_of,
    row_peaks,
    row_peaks_by_numpy,
    shortfall_of,
)


@pytest.fixture(scope="module")
def samples():
    rng = np.random.default_rng(6)
    return rng.normal(size=2 * 70_001).astype(np.float32).view(np.complex64)


def test_excess_is_what_a_clip_takes(samples):
    size = np.abs(samples.astype(np.complex128))
    clipped = samples * np.minimum(1, 1.5 / size)
    assert np.max(np.abs(samples - excess_over(samples, 1.5) - clipped)) < 1e-6


def test_read_only_and_empty_arrays_are_taken(samples):
    held = samples[:10].copy()
    held.flags.writeable = False
    assert excess_over(held, 0.5).size == 10
    assert excess_over(held[:0], 0.5).size == 0


def test_power_and_shortfall(samples):
    power = np.abs(samples.astype(np.complex128)) ** 2
    assert np.allclose(power_of(samples), power, rtol=1e-6)
    want = np.maximum(1 - 1.2 / np.sqrt(power), 0)
    assert np.max(np.abs(shortfall_of(samples, 1.2) - want)) < 1e-6


def test_local_peaks_are_the_highest_of_their_neighbours(samples):
    power = power_of(samples[:5_000])
    for reach in (1, 5):
        got = local_peaks(power, over=3.0, reach=reach)
        want = [
            k
            for k in range(reach, power.size - reach)
            if power[k] > 3.0 and power[k] == power[k - reach : k + reach + 1].max()
        ]
        assert got.tolist() == want


def test_of_equal_peaks_the_first_counts():
    assert local_peaks(np.array([0, 4, 4, 4, 0], np.float32), over=1, reach=1).tolist() == [1]


@pytest.mark.parametrize("reach", [0, 1, 2, 3, 7, 64])
def test_dilation_is_the_maximum_of_a_window(samples, reach):
    values = power_of(samples[:500])
    windows = np.lib.stride_tricks.sliding_window_view(values, 2 * reach + 1)
    assert np.array_equal(dilate(values, reach), windows.max(axis=1))


@pytest.mark.parametrize("n", [1, 7, 8, 1001])
def test_the_highest_power_of_each_row(samples, n):
    rows = samples[: 5 * n].reshape(5, n)
    got = row_peaks(rows)
    assert got.tobytes() == row_peaks_by_numpy(rows).tobytes()
    assert got == pytest.approx(np.max(np.abs(rows) ** 2, axis=1), rel=1e-6)
