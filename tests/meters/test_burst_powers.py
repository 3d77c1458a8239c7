import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render, samples_of
from wavegen.dsp.bursts import Bursts
from wavegen.meters.burst_powers import BurstPowerMeter, Levelled
from wavegen.meters.gated import GatedPowerMeter

N = 20_000
RUNS = ((500, 1700), (3000, 3090), (4096, 8192), (9000, 9010), (19_500, 20_300))
BURSTS = Bursts(period_samples=N, runs=RUNS, ramp_samples=10)


def read(signal, bursts=BURSTS, **options):
    tap = Tap(name="bursts", signal=signal, meter=BurstPowerMeter(bursts=bursts))
    return render(signal, taps=(tap,), **options)["bursts"]


@pytest.fixture
def samples(band_noise):
    noise = band_noise(11, N, 0.5)
    noise[3000:3090] *= 0.1
    return noise


def test_each_burst_by_itself(held, samples):
    samples[:490] *= 7  # the last burst goes on past the seam
    got = read(held(samples))
    around = np.concatenate([samples, samples]).astype(np.complex128)
    kept = [(start, stop) for start, stop in RUNS if stop - start > 20]
    assert list(zip(got.start_sample, got.stop_sample, strict=True)) == kept
    for k, (start, stop) in enumerate(kept):
        power = np.abs(around[start + 10 : stop - 10]) ** 2
        assert got.n_samples[k] == power.size
        assert got.mean[k] == pytest.approx(power.mean(), rel=1e-6)
        assert got.peak[k] == pytest.approx(power.max(), rel=1e-6)
        papr_db = 10 * np.log10(power.max() / power.mean())
        assert got.papr_db[k] == pytest.approx(papr_db, abs=1e-5)


def test_strips_and_workers_change_no_bit(held, samples):
    whole = read(held(samples))
    for strip, workers in ((37, 1), (513, 2), (1024, 1), (4000, 3), (9999, 2)):
        got = read(held(samples), strip_samples=strip, workers=workers)
        assert got.mean.tolist() == whole.mean.tolist()
        assert got.peak.tolist() == whole.peak.tolist()
        assert got.n_samples.tolist() == whole.n_samples.tolist()


def test_a_period_is_unrolled(held, samples):
    got = read(held(samples), Bursts(period_samples=1000, runs=((100, 400),)))
    power = np.abs(samples.astype(np.complex128)).reshape(-1, 1000)[:, 100:400] ** 2
    assert got.mean == pytest.approx(power.mean(axis=1), rel=1e-6)


def test_bursts_that_share_a_level(held, samples):
    got = read(held(samples))
    assert [group.tolist() for group in got.levels()] == [[0, 2, 3], [1]]
    assert len(got.levels(gap_db=25.0)) == 1


def test_levelled_bursts_all_have_a_mean_of_one(held, samples):
    signal = held(samples)
    levelled = Levelled.of(signal, BURSTS, read(signal))
    again = read(levelled)
    assert again.mean == pytest.approx(1, rel=1e-6)
    whole = samples_of(levelled)
    assert np.count_nonzero(whole) == again.n_samples.sum()
    tap = Tap(name="on", signal=levelled, meter=GatedPowerMeter(bursts=BURSTS))
    assert render(levelled, taps=(tap,))["on"].mean == pytest.approx(1, rel=1e-6)


def test_what_is_off_may_be_anything(held, samples):
    samples[100] = samples[2000] = np.nan
    with pytest.raises(SignalError, match="sample 100"):  # on, past the seam
        read(held(samples))
    samples[100] = 1
    assert np.isfinite(read(held(samples)).mean).all()


def test_nothing_on_is_told(held, samples):
    with pytest.raises(SignalError, match="fully on"):
        read(held(samples), Bursts(period_samples=N, runs=((0, 10),), ramp_samples=5))
