"""The peak between samples against a zero-padded transform of the whole loop."""

import numpy as np
import pytest
import scipy.fft

from wavegen.core.render import Tap, render
from wavegen.meters import peak
from wavegen.meters.peak import HALF_LENGTH, peak_between_samples
from wavegen.meters.power import PowerMeter, measure_samples


def by_transform(samples, points=16):
    """Largest power and its place, by padding the spectrum of the loop to 16 times its length."""
    n = samples.size
    spectrum = scipy.fft.fft(samples.astype(np.complex128))
    padded = np.zeros(points * n, np.complex128)
    half = n // 2
    padded[:half], padded[-half:] = spectrum[:half], spectrum[-half:]
    power = np.abs(scipy.fft.ifft(padded) * points) ** 2
    return power.max(), np.argmax(power) / points


def search(held, samples, **options):
    return peak_between_samples(held(samples), measure_samples(samples), **options)


# The window suppresses by 118 dB: 1.3e-6 of amplitude, 1.1e-5 dB; samples are float32.
TOLERANCE_DB = 5e-5


@pytest.mark.parametrize("fraction", [0.9, 0.8, 0.5, 0.25])
@pytest.mark.parametrize("seed", range(6))
def test_gaussian_against_the_transform(held, band_noise, fraction, seed):
    samples = band_noise(seed, 1 << 14, fraction)
    found = search(held, samples)
    power, position = by_transform(samples)
    assert 10 * np.log10(found.power / power) == pytest.approx(0, abs=TOLERANCE_DB)
    assert found.position_samples == position
    assert found.gained_db == pytest.approx(10 * np.log10(found.power / found.sample_peak))


def ofdm(seed, n_subcarriers, n_fft, n_symbols):
    """Symbols of QPSK subcarriers, one after the other, made cyclic by one filter."""
    rng = np.random.default_rng(seed)
    grid = np.zeros((n_symbols, n_fft), np.complex128)
    half = n_subcarriers // 2
    used = [*range(-half, 0), *range(1, half + 1)]
    grid[:, used] = rng.choice([1, 1j, -1, -1j], (n_symbols, n_subcarriers))
    samples = scipy.fft.ifft(grid, axis=1).ravel()
    spectrum = scipy.fft.fft(samples)
    frequency = np.abs(scipy.fft.fftfreq(samples.size))
    spectrum[frequency > n_subcarriers / n_fft / 2 * 1.02] = 0
    return scipy.fft.ifft(spectrum).astype(np.complex64)


@pytest.mark.parametrize("n_subcarriers", [408, 256, 128])
def test_ofdm_at_three_oversamplings(held, n_subcarriers):
    samples = ofdm(n_subcarriers, n_subcarriers, 512, 40)
    found = search(held, samples)
    power, position = by_transform(samples)
    assert 10 * np.log10(found.power / power) == pytest.approx(0, abs=TOLERANCE_DB)
    assert found.position_samples == position


def test_peak_across_the_seam(held, band_noise):
    samples = band_noise(3, 5000, 0.6)
    expected = search(held, samples)
    inside = int(expected.position_samples)
    rolled = np.roll(samples, -inside - 1)  # the peak now lies after the last sample
    found = search(held, rolled)
    assert found.power == pytest.approx(expected.power, rel=1e-6)
    assert 4999 < found.position_samples < 5000
    assert search(held, rolled, loops=False).power < found.power


