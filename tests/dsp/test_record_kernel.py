"""The compiled loops against their twins in NumPy, and these against plain definitions."""

import builtins

import numpy as np
import pytest

from wavegen.dsp import record_kernel as kernel
from wavegen.dsp.cell_sums import CELL

SIZES = (64, 100, 1000, CELL, CELL + 1, 3 * CELL, 5 * CELL + 77)


@pytest.fixture
def rng():
    return np.random.default_rng(11)


def noise(rng, n, scale=0.1):
    codes = np.round(rng.standard_normal(2 * n) * scale * 32768) / 32768
    return codes.astype(np.float32).view(np.complex64)


@pytest.fixture
def without_numba(monkeypatch):
    """The package as it is where numba is not installed."""
    real = builtins.__import__

    def absent(name, *args, **kwargs):
        if name == "numba":
            raise ImportError(name)
        return real(name, *args, **kwargs)

    monkeypatch.setattr(builtins, "__import__", absent)
    kernel._compile.cache_clear()
    yield
    kernel._compile.cache_clear()


def test_numba_is_there_when_twins_are_compared():
    pytest.importorskip("numba")
    assert kernel.compiled_loops() is not None


@pytest.mark.usefixtures("without_numba")
def test_without_numba_the_twins_answer(rng):
    assert kernel.compiled_loops() is None
    samples = noise(rng, 2 * CELL)
    assert kernel.glance(samples) == kernel.glance_by_numpy(samples)
    assert kernel.sum_rails(samples, 0j).sums.shape == (2, 3)


@pytest.mark.parametrize("n", SIZES)
@pytest.mark.parametrize(
    ("value", "has_bad", "has_lowest"),
    [
        (0j, False, False),
        (-1 + 0j, False, True),
        (-1j, False, True),
        (1 + 1j, False, False),
        (np.nan, True, None),
        (complex(0, np.inf), True, False),
        (complex(-np.inf, 0), True, True),
    ],
)
def test_glance(rng, n, value, has_bad, has_lowest):
    samples = noise(rng, n)
    samples[n // 3] = value
    found = kernel.glance(samples)
    assert found == kernel.glance_by_numpy(samples)
    assert found.has_bad == has_bad
    assert has_lowest is None or found.has_lowest == has_lowest


@pytest.mark.parametrize("n", SIZES)
@pytest.mark.parametrize("where", [(0, 20), (-30, None), (25, 60), (0, None), (3, 5), (0, 0)])
def test_repeats(rng, n, where):
    samples = noise(rng, n)
    samples[slice(*where)] = 0.25j
    samples[n // 2] *= np.float32(-0.0) if n > 200 else 1  # -0 is 0
    found = kernel.longest_repeat(samples)
    assert found == kernel.longest_repeat_by_numpy(samples)


def test_repeats_by_hand():
    samples = np.repeat(np.arange(5) + 1j, [3, 1, 7, 2, 60]).astype(np.complex64)
    assert kernel.longest_repeat(samples) == (3, 60, 7)
    assert kernel.longest_repeat(samples[:3]) == (3, 3, 0)
    assert kernel.longest_repeat(np.arange(70).astype(np.complex64)) == (1, 1, 1)


@pytest.mark.parametrize("n", SIZES)
@pytest.mark.parametrize("n_rails", [1, 2])
def test_codes(rng, n, n_rails):
    samples = noise(rng, n)
    samples[5] = 2 - 2j  # beyond the ends
    counts = np.zeros((n_rails, 65537), np.uint32)
    twin = counts.copy()
    kernel.count_codes(samples, counts, 32768.0)
    kernel.count_codes_by_numpy(samples, twin, 32768.0)
    np.testing.assert_array_equal(counts, twin)
    assert counts.sum() == n_rails * n
    assert counts[0, 65536] == 1
    code = round(float(samples[7].real) * 32768)
    assert counts[0, code + 32768] >= 1


@pytest.mark.parametrize("n_rails", [1, 2])
def test_floats_of_any_scale(rng, n_rails):
    samples = (noise(rng, 3000) * 10.0 ** rng.uniform(-30, 30, 3000)).astype(np.complex64)
    counts = np.zeros((n_rails, kernel.N_FLOAT_CODES), np.uint32)
    twin = counts.copy()
    kernel.count_codes(samples, counts, None)
    kernel.count_codes_by_numpy(samples, twin, None)
    np.testing.assert_array_equal(counts, twin)
    assert counts.sum() == n_rails * 3000


@pytest.mark.parametrize("n_cells", [1, 2, 7])
def test_sums(rng, n_cells):
    samples, offset = noise(rng, n_cells * CELL), 0.01 - 0.02j
    found, twin = kernel.sum_rails(samples, offset), kernel.sum_rails_by_numpy(samples, offset)
    np.testing.assert_array_equal(found.sums, twin.sums)
    assert (found.nearest, found.furthest, found.peak) == (twin.nearest, twin.furthest, twin.peak)
    wide = samples.astype(np.complex128).reshape(n_cells, CELL)
    far = np.abs(wide - offset) ** 2
    want = np.stack([wide.real.sum(1), wide.imag.sum(1), far.sum(1)], axis=1)
    np.testing.assert_allclose(found.sums, want, rtol=1e-6, atol=1e-9)
    assert found.peak == pytest.approx((np.abs(wide) ** 2).max(), rel=3e-7)
    assert found.furthest == pytest.approx(far.max(), rel=1e-6)


@pytest.mark.parametrize("scale", [1e-25, 1e25])
def test_sums_on_any_scale(rng, scale):
    samples = (noise(rng, 2 * CELL) * np.float32(scale)).astype(np.complex64)
    found, twin = kernel.sum_rails(samples, 0j), kernel.sum_rails_by_numpy(samples, 0j)
    np.testing.assert_array_equal(found.sums, twin.sums)
    power = np.abs(samples.astype(np.complex128)) ** 2
    np.testing.assert_allclose(found.sums[:, 2], power.reshape(2, -1).sum(axis=1), rtol=1e-9)
    assert found.peak == pytest.approx(power.max(), rel=1e-9)


@pytest.mark.parametrize("n", SIZES)
def test_how_high_the_fourth_difference_stands(rng, n):
    samples = noise(rng, n + 4)
    found = kernel.difference_maxima(samples)
    np.testing.assert_array_equal(found, kernel.difference_maxima_by_numpy(samples))
    want = np.abs(np.convolve(samples.astype(complex), [1, -4, 6, -4, 1], "valid")) ** 2
    padded = np.concatenate([want, np.zeros(-n % CELL)]).reshape(-1, CELL)
    np.testing.assert_allclose(found, padded.max(axis=1), rtol=1e-5)
    samples[20] = np.nan
    broken = kernel.difference_maxima(samples)
    np.testing.assert_array_equal(broken, kernel.difference_maxima_by_numpy(samples))
    assert np.isfinite(broken).all()


@pytest.mark.parametrize("n", SIZES)
@pytest.mark.parametrize("share", [0.0, 0.5, 0.99, 1.01])
def test_places_beside_high_samples(rng, n, share):
    samples = noise(rng, n + 1)
    power = np.abs(samples) ** 2
    threshold = np.float32(max(share * power.max(), 1e-12))
    places, near = kernel.high_places(samples, threshold)
    again, near_again = kernel.high_places_by_numpy(samples, threshold)
    np.testing.assert_array_equal(places, again)
    np.testing.assert_array_equal(near, near_again)
    assert places.dtype == np.intp
    larger = np.maximum(power[:-1], power[1:])
    assert set(np.flatnonzero(larger >= threshold * 1.000001)) <= set(places.tolist())
