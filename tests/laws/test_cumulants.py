import numpy as np
import pytest

from wavegen.laws.cumulants import ORDER, SMALL, count_large, cumulants, power_sums


@pytest.mark.parametrize(
    "values",
    [[-1.0, 1.0], [-1, -1 / 3, 1 / 3, 1], np.cos(np.arange(8) * np.pi / 4 + 0.1), [1, 0.2]],
)
def test_the_series_is_good_where_arguments_are_small(values):
    values = np.array(values, float)
    s = np.linspace(0, SMALL, 7)
    want = np.exp(1j * np.outer(s, values)).mean(axis=1)
    powers = (1j * s[:, None]) ** np.arange(1, ORDER + 1)
    np.testing.assert_allclose(np.exp(powers @ cumulants(values)), want, atol=2e-15)


def test_sums_of_powers_are_of_the_taps_from_each_on():
    sums = power_sums(np.array([2.0, -1.0]))
    assert sums.shape == (3, ORDER)
    assert sums[:, :3].tolist() == [[1, 5, 7], [-1, 1, -1], [0, 0, 0]]


def test_small_taps_are_left_to_the_series():
    assert count_large(np.array([1.0, -0.5, 0.01]), 1.0) == 2
