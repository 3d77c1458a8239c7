import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.laws.law import checked_probability, from_db, to_db


@pytest.mark.parametrize("wrong", [-0.1, 1.5, float("nan")])
def test_what_is_no_probability_is_refused(wrong):
    with pytest.raises(SignalError) as caught:
        checked_probability([0.5, wrong])
    assert caught.value.where == "probability"
    assert caught.value.allowed == "0 to 1"


def test_decibels_go_both_ways_and_zero_is_minus_infinity():
    np.testing.assert_allclose(to_db(from_db([-30.0, 0.0, 3.0])), [-30.0, 0.0, 3.0], atol=1e-12)
    assert to_db(0.0) == -np.inf
