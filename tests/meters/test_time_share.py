import numpy as np
import pytest

from wavegen.meters.power import measure_samples
from wavegen.meters.time_share import time_share, time_share_absolute


@pytest.fixture
def statistics():
    # A quarter at power 1, three quarters at 1/4: mean 0.4375.
    return measure_samples(np.array([1.0] * 100 + [0.5] * 300, np.complex64))


def test_above_and_below(statistics):
    found = time_share(statistics, 0.0, reference_level_dbm=-10.0)
    assert (found.above_percent, found.below_percent) == (25, 75)
    assert found.level_dbfs == pytest.approx(10 * np.log10(0.4375))
    assert found.level_dbm == pytest.approx(10 * np.log10(0.4375) - 10)
    assert found.resolved


def test_absolute_levels(statistics):
    for level_dbfs, above in ((-7.0, 100), (-3.0, 25), (0.0, 0)):
        found = time_share_absolute(statistics, level_dbfs)
        assert found.above_percent == above
        assert found.level_dbm is None
        assert found.resolved == (above == 25)
    assert time_share_absolute(statistics, -3.0).level_db == pytest.approx(
        -3.0 - statistics.mean_db
    )


def test_rows_are_plain_values(statistics):
    row = time_share(statistics, 1.0).row()
    assert row["above_percent"] + row["below_percent"] == 100
    assert row["level_dbm"] is None
