import numpy as np
import pytest

from wavegen.meters.repetition import Lagged, data_period


def tiled(rng, period, times):
    one = rng.standard_normal(period) + 1j * rng.standard_normal(period)
    return np.tile(one, times).astype(np.complex64)


@pytest.mark.parametrize(
    ("period", "times"), [(511, 10), (1000, 1), (64, 2**6), (3, 3000), (1, 4096), (7919, 7)]
)
def test_the_shortest_period_is_found(held, period, times):
    samples = tiled(np.random.default_rng(1), period, times)
    assert data_period(held(samples)) == period


@pytest.mark.parametrize("workers", [1, 3])
def test_one_sample_that_differs_makes_it_one_period(held, workers):
    samples = tiled(np.random.default_rng(2), 3000, 100)
    samples[123_456] *= 1.5
    # Looks at 16 places do not meet it; the comparison throughout does.
    assert data_period(held(samples), workers=workers) == samples.size


def test_codes_that_were_rounded_apart_are_the_same(held):
    rng = np.random.default_rng(3)
    step = 1 / 128
    samples = tiled(rng, 500, 8) * 0.2
    codes = np.round(samples.view(np.float32) / step + rng.uniform(-0.01, 0.01, 8000))
    rounded = (codes * step).astype(np.float32).view(np.complex64)
    assert np.any(rounded[:500] != rounded[500:1000])
    assert data_period(held(rounded), code_step=step) == 500
    assert data_period(held(rounded)) == 4000


def test_what_is_not_finite_repeats_nothing(held):
    samples = tiled(np.random.default_rng(4), 100, 4)
    samples[5] = np.nan
    assert data_period(held(samples)) == 400


def test_silence_repeats_at_once(held):
    assert data_period(held(np.zeros(360, np.complex64))) == 1


def test_the_difference_goes_round_the_seam(held):
    from wavegen.core.render import samples_of

    samples = np.arange(10).astype(np.complex64)
    lagged = Lagged.of(held(samples), 3)
    np.testing.assert_array_equal(samples_of(lagged), samples - np.roll(samples, -3))
