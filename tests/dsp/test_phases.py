import numpy as np
import pytest

from wavegen.core.rng import stream_key
from wavegen.dsp.phases import (
    equal_phases,
    newman_phases,
    random_phases,
    rudin_shapiro_phases,
    schroeder_phases,
)


def test_newman_follows_its_formula():
    number = np.arange(1, 38)
    expected = np.exp(1j * np.pi * (number - 1) ** 2 / 37)
    np.testing.assert_allclose(np.exp(1j * newman_phases(37)), expected, atol=1e-12)


def test_schroeder_for_equal_powers_is_the_quadratic_form():
    number = np.arange(1, 33)
    expected = -np.pi * number * (number - 1) / 32
    np.testing.assert_allclose(schroeder_phases(np.full(32, 3.0)), expected, atol=1e-12)


def test_schroeder_for_any_powers_is_the_double_sum():
    powers = np.array([1.0, 0.5, 2.0, 0.25])
    share = powers / powers.sum()
    expected = [-2 * np.pi * sum((n - k) * share[k] for k in range(n)) for n in range(4)]
    np.testing.assert_allclose(schroeder_phases(powers), expected, atol=1e-12)


@pytest.mark.parametrize("order", range(1, 9))
def test_rudin_shapiro_is_built_by_appending_the_partner(order):
    first, partner = np.array([1.0]), np.array([1.0])
    for _ in range(order):
        first, partner = np.append(first, partner), np.append(first, -partner)
    np.testing.assert_array_equal(np.cos(rudin_shapiro_phases(1 << order)), first)
    # Golay's identity: |A|^2 + |B|^2 is flat, which bounds the peak of either at twice the mean.
    both = sum(np.abs(np.fft.fft(word, 4 << order)) ** 2 for word in (first, partner))
    np.testing.assert_allclose(both, 2 * (1 << order), rtol=1e-12)


def test_random_phases_are_uniform_and_belong_to_their_stream():
    phases = random_phases(stream_key(1, "a"), 10000)
    assert phases.min() >= 0
    assert phases.max() < 2 * np.pi
    # The mean of e^{j m phi} over n draws has standard deviation 1/sqrt(n); 4 of them allowed.
    for order in (1, 2, 3):
        assert abs(np.exp(1j * order * phases).mean()) < 4 / 100
    assert not np.array_equal(phases, random_phases(stream_key(1, "b"), 10000))
    np.testing.assert_array_equal(phases[:10], random_phases(stream_key(1, "a"), 10))


def test_equal_phases_are_zero():
    assert not equal_phases(5).any()
