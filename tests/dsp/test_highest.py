"""The largest values of long arrays."""

import numpy as np
import pytest

from wavegen.dsp.highest import highest


@pytest.mark.parametrize("size", [0, 1, 70_000, 200_001])
@pytest.mark.parametrize("count", [1, 7, 100])
def test_as_a_stable_sort_has_them(size, count):
    values = np.random.default_rng(size).integers(0, 50_000, size).astype(float)
    expected = np.argsort(-values, kind="stable")[:count]
    assert highest(values, count).tolist() == expected.tolist()
