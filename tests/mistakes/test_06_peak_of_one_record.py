"""Mistake: a crest factor read off the highest peak of one record, without the record's length.

Size: of the same noise the median peak stands 9.2 dB over the mean in a record of 1e3 times the
inverse bandwidth, and 12.5 dB in one of 1e7. Remedy: levels at a probability, which do not grow
with the record, and for the peak the interval that a record of this length leads to expect.
"""

import numpy as np
import pytest

from wavegen.meters.power import measure_samples
from wavegen.meters.record_peak import record_peak

OVER = 4
N_RECORDS = 400


@pytest.fixture(scope="module")
def records():
    """Noise a quarter of the rate wide, cyclic records of 250 inverse bandwidths, 4x finer."""
    rng = np.random.default_rng(6)
    n, width = 1000, 250
    spectrum = np.zeros((N_RECORDS, n * OVER), np.complex128)
    lines = np.arange(-width // 2, width - width // 2)
    draws = rng.standard_normal((2, N_RECORDS, width))
    spectrum[:, lines] = draws[0] + 1j * draws[1]
    samples = np.fft.ifft(spectrum, axis=1)
    return samples / np.sqrt(np.mean(np.abs(samples) ** 2))


def test_the_peak_grows_with_the_record_and_the_level_does_not(records):
    short = [measure_samples(record.astype(np.complex64)) for record in records[:50]]
    long = measure_samples(records.reshape(-1).astype(np.complex64))
    growth_db = long.papr_db - np.median([item.papr_db for item in short])
    assert growth_db > 1.5
    # One record in 50 holds 5 independent exceedances of 1 %: the mean of 50 is good to 0.15 dB.
    mean_db = np.mean([float(item.level_db(0.01)) for item in short])
    assert float(long.level_db(0.01)) == pytest.approx(mean_db, abs=0.15)


def test_medians_as_published():
    for size, median_db in ((1e3, 9.2), (1e7, 12.5)):  # own computation, Rice's rate
        assert record_peak(time_bandwidth=size).median_db == pytest.approx(median_db, abs=0.05)


def test_the_interval_holds_the_peaks_of_records(records):
    # 95 % of 400: between 92 and 98 % by 3 sigma of the count; the law is one of high levels,
    # and at TB = 250 its own error shows at the lower end.
    expected = record_peak(time_bandwidth=250)
    peaks_db = 10 * np.log10((np.abs(records) ** 2).max(axis=1))
    inside = np.mean((peaks_db > expected.low_db) & (peaks_db < expected.high_db))
    assert 0.92 <= inside <= 0.99
    assert np.median(peaks_db) == pytest.approx(expected.median_db, abs=0.15)
