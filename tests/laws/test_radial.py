import math

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.laws.radial import RadialLaw


class Disc:
    """``R`` even on a disc of radius 1: ``P(R > r) = 1 - r^2``."""

    def above(self, radius):
        return 1 - radius**2


class Steps:
    """Half of the time at 1, half at 2."""

    def above(self, radius):
        return np.where(radius < 1, 1.0, np.where(radius < 2, 0.5, 0.0))


def law(tail, peak, power):
    return RadialLaw(
        name="x", holds="over seeds", mean_power=power, peak=peak, radius=peak, tail=tail
    )


def test_levels_are_relative_to_the_mean():
    made = law(Disc(), 1.0, 0.5)
    assert made.peak_db == pytest.approx(10 * math.log10(2))
    p = np.array([[0.9, 0.5], [1e-3, 1e-9]])
    np.testing.assert_allclose(made.level_db(p), 10 * np.log10((1 - p) / 0.5), atol=1e-9)
    # The disc ends so steeply that 1e-13 of the radius is 2e-4 of the probability at 1e-9.
    np.testing.assert_allclose(made.ccdf(made.level_db(p)), p, rtol=1e-3)


def test_ends_of_probability():
    made = law(Disc(), 1.0, 0.5)
    assert made.level_db([0.0, 1.0]).tolist() == [made.peak_db, -math.inf]
    assert made.ccdf([-np.inf, made.peak_db]).tolist() == [1.0, 0.0]
    with pytest.raises(SignalError):
        made.level_db(1.5)


def test_steps_give_the_smallest_level_that_does():
    made = law(Steps(), 2.0, 2.5)
    got = made.level_db([0.6, 0.5, 0.4])
    np.testing.assert_allclose(got, 10 * np.log10(np.array([1, 1, 4]) / 2.5), atol=1e-9)
