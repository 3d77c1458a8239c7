from fractions import Fraction
from itertools import pairwise

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.meters.batches import measure_batches
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.sensor import sensor_view
from wavegen.meters.sensor_sample import MeanBetween, sample_by_sensor

N = 60_000
BANDWIDTH_HZ = 50e3


def sampled(signal, *, loops=False, rate_hz=None, shape="one_pole"):
    view = sensor_view(
        signal,
        video_bandwidth_hz=BANDWIDTH_HZ,
        sensor_rate_hz=rate_hz,
        shape=shape,
        loops=loops,
    )
    mean = float(np.mean(np.abs(samples_of(signal).astype(np.complex128)) ** 2))
    return SampledStatistics.of(
        sample_by_sensor(view, n_readings=view.n_samples, loops=loops, mean=mean)
    )


@pytest.mark.parametrize("rate_hz", [Fraction(100_000), Fraction(333_333), Fraction(10**6, 7)])
def test_means_between_instants_are_those_of_all_samples(held, band_noise, rate_hz):
    noise = band_noise(1, 10_001, 0.25)
    between = MeanBetween.of(held(noise), rate_hz)
    places = [int(k * Fraction(10**6) / rate_hz) for k in range(between.n_samples)] + [noise.size]
    power = np.abs(noise.astype(np.complex128)) ** 2
    want = [power[low:high].mean() for low, high in pairwise(places)]
    got = samples_of(between)
    assert np.abs(got) ** 2 == pytest.approx(np.array(want), rel=1e-6)
    for start, stop in ((0, 1), (17, 401), (between.n_samples - 3, between.n_samples)):
        part = evaluate({between: (start, stop)})[between]
        assert part.tobytes() == got[start:stop].tobytes()


@pytest.mark.parametrize("shape", ["one_pole", "brick_wall"])
def test_sums_of_batches_add_up_to_the_mean(held, band_noise, shape):
    found = sampled(held(band_noise(2, N, 0.25)), loops=True, shape=shape)
    assert found.batches.sums[:, 0].sum() == pytest.approx(found.statistics.mean * N, rel=1e-12)


def test_all_readings_of_an_unfiltered_view_are_the_record_itself(held, band_noise):
    noise = band_noise(3, N, 0.25)
    plain = measure_batches(noise)
    found = sample_by_sensor(
        held(noise), n_readings=N, loops=False, mean=float(plain.statistics.mean)
    )
    assert found.statistics.mean == plain.statistics.mean
    assert found.batches.sums == pytest.approx(plain.batches.sums, rel=1e-12)
    np.testing.assert_array_equal(found.batches.counts, plain.batches.counts)


def test_silence_is_refused(held):
    with pytest.raises(SignalError):
        sample_by_sensor(held(np.zeros(100)), n_readings=100, loops=False, mean=1.0)


@pytest.mark.parametrize(
    ("rate_hz", "n_records"), [(None, 200), (Fraction(100_000), 200)], ids=["all", "every tenth"]
)
def test_intervals_hold_the_process(held, band_noise, rate_hz, n_records):
    # The process: what 2^22 samples of the same noise read (40 times the records' own error less).
    long = sampled(held(band_noise(99, 1 << 22, 0.25)), loops=True)
    probabilities = (0.1, 0.01)
    true_db = long.statistics.level_db(np.array(probabilities))
    held_by = np.zeros(2)
    for seed in range(n_records):
        record = sampled(held(band_noise(1000 + seed, 1 << 15, 0.25)), rate_hz=rate_hz)
        low_db, high_db = record.level_interval(np.array(probabilities))
        held_by += (low_db <= true_db) & (true_db <= high_db)
    # 0.95 less 3 sigma of 200 records, 0.046; samples counted as independent would hold 0.5.
    assert held_by / n_records == pytest.approx(np.array([0.96, 0.96]), abs=0.056)
