"""Mistake: the crest factor of a wide signal read with a sensor of less video bandwidth.

Size: noise of 9.64 dB at 0.01 % reads 8.6 dB through half its bandwidth, 5.3 dB through a tenth; a
single pole must be three times as wide as the signal. Remedy: `--video-bandwidth` shows what such
a sensor will read of this signal, beside what is there.
"""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.site import Site
from wavegen.meters.sensor import measure_by_sensor
from wavegen.sources.noise import Noise

BANDWIDTH = 250_000
PROBABILITY = 1e-3


@pytest.fixture(scope="module")
def noise():
    site = Site(sample_rate_hz=Fraction(2_000_000), n_samples=1 << 19, seed=1, label="a", path="s")
    return Noise(bandwidth_hz=Fraction(BANDWIDTH)).build(site)


def reading(noise, fraction, shape):
    return measure_by_sensor(
        noise, video_bandwidth_hz=fraction * BANDWIDTH, shape=shape, loops=True
    )


@pytest.mark.parametrize("shape", ["one_pole", "brick_wall"])
def test_the_narrower_the_sensor_the_lower_it_reads(noise, shape):
    shortfalls = [reading(noise, part, shape).shortfall_db(PROBABILITY) for part in (1, 0.5, 0.1)]
    assert np.all(np.diff(shortfalls) > 0)
    # At 0.1 % through a tenth: 8.39 - 4.45 and 8.39 - 5.39 dB; 65 independent exceedances of the
    # signal and fewer of the filtered: 0.35 dB.
    want = {"brick_wall": 3.94, "one_pole": 3.0}[shape]
    assert shortfalls[-1] == pytest.approx(want, abs=0.35)


def test_the_average_does_not_show_it(noise):
    seen = reading(noise, 0.1, "one_pole")
    assert seen.sensor.mean_db == seen.signal.mean_db


def test_three_times_the_bandwidth_is_enough(noise):
    assert reading(noise, 3.0, "one_pole").shortfall_db(PROBABILITY) < 0.1
    assert reading(noise, 1.2, "brick_wall").shortfall_db(PROBABILITY) < 0.01


def test_the_rate_of_the_sensor_costs_nothing_but_samples(noise):
    slow = measure_by_sensor(
        noise,
        video_bandwidth_hz=BANDWIDTH,
        sensor_rate_hz=Fraction(100_000),
        loops=True,
    )
    fast = measure_by_sensor(noise, video_bandwidth_hz=BANDWIDTH, loops=True)
    assert slow.sensor.n_samples < fast.sensor.n_samples / 19
    # A twentieth of the samples, nearly independent: 260 beyond 1 %, 4 sigma is 0.25 dB.
    assert float(slow.sensor.level_db(0.01) - fast.sensor.level_db(0.01)) == pytest.approx(
        0, abs=0.25
    )
