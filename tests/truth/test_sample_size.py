"""How long a record must be, and where its peak will stand.

Variance inflation and lengths: derivation from the bivariate Rayleigh tail, computed apart from
the package (a table of 2 ... 8-fold oversampling); peaks of records: Rice 1944/45, computed.
"""

import math

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.core.site import Site
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.sample_size import (
    half_width_db,
    record_peak_db,
    samples_for,
    variance_inflation,
)
from wavegen.sources.noise import Noise

TABLE = [
    (1e-2, 2, 1.336884, 45218.72),
    (1e-2, 4, 2.38689, 80734.09),
    (1e-2, 8, 4.63387, 156735.9),
    (1e-3, 2, 1.172513, 177864.8),
    (1e-3, 4, 1.9853, 301160.8),
    (1e-3, 8, 3.799916, 576429.7),
    (1e-4, 2, 1.09075, 931560.5),
    (1e-4, 4, 1.748856, 1493620.0),
    (1e-4, 8, 3.299734, 2818156.0),
    (1e-5, 2, 1.049308, 5735984.0),
    (1e-5, 4, 1.595266, 8720433.0),
    (1e-5, 8, 2.967956, 16224170.0),
    (1e-6, 2, 1.027357, 39000300.0),
    (1e-6, 4, 1.485818, 56404290.0),
    (1e-6, 8, 2.726384, 103498400.0),
]
"""Probability, oversampling, variance inflation, samples for +-0.1 dB at 95 %."""

PEAKS = {
    1e3: (8.3, 9.2, 10.5),
    1e4: (9.7, 10.3, 11.3),
    1e5: (10.7, 11.2, 12.0),
    1e6: (11.5, 11.9, 12.6),
    1e7: (12.2, 12.5, 13.1),
}
"""Time-bandwidth product: peak of the record at 5, 50 and 95 %, dB."""


@pytest.mark.parametrize(("probability", "oversampling", "inflation", "samples"), TABLE)
def test_the_table_of_lengths(probability, oversampling, inflation, samples):
    # 0.4 %: the table leaves out far lags, whose sum is 0.3 % at 1e-2 and falls with p.
    found = variance_inflation(probability, oversampling=oversampling)
    assert found == pytest.approx(inflation, rel=4e-3)
    assert found >= inflation
    needed = samples_for(0.1, probability, oversampling=oversampling, law=GaussianLaw())
    assert needed == pytest.approx(samples, rel=4e-3)


@pytest.mark.parametrize("time_bandwidth", PEAKS)
def test_peaks_of_records(time_bandwidth):
    # Figures to 0.1 dB.
    found = [record_peak_db(time_bandwidth, p) for p in (0.05, 0.5, 0.95)]
    assert found == pytest.approx(PEAKS[time_bandwidth], abs=0.051)


def test_levels_and_peaks_of_many_records():
    """400 records of 8192 samples of fourfold-oversampled noise, from one loop.

    Spread of the 1 % level: the predicted half-width covers 95 %, here 92 ... 98 (3 sigma; the
    record's own mean adds nothing as the level is taken over that of the loop). Peaks: a quarter
    of the samples are independent; 5 and 95 % of 400 within 3 sigma, the median within 0.1 dB.
    """
    n_records, length = 400, 8192
    n = n_records * length
    rate = 4_000_000
    source = Noise(bandwidth_hz=rate // 4).build(
        Site(sample_rate_hz=rate, n_samples=n, seed=9, label="noise", path="signal")
    )
    x = samples_of(source)
    power = (x.real.astype(float) ** 2 + x.imag.astype(float) ** 2).reshape(n_records, length)
    power /= power.mean()
    level_db = 10 * np.log10(np.quantile(power, 0.99, axis=1))
    true_db = float(GaussianLaw().level_db(0.01))
    half_db = half_width_db(length, 0.01, oversampling=4, law=GaussianLaw())
    assert 0.91 < np.mean(np.abs(level_db - true_db) < half_db) < 0.985
    peak_db = 10 * np.log10(power.max(axis=1))
    for probability in (0.05, 0.5, 0.95):
        want = record_peak_db(length / 4, probability)
        # Samples miss 0.07 dB of the peak between them at fourfold oversampling.
        share = np.mean(peak_db < want - 0.07)
        sigma = math.sqrt(probability * (1 - probability) / n_records)
        assert share == pytest.approx(probability, abs=3 * sigma + 0.02)
