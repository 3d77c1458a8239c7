import math

import numpy as np

from wavegen.laws.listed import ListedLaw

LAW = ListedLaw.of(np.array([1, 1j, 0, -2], np.complex64), name="four")


def test_the_curve_counts_samples():
    levels = 10 * np.log10(np.array([0.5, 1.0, 3.9, 4.0]) / 1.5)
    # Powers 0, 1, 1, 4 over their mean of 1.5.
    assert LAW.ccdf(levels).tolist() == [0.75, 0.25, 0.25, 0.0]
    assert LAW.ccdf(-math.inf) == 0.75
    assert math.isclose(LAW.peak_db, 10 * math.log10(4 / 1.5))


def test_levels_are_the_smallest_that_do():
    got = LAW.level_db([1.0, 0.75, 0.5, 0.25, 0.1, 0.0])
    one, four = 10 * np.log10(1 / 1.5), 10 * np.log10(4 / 1.5)
    np.testing.assert_allclose(got, [-np.inf, -np.inf, one, one, four, four])
    for p in (0.75, 0.5, 0.25, 0.1):
        assert LAW.ccdf(LAW.level_db(p)) <= p
