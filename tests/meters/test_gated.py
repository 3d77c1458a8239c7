import pickle

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render
from wavegen.dsp.bursts import Bursts
from wavegen.meters.gated import GatedPowerMeter
from wavegen.meters.power import measure_samples

N = 12_000
BURSTS = Bursts(period_samples=3000, runs=((500, 1200), (2700, 3300)), ramp_samples=40)


def read(held, samples, bursts=BURSTS, **options):
    signal = held(samples)
    tap = Tap(name="on", signal=signal, meter=GatedPowerMeter(bursts=bursts))
    return render(signal, taps=(tap,), **options)["on"]


@pytest.fixture
def samples(band_noise):
    noise = band_noise(4, N, 0.5)
    noise[600:620] = 0  # true zeros while on
    return noise


def test_it_is_the_power_meter_on_what_is_fully_on(held, samples):
    is_on = BURSTS.is_on(0, N)
    samples[~is_on] *= 50  # what is off must not count, whatever it is
    got, want = read(held, samples), measure_samples(samples[is_on])
    assert (got.n_samples, got.n_zeros) == (want.n_samples, want.n_zeros) == (is_on.sum(), 20)
    assert got.mean == pytest.approx(want.mean, rel=1e-13)  # another order of adding
    assert (got.peak, got.least) == (want.peak, want.least)
    assert got.counts.tolist() == want.counts.tolist()
    assert got.edges.tolist() == want.edges.tolist()
    assert got.level_db([0.1, 0.01]) == pytest.approx(want.level_db([0.1, 0.01]), abs=1e-9)
    assert got.ccdf([-90.0, 0.0, 3.0]) == pytest.approx(want.ccdf([-90.0, 0.0, 3.0]), abs=1e-12)


def test_places_are_those_of_the_signal(held, samples):
    samples[6800] = 30
    assert BURSTS.is_on(6800, 6801).all()
    got = read(held, samples)
    assert (got.start, got.peak_index) == (0, 6800)
    assert np.argmax(got.cell_maxima) == 6800 // 1024


def test_strips_and_workers_change_no_bit(held, samples):
    whole = read(held, samples)
    for strip, workers in ((331, 1), (1024, 2), (5000, 3)):
        got = read(held, samples, strip_samples=strip, workers=workers)
        assert (got.mean, got.n_samples, got.n_zeros) == (
            whole.mean,
            whole.n_samples,
            whole.n_zeros,
        )
        assert got.peak_index == whole.peak_index
        assert got.counts.tolist() == whole.counts.tolist()
        assert got.cell_maxima.tolist() == whole.cell_maxima.tolist()


def test_samples_are_not_changed(held, samples):
    before = samples.tobytes()
    reading = GatedPowerMeter(bursts=BURSTS).begin(held(samples))
    samples.flags.writeable = False
    reading.feed(0, samples)
    assert samples.tobytes() == before


def test_what_is_off_may_be_anything(held, samples):
    samples[~BURSTS.is_on(0, N)] = np.nan
    assert np.isfinite(read(held, samples).mean)
    samples[700] = np.inf
    with pytest.raises(SignalError, match="sample 700"):
        read(held, samples)


def test_nothing_on_is_told(held):
    with pytest.raises(SignalError):
        read(held, np.ones(400), Bursts(period_samples=400, runs=((10, 20),), ramp_samples=5))


def test_a_worker_gets_the_same_meter():
    meter = GatedPowerMeter(bursts=BURSTS)
    assert pickle.loads(pickle.dumps(meter)) == meter  # noqa: S301 - our own bytes
