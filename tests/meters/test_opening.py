import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.meters.batches import BatchedPowerMeter, measure_batches
from wavegen.meters.opening import OpeningMeter

N, OPENING = 50_000, 20_000


@pytest.fixture(scope="module")
def samples():
    rng = np.random.default_rng(5)
    return (rng.standard_normal(N) + 1j * rng.standard_normal(N)).astype(np.complex64)


def read(samples, cuts, n_samples=OPENING):
    meter = OpeningMeter(meter=BatchedPowerMeter(loops=True), n_samples=n_samples)
    total = None
    for start, stop in zip([0, *cuts], [*cuts, samples.size], strict=True):
        reading = meter.begin(None)
        reading.feed(start, samples[start:stop])
        if total is None:
            total = reading
        else:
            total.merge(reading)
    return total.result()


@pytest.mark.parametrize("cuts", [[], [1], [19_999, 20_000, 20_001], [7_000, 30_000, 40_000]])
def test_only_what_lies_before_the_limit_counts(samples, cuts):
    found = read(samples, cuts)
    alone = measure_batches(samples[:OPENING], loops=True)
    assert found.statistics.n_samples == OPENING
    assert found.statistics.mean == alone.statistics.mean
    np.testing.assert_array_equal(found.batches.sums, alone.batches.sums)
    np.testing.assert_array_equal(found.batches.pairs, alone.batches.pairs)


def test_faults_behind_it_do_not_matter(samples):
    bad = samples.copy()
    bad[OPENING] = np.nan
    assert read(bad, [5_000]).statistics.n_samples == OPENING
    bad[OPENING - 1] = np.nan
    with pytest.raises(SignalError):
        read(bad, [5_000])
