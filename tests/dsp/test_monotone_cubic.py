import numpy as np
import pytest
import scipy.interpolate

from wavegen.dsp.monotone_cubic import MonotoneCubic

X = np.array([0.0, 0.4, 1.0, 1.1, 2.5, 4.0, 4.2])


@pytest.mark.parametrize(
    "y",
    [
        [0.0, 0.1, 2.0, 2.0, 3.0, 9.0, 9.5],
        [1.0, -1.0, 1.0, -1.0, 1.0, -1.0, 1.0],
        [5.0, 4.0, 4.0, 4.0, 3.9, -2.0, -2.5],
        [0.0, 3.0, 3.1, 3.0, 3.0, 3.5, 0.0],
        [0.0, 0.04, -6.0, -6.1, -6.0, 9.0, 8.9],
    ],
)
def test_it_is_what_the_library_of_numerics_gives(y):
    """The library has the same slopes (Fritsch and Butland 1984); rounding alone differs."""
    at = np.linspace(0.0, 4.2, 2001)
    want = scipy.interpolate.PchipInterpolator(X, y)(at)
    got = MonotoneCubic(x=X, y=np.array(y))(at)
    np.testing.assert_allclose(got, want, atol=1e-13 * np.ptp(y))


def test_nothing_swings():
    y = np.array([0.0, 0.0, 0.0, 1.0, 1.0, 5.0, 5.0])
    values = MonotoneCubic(x=X, y=y)(np.linspace(0, 4.2, 5000))
    assert np.diff(values).min() >= -1e-15
    assert values.min() >= 0
    assert values.max() <= 5


def test_points_are_met_and_ends_held():
    y = np.array([0.3, 0.1, 2.0, 2.5, 3.0, 9.0, 9.5])
    curve = MonotoneCubic(x=X, y=y)
    np.testing.assert_allclose(curve(X), y, atol=1e-14)
    assert curve(np.array([-7.0, 99.0])).tolist() == pytest.approx([0.3, 9.5])


def test_two_points_are_a_line():
    curve = MonotoneCubic(x=np.array([1.0, 3.0]), y=np.array([2.0, -2.0]))
    assert curve(np.array([1.5, 2.0])).tolist() == [1.0, 0.0]
