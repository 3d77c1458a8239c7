import math

import numpy as np

from wavegen.laws.gaussian import GaussianLaw


def test_level_and_ccdf_are_inverse_down_to_the_deepest_probability():
    probability = np.geomspace(1e-9, 0.999, 200)
    law = GaussianLaw()
    np.testing.assert_allclose(law.ccdf(law.level_db(probability)), probability, rtol=1e-12)


def test_ends_and_what_it_claims():
    law = GaussianLaw()
    assert law.level_db(0.0) == math.inf
    assert law.level_db(1.0) == -math.inf
    assert law.peak_db == math.inf
    assert law.holds == "over seeds"


def test_moments_are_factorials():
    assert [GaussianLaw().moment(k) for k in (1, 2, 3)] == [1, 2, 6]
