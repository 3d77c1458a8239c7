import pickle

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render
from wavegen.meters import METERS
from wavegen.meters.mean import MeanMeter
from wavegen.meters.power import PowerMeter, measure_samples


def gaussian(seed, n, scale=1.0):
    rng = np.random.default_rng(seed)
    noise = rng.standard_normal(n) + 1j * rng.standard_normal(n)
    return (noise * (scale * 2**-0.5)).astype(np.complex64)


def test_is_in_the_table():
    assert METERS.load("power") is PowerMeter


def test_figures_against_plain_arithmetic():
    samples = gaussian(1, 300_000, 0.3)
    power = np.abs(samples.astype(np.complex128)) ** 2
    found = measure_samples(samples)
    assert found.n_samples == 300_000
    assert found.n_zeros == 0
    assert found.mean == pytest.approx(power.mean(), rel=1e-7)
    assert found.mean_db == pytest.approx(10 * np.log10(power.mean()), abs=1e-6)
    assert found.peak_db == pytest.approx(10 * np.log10(power.max()), abs=1e-6)
    assert found.papr_db == pytest.approx(10 * np.log10(power.max() / power.mean()), abs=1e-6)
    assert found.peak_index == np.argmax(power)
    assert found.least == pytest.approx(power.min(), rel=1e-6)
    grid = np.arange(-30, 13, 0.37)
    exact = [np.count_nonzero(power > power.mean() * 10 ** (level / 10)) for level in grid]
    # Inside a bin of 0.0085 dB the count is interpolated: a few of the samples in that bin.
    in_bin = 0.0085 * 300_000 * 0.09
    np.testing.assert_allclose(found.exceedances(grid), exact, atol=in_bin / 2)
    np.testing.assert_allclose(found.cdf(grid) + found.ccdf(grid), 1)


@pytest.mark.parametrize("scale", [1e-25, 1e-15, 2.0**-40, 0.03, 1, 1000, 1e15, 1e25])
def test_any_scale(scale):
    samples = gaussian(5, 30_000)
    one, other = measure_samples(samples), measure_samples((samples * scale).astype(np.complex64))
    assert other.mean_db == pytest.approx(one.mean_db + 20 * np.log10(scale), abs=1e-5)
    assert other.papr_db == pytest.approx(one.papr_db, abs=1e-5)
    grid = np.arange(-20, 12, 0.25)
    np.testing.assert_allclose(other.ccdf(grid), one.ccdf(grid), atol=0.0085 * 0.1)


def test_sample_that_is_not_finite_is_named(held):
    samples = gaussian(12, 5000)
    samples[4321] = np.nan
    with pytest.raises(SignalError) as caught:
        render(
            held(samples),
            taps=(Tap(name="p", signal=held(samples), meter=PowerMeter(where="field.iq")),),
            strip_samples=1500,
        )
    assert caught.value.where == "field.iq"
    assert "sample 4321 " in caught.value.problem


def test_silence_and_nothing():
    with pytest.raises(SignalError, match="all 10 samples are exactly zero"):
        measure_samples(np.zeros(10, np.complex64))
    with pytest.raises(SignalError, match="no samples"):
        measure_samples(np.zeros(0, np.complex64))


def same(one, other):
    for name in ("n_samples", "n_zeros", "mean", "peak", "peak_index", "least", "start"):
        assert getattr(one, name) == getattr(other, name), name
    for name in ("counts", "edges", "top_powers", "top_counts", "cell_maxima"):
        np.testing.assert_array_equal(getattr(one, name), getattr(other, name), name)


@pytest.mark.parametrize("workers", [1, 2])
@pytest.mark.parametrize("strip", [1 << 14, 5003, 777, 100_000])
def test_strips_and_workers_do_not_matter(held, band_noise, strip, workers):
    signal = held(band_noise(13, 50_021, 0.4))
    taps = (
        Tap(name="power", signal=signal, meter=PowerMeter()),
        Tap(name="mean", signal=signal, meter=MeanMeter()),
    )
    whole = render(signal, taps=taps, strip_samples=50_021)
    cut = render(signal, taps=taps, strip_samples=strip, workers=workers)
    same(cut["power"], whole["power"])
    assert cut["mean"] == whole["mean"] == whole["power"].mean


def test_part_of_a_recording_starts_anywhere():
    samples = gaussian(14, 10_000)
    reading = PowerMeter().begin(None)
    reading.feed(12_345, samples)
    found = reading.result()
    assert found.start == 12_345
    assert found.peak_index == 12_345 + np.argmax(np.abs(samples))
    power = np.abs(samples.astype(np.complex128)) ** 2
    # The grid is absolute: the first cell ends at sample 13312.
    assert found.cell_maxima[0] == pytest.approx(power[: 13312 - 12345].max(), rel=1e-6)
    assert found.cell_maxima.size == 22345 // 1024 - 12345 // 1024 + 1


def test_empty_readings_change_nothing():
    samples = gaussian(15, 3000)
    first, empty, second = (PowerMeter().begin(None) for _ in range(3))
    first.feed(0, samples[:1000])
    second.feed(1000, samples[1000:])
    first.merge(empty)
    empty.merge(first)
    empty.feed(1000, samples[1000:1000])
    empty.merge(second)
    same(empty.result(), measure_samples(samples))


def test_reading_crosses_process_borders():
    reading = PowerMeter().begin(None)
    reading.feed(0, gaussian(16, 5000))
    again = pickle.loads(pickle.dumps(reading))  # noqa: S301
    same(again.result(), reading.result())
