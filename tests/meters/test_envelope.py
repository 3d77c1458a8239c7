"""Power against time in stretches."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.meters.envelope import EnvelopeMeter


def of(signal, cuts, n_columns=7):
    meter = EnvelopeMeter(n_columns=n_columns)
    readings = []
    for start, stop in zip([0, *cuts], [*cuts, signal.n_samples], strict=True):
        reading = meter.begin(signal)
        reading.feed(start, signal.compute(start, stop))
        readings.append(reading)
    for reading in readings[1:]:
        readings[0].merge(reading)
    return readings[0].result()


def test_against_plain_numpy_and_independent_of_cuts(held):
    rng = np.random.default_rng(5)
    samples = (rng.standard_normal(2003) + 1j * rng.standard_normal(2003)).astype(np.complex64)
    signal = held(samples)
    power = samples.real.astype(float) ** 2 + samples.imag.astype(float) ** 2
    edges = np.arange(8) * 2003 // 7
    whole = of(signal, [])
    for k in range(7):
        part = power[edges[k] : edges[k + 1]]
        assert whole.lowest[k] == part.min()
        assert whole.highest[k] == part.max()
        assert whole.mean[k] == pytest.approx(part.mean(), rel=1e-14)
    assert whole.total_mean == pytest.approx(power.mean(), rel=1e-14)
    assert whole.duration_s == pytest.approx(float(2003 / Fraction(signal.sample_rate_hz)))
    for _ in range(20):
        cuts = sorted(rng.choice(np.arange(1, 2003), rng.integers(1, 9), replace=False).tolist())
        cut = of(signal, cuts)
        for name in ("lowest", "mean", "highest"):
            assert np.array_equal(getattr(cut, name), getattr(whole, name))


def test_one_column_a_sample_where_samples_are_few(held):
    found = of(held(np.arange(1, 6)), [2], n_columns=800)
    assert found.mean.tolist() == [1, 4, 9, 16, 25]


def test_refuses_what_is_not_finite_or_not_whole(held):
    signal = held(np.array([1, 2, np.nan, 4]))
    reading = EnvelopeMeter(n_columns=2).begin(signal)
    with pytest.raises(SignalError, match="sample 2"):
        reading.feed(0, signal.compute(0, 4))
    reading = EnvelopeMeter(n_columns=2).begin(signal)
    reading.feed(0, signal.compute(0, 2))
    with pytest.raises(SignalError):
        reading.result()
