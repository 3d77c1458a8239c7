from itertools import pairwise

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.meters import METERS
from wavegen.meters.mean import MeanMeter
from wavegen.meters.power import measure_samples


def read(samples, cuts=()):
    readings = []
    edges = [0, *cuts, samples.size]
    for start, stop in pairwise(edges):
        reading = MeanMeter(where="x").begin(None)
        reading.feed(start, samples[start:stop])
        readings.append(reading)
    total = readings[0]
    for reading in readings[1:]:
        total.merge(reading)
    return total.result()


def test_is_in_the_table():
    assert METERS.load("mean") is MeanMeter


def test_mean_power():
    samples = np.array([1, 2j, 0, 2 + 1j], np.complex64)
    assert read(samples) == (1 + 4 + 0 + 5) / 4


def test_same_as_the_power_meter_however_cut():
    rng = np.random.default_rng(1)
    samples = (rng.standard_normal(9000) + 1j * rng.standard_normal(9000)).astype(np.complex64)
    expected = measure_samples(samples).mean
    assert read(samples) == expected
    assert read(samples, cuts=(1, 1024, 1500, 7777)) == expected
    # Not so with a plain running sum: the cuts would show.
    power = np.abs(samples) ** 2
    plain = sum(float(part.sum()) for part in np.split(power, [1, 1024, 1500, 7777])) / 9000
    assert plain != expected


def test_silence_has_a_mean():
    assert read(np.zeros(2000, np.complex64)) == 0.0


def test_nothing_has_none():
    with pytest.raises(SignalError) as caught:
        MeanMeter(where="x").begin(None).result()
    assert caught.value.where == "x"


def test_sample_that_is_not_finite_is_named():
    samples = np.ones(2000, np.complex64)
    samples[1777] = np.inf
    with pytest.raises(SignalError, match="sample 1777 "):
        read(samples, cuts=(1024,))