def test_peak_after_the_last_sample_that_only_the_first_announces(held):
    # A pulse 0.35 of a sample before the first: the last sample, 5.6 dB under its crest, and
    # all others of the last cell would not call for a search.
    n = 4096
    place = (np.arange(n) + n // 2) % n - n // 2
    samples = np.sinc(0.9 * (place + 0.35)) * np.exp(-(((place + 0.35) / 40) ** 2))
    found = search(held, samples)
    assert n - 1 < found.position_samples < n
    # The grid of sixteenths misses the crest by 0.025 of a sample.
    assert found.power == pytest.approx(np.sinc(0.9 * 0.025) ** 2, rel=1e-4)


def test_crest_far_above_its_nearest_samples(held):
    # cos(pi 0.58 t) under a bell, its crest halfway: the nearest samples are 4.3 dB lower,
    # 3.0 dB under the largest sample of the record, which stands beside a lesser crest.
    time = np.arange(2048) - 1000.5
    samples = np.cos(np.pi * 0.58 * time) * np.exp(-((time / 4) ** 2) / 2)
    found = search(held, samples)
    assert found.position_samples == 1000.5
    assert found.power == pytest.approx(1, rel=1e-4)


def test_recording_stays_inside(held):
    # A carrier that begins and ends: read as a loop it would ring at the seam.
    samples = np.exp(2j * np.pi * 0.1234567 * np.arange(3001)).astype(np.complex64)
    assert search(held, samples).gained_db > 0.1
    found = search(held, samples, loops=False)
    assert found.gained_db < 1e-4
    position = found.position_samples
    assert position == int(position) or HALF_LENGTH <= position <= 3001 - HALF_LENGTH


def test_recording_shorter_than_the_filter(held):
    samples = np.array([1, 2, 3, 2j, 1], np.complex64)
    found = search(held, samples, loops=False)
    assert found.power == found.sample_peak == 9
    assert found.position_samples == 2


def test_part_of_a_recording_keeps_its_own_axis(held, band_noise):
    samples = band_noise(9, 40_000, 0.7)
    reading = PowerMeter().begin(None)
    reading.feed(10_001, samples[10_001:30_000])
    found = peak_between_samples(held(samples), reading.result(), loops=False)
    alone = search(held, samples[10_001:30_000], loops=False)
    assert found.power == alone.power
    assert found.position_samples == 10_001 + alone.position_samples


def test_carrier(held):
    n = np.arange(20_000)
    samples = np.exp(2j * np.pi * n * 3457 / 20_000).astype(np.complex64)
    assert search(held, samples).gained_db == pytest.approx(0, abs=2e-5)


@pytest.mark.parametrize("n", [1, 2, 16, 100, 1000])
def test_loops_shorter_than_the_filter(held, n):
    # A constant is a constant, however short the loop.
    found = search(held, np.full(n, 0.5 + 0.5j))
    assert found.power == pytest.approx(0.5, rel=1e-5)
    assert found.gained_db >= 0


def test_single_impulse(held):
    # A sample alone is the peak of its own sinc: nothing is higher between samples.
    samples = np.zeros(10_000, np.complex64)
    samples[4444] = 3
    found = search(held, samples)
    assert found.power == found.sample_peak == 9
    assert found.position_samples == 4444
    assert found.gained_db == 0


@pytest.mark.parametrize("scale", [1e-25, 1e-10, 1e10, 1e25])
def test_any_scale(held, band_noise, scale):
    samples = band_noise(2, 4000, 0.5)
    one = search(held, samples)
    other = search(held, samples * scale)
    assert other.gained_db == pytest.approx(one.gained_db, abs=1e-5)
    assert other.power == pytest.approx(one.power * scale**2, rel=1e-5)


def test_strips_and_workers_do_not_matter(held, band_noise):
    signal = held(band_noise(4, 200_000, 0.8))
    found = {
        peak_between_samples(
            signal,
            render(
                signal,
                taps=(Tap(name="p", signal=signal, meter=PowerMeter()),),
                strip_samples=strip,
                workers=workers,
            )["p"],
        )
        for strip, workers in ((200_000, 1), (1 << 16, 2), (7777, 2))
    }
    assert len(found) == 1


def test_constant_envelopes_are_searched_in_part(held, monkeypatch):
    # 2^19 samples on one circle: every place is a candidate; far too many to interpolate.
    rng = np.random.default_rng(1)
    turns = np.cumsum(np.repeat(rng.choice([-1, 1], 1 << 17), 4)) / 16
    samples = np.exp(2j * np.pi * turns).astype(np.complex64)
    interpolated = 0
    real = peak._interpolate

    def count(samples, places, points):
        nonlocal interpolated
        interpolated += places.size
        return real(samples, places, points)

    monkeypatch.setattr(peak, "_interpolate", count)
    found = search(held, samples)
    assert 0 < interpolated <= (1 << 19) // 65536 * (256 + 32)
    # The corners of the phase overshoot; the best of them is found to a hundredth of a dB.
    whole = by_transform(samples[: 1 << 16])[0]
    assert 10 * np.log10(found.power / whole) > -0.01


def test_nothing_below_the_largest_sample(held):
    rng = np.random.default_rng(8)
    for _ in range(20):
        samples = (rng.standard_normal(300) + 1j * rng.standard_normal(300)).astype(np.complex64)
        found = search(held, samples)
        assert found.power >= found.sample_peak
        assert found.gained_db >= 0


@pytest.mark.parametrize("fraction", [0.05, 0.25, 0.5, 0.9])
@pytest.mark.parametrize("offset", [0.0, 0.3125, 0.5])
def test_filled_fraction_of_a_band(held, band_noise, fraction, offset):
    n = 1 << 16
    samples = band_noise(4, n, fraction) * np.exp(2j * np.pi * offset * np.arange(n))
    signal = held(samples.astype(np.complex64))
    found = peak.filled_fraction(signal, measure_samples(samples.astype(np.complex64)))
    # A stretch of 4096 samples spreads an edge by the window's main lobe, 8 bins each side.
    assert fraction - 0.002 <= found <= fraction + 16 / 4096 + 0.002


def test_a_short_wide_burst_at_the_crest_counts(held, band_noise):
    n = 1 << 18
    samples = band_noise(4, n, 0.05)
    samples[100_000:104_000] += 4 * band_noise(5, 4000, 0.9)
    samples = samples.astype(np.complex64)
    statistics = measure_samples(samples)
    assert peak.filled_fraction(held(samples), statistics) > 0.85
    found = peak_between_samples(held(samples), statistics)
    assert found.power == pytest.approx(by_transform(samples)[0], rel=2e-3)  # its edges fill all


def test_the_search_is_as_deep_as_the_band_asks():
    assert peak.searched_db(1.0) == peak.SEARCHED_DB
    assert peak.searched_db(0.5) == pytest.approx(3.0103 + peak.MARGIN_DB, abs=1e-4)
    assert peak.searched_db(0.125) == pytest.approx(0.1685 + peak.MARGIN_DB, abs=1e-4)
