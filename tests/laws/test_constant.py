import math

import numpy as np

from wavegen.laws.constant import ConstantLaw


def test_everything_stands_at_the_mean():
    law = ConstantLaw()
    np.testing.assert_array_equal(law.ccdf([-10.0, -1e-9, 0.0, 1e-9]), [1, 1, 0, 0])
    np.testing.assert_array_equal(law.level_db([0.0, 1e-9, 0.5]), 0.0)
    assert law.level_db(1.0) == -math.inf
    assert law.peak_db == 0.0
    assert law.holds == "every loop"
