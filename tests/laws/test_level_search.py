import math

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.law import from_db
from wavegen.laws.level_search import level_by_halving


def test_it_inverts_a_ccdf_at_every_depth():
    law = GaussianLaw()
    probability = np.geomspace(1e-9, 0.9999, 50).reshape(10, 5)
    found = level_by_halving(law.ccdf, probability, most_db=20.0)
    np.testing.assert_allclose(found, law.level_db(probability), atol=1e-10)


def test_a_step_is_found_at_its_upper_end():
    # "The smallest level whose CCDF is at or below": 3 dB itself, for all below 0.25.
    def stair(level_db):
        return np.where(np.asarray(level_db) < 3, 0.25, 0.0)

    found = level_by_halving(stair, [0.2, 0.25, 0.3], most_db=10.0)
    assert found[0] == pytest.approx(3, abs=1e-11)
    assert found[1:].tolist() == [-math.inf, -math.inf]


def test_beyond_the_top_there_is_no_level():
    def heavy(level_db):
        return 1 / (1 + from_db(level_db))

    assert level_by_halving(heavy, 1e-6, most_db=10.0) == math.inf


def test_a_probability_is_checked():
    with pytest.raises(SignalError):
        level_by_halving(GaussianLaw().ccdf, 1.5, most_db=20.0)
