from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.meters.power import measure_samples
from wavegen.meters.sensor import (
    Picked,
    measure_by_sensor,
    one_pole_taps,
    sensor_view,
    variance_left,
)

N = 60_000
RATE = 1e6


@pytest.fixture
def noise(band_noise):
    return band_noise(6, N, 0.25)


@pytest.mark.parametrize("cutoff", [0.002, 0.05, 0.3])
def test_one_pole_is_one_pole(cutoff):
    taps, lag = one_pole_taps(cutoff)
    place = np.arange(taps.size) - taps.size // 2 + lag
    for frequency in (0.0, cutoff / 3, min(cutoff, 0.4), 0.25, 0.4):
        got = np.sum(taps * np.exp(-2j * np.pi * frequency * place))
        # The band limit ripples by 1e-4; the trapezoid errs by (2 pi cutoff / fine)^2 / 12: 7e-5.
        assert got == pytest.approx(1 / (1 + 1j * frequency / cutoff), abs=2e-4)


def test_a_brick_wall_passes_what_is_below_and_nothing_above(held):
    index = np.arange(N)
    beat = np.sqrt(1 + 0.5 * np.cos(2 * np.pi * 0.01 * index) + 0.3 * np.cos(np.pi * 0.2 * index))
    view = sensor_view(held(beat), video_bandwidth_hz=50e3, shape="brick_wall", loops=True)
    got = np.abs(samples_of(view)) ** 2
    # 80 dB of rejection and float32: 1e-4 of the beat.
    assert got == pytest.approx(1 + 0.5 * np.cos(2 * np.pi * 0.01 * index), abs=1e-4)


@pytest.mark.parametrize("shape", ["one_pole", "brick_wall"])
def test_the_mean_stays_and_the_peaks_go(held, noise, shape):
    reading = measure_by_sensor(held(noise), video_bandwidth_hz=50e3, shape=shape, loops=True)
    assert reading.sensor.mean == reading.signal.mean
    assert reading.shortfall_db(1e-2) > 0.5
    assert reading.shortfall_db(1e-3) > reading.shortfall_db(1e-2)
    assert reading.peak_shortfall_db > 1


def test_wide_enough_is_as_good_as_none(held, noise):
    # Power of a signal a quarter wide reaches to a quarter of the rate.
    reading = measure_by_sensor(
        held(noise), video_bandwidth_hz=300e3, shape="brick_wall", loops=True
    )
    assert reading.shortfall_db(1e-2) == pytest.approx(0, abs=1e-3)
    assert reading.peak_shortfall_db == pytest.approx(0, abs=1e-3)


def test_the_ends_of_a_record_are_cut_off(held, noise):
    loop = sensor_view(held(noise), video_bandwidth_hz=20e3, loops=True)
    record = sensor_view(held(noise), video_bandwidth_hz=20e3, loops=False)
    whole, cut = samples_of(loop), samples_of(record)
    assert cut.size < whole.size
    first = int(np.flatnonzero(whole == cut[0])[0])
    assert cut.tobytes() == whole[first : first + cut.size].tobytes()
    step = np.concatenate([noise, 100 * noise])  # whose seam would be seen
    ends = samples_of(sensor_view(held(step), video_bandwidth_hz=20e3, loops=False))
    assert np.abs(ends[:1000]).max() < 3


def test_a_sensor_samples_at_its_own_rate(held, noise):
    for rate_hz in (Fraction(100_000), Fraction(333_333), Fraction(1_000_000, 7)):
        picked = Picked.of(held(noise), rate_hz)
        ratio = Fraction(10**6) / rate_hz
        want = noise[[int(k * ratio) for k in range(picked.n_samples)]]
        got = samples_of(picked)
        assert got.tobytes() == want.tobytes()
        for low, high in ((0, 1), (17, 400), (picked.n_samples - 3, picked.n_samples)):
            part = evaluate({picked: (low, high)})[picked]
            assert part.tobytes() == got[low:high].tobytes()
        assert picked.sample_rate_hz == rate_hz


def test_view_without_limits_is_the_signal_itself(held, noise):
    signal = held(noise)
    assert sensor_view(signal, loops=True) is signal
    assert sensor_view(signal, sensor_rate_hz=Fraction(10**6), loops=True) is signal
    slow = sensor_view(signal, sensor_rate_hz=Fraction(10**5), loops=True)
    assert slow.n_samples == N // 10


@pytest.mark.parametrize("shape", ["one_pole", "brick_wall"])
@pytest.mark.parametrize("width_hz", [0.0, -1.0, 0.6e6, float("nan")])
def test_a_bandwidth_out_of_reach_is_refused(held, noise, shape, width_hz):
    with pytest.raises(ArgumentsError) as caught:
        sensor_view(held(noise), video_bandwidth_hz=width_hz, shape=shape, loops=True)
    assert caught.value.where == "video bandwidth"


def test_a_rate_out_of_reach_is_refused(held, noise):
    for rate_hz in (Fraction(0), Fraction(2 * 10**6)):
        with pytest.raises(ArgumentsError) as caught:
            sensor_view(held(noise), sensor_rate_hz=rate_hz, loops=True)
        assert caught.value.where == "sensor rate"


def test_a_record_shorter_than_the_filter_is_told(held, noise):
    with pytest.raises(SignalError):
        sensor_view(held(noise[:500]), video_bandwidth_hz=100.0, loops=False)


def test_variance_that_is_left():
    assert [variance_left(part) for part in (0, 0.1, 1, 2)] == pytest.approx([0, 0.19, 1, 1])


def test_statistics_are_those_of_the_filtered_power(held, noise):
    view = sensor_view(held(noise), video_bandwidth_hz=40e3, loops=True)
    reading = measure_by_sensor(held(noise), video_bandwidth_hz=40e3, loops=True)
    assert reading.sensor.counts.tolist() == measure_samples(samples_of(view)).counts.tolist()
