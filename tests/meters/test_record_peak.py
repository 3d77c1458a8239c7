import math

import numpy as np
import pytest
from scipy import integrate

from wavegen.core.errors import ArgumentsError
from wavegen.meters.record_peak import (
    crossing_rate,
    largest_of_own_mean,
    largest_over_ensemble,
    record_peak,
)


@pytest.mark.parametrize("size", [30.0, 1e4, 1e12])
def test_quantiles_solve_the_law(size):
    found = record_peak(time_bandwidth=size, coverage=0.9)
    for level_db, share in ((found.low_db, 0.05), (found.median_db, 0.5), (found.high_db, 0.95)):
        power = 10 ** (level_db / 10)
        assert math.exp(-size * crossing_rate(power)) == pytest.approx(share, rel=1e-6)
    assert found.time_bandwidth == size


def test_more_coverage_is_wider():
    narrow = record_peak(time_bandwidth=1e5, coverage=0.5)
    wide = record_peak(time_bandwidth=1e5, coverage=0.99)
    assert wide.low_db < narrow.low_db < narrow.median_db < narrow.high_db < wide.high_db


@pytest.mark.parametrize("options", [{"time_bandwidth": 2.0}, {"time_bandwidth": math.nan}])
def test_too_short_a_record_is_refused(options):
    with pytest.raises(ArgumentsError):
        record_peak(**options)


@pytest.mark.parametrize("coverage", [0.0, 1.0, 1.5])
def test_a_coverage_that_is_none_is_refused(coverage):
    with pytest.raises(ArgumentsError):
        record_peak(time_bandwidth=100, coverage=coverage)


@pytest.mark.parametrize("n", [2, 8, 64, 1000])
def test_the_mean_of_the_largest_is_a_harmonic_number(n):
    # E max / mean = 1 + 1/2 + ... + 1/n (exponential spacings; independent of the mean).
    found, _ = integrate.quad(
        largest_of_own_mean, 0, n, args=(n,), limit=400, points=[1, 5, 10, min(20, n)]
    )
    assert found == pytest.approx(np.sum(1 / np.arange(1, n + 1)), rel=1e-6)


def test_bounds():
    assert largest_of_own_mean(1.0, 10) == 1
    assert largest_of_own_mean(10.0, 10) == 0
    assert largest_of_own_mean(3.0, 100_000) == 1
    assert largest_over_ensemble(0.0, 5) == 1
    assert largest_of_own_mean(9.0, 10**6) == pytest.approx(largest_over_ensemble(9.0, 10**6), 1e-3)
