import math

import numpy as np
import pytest
import scipy.special

from wavegen.core.errors import SignalError
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.sample_size import (
    half_width_db,
    level_slope_db,
    record_peak_db,
    samples_for,
    samples_to_find,
    variance_inflation,
)

NOISE = GaussianLaw()


@pytest.mark.parametrize(("p", "oversampling"), [(0.1, 4), (1e-3, 2), (1e-4, 5.5), (1e-6, 8)])
def test_inflation_by_the_other_series(p, oversampling):
    # P2 - p^2 = sum_n rho^2n (p (L_n(u) - L_(n-1)(u)))^2, all lags; rest of n = 1 by Parseval.
    u = -math.log(p)
    lags = np.arange(1, 400 * int(oversampling))
    rho2 = np.sinc(lags / oversampling) ** 2
    total = p * p * u**2 * ((oversampling - 1) / 2 - rho2.sum())
    before, now = 1.0, 1.0 - u
    for n in range(1, 900):
        total += (p * (now - before)) ** 2 * np.sum(rho2**n)
        before, now = now, ((2 * n + 1 - u) * now - n * before) / (n + 1)
    want = 1 + 2 * total / (p * (1 - p))
    assert variance_inflation(p, oversampling=oversampling) == pytest.approx(want, rel=1e-4)


def test_independent_samples_have_none():
    assert variance_inflation(0.01, oversampling=1) == pytest.approx(1, abs=1e-9)


@pytest.mark.parametrize(("p", "oversampling"), [(0.0, 4), (1.0, 4), (0.1, 0.5)])
def test_what_has_no_inflation(p, oversampling):
    with pytest.raises(SignalError):
        variance_inflation(p, oversampling=oversampling)


def test_the_slope_of_gaussian_noise():
    # L = 10 log10(-ln p): dL / d ln p = 4.343 / ln p.
    for p in (0.1, 1e-3, 1e-8):
        want = -10 / math.log(10) / math.log(p)
        assert level_slope_db(NOISE, p) == pytest.approx(want, rel=1e-4)


def test_precision_and_length_are_inverse():
    n = samples_for(0.05, 1e-3, oversampling=4, law=NOISE)
    assert half_width_db(n, 1e-3, oversampling=4, law=NOISE) == pytest.approx(0.05, rel=1e-4)
    assert samples_for(0.025, 1e-3, oversampling=4, law=NOISE) == pytest.approx(4 * n, rel=1e-5)
    wide = half_width_db(n, 1e-3, oversampling=4, law=NOISE, confidence=0.99)
    assert wide == pytest.approx(0.05 * 2.5758 / 1.95996, rel=1e-4)


def test_a_rough_figure_still_needs_exceedances():
    # 20 independent ones at 1e-4, whatever is asked.
    n = samples_for(5.0, 1e-4, oversampling=4, law=NOISE)
    assert n == math.ceil(20e4 * variance_inflation(1e-4, oversampling=4))


def test_a_fault_is_found_in_most_runs():
    n = samples_to_find(0.1, 1e-3, oversampling=4, law=NOISE)
    sigma = half_width_db(n, 1e-3, oversampling=4, law=NOISE) / scipy.special.ndtri(0.975)
    threshold = scipy.special.ndtri(1 - 1e-4) * sigma
    assert scipy.special.ndtr((0.1 - threshold) / sigma) == pytest.approx(0.8, abs=1e-4)
    # The promise of the program: two million samples of fourfold-oversampled noise serve.
    assert n < 2_000_000


def test_peaks_of_records_rise_with_their_length():
    peaks = [record_peak_db(n) for n in (10, 1e3, 1e6, 1e9)]
    assert np.all(np.diff(peaks) > 0)
    with pytest.raises(SignalError):
        record_peak_db(3)
    with pytest.raises(SignalError):
        record_peak_db(1e6, 1.0)
