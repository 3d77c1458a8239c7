import numpy as np
import pytest
import scipy.fft

from wavegen.meters.peak import peak_between_samples
from wavegen.meters.power import measure_samples
from wavegen.meters.rails import rail_peaks


def by_transform(rail, points=16):
    """Largest square of a rail, by padding the spectrum of the loop to 16 times its length."""
    n = rail.size
    spectrum = scipy.fft.fft(rail.astype(np.float64))
    padded = np.zeros(points * n, np.complex128)
    padded[: n // 2], padded[-(n // 2) :] = spectrum[: n // 2], spectrum[-(n // 2) :]
    return float(np.max((scipy.fft.ifft(padded) * points).real ** 2))


@pytest.mark.parametrize("fraction", [0.9, 0.5, 0.2])
@pytest.mark.parametrize("seed", range(3))
def test_noise_against_the_transform(held, band_noise, fraction, seed):
    samples = band_noise(seed, 1 << 14, fraction)
    found = rail_peaks(held(samples), measure_samples(samples))
    assert found.i == pytest.approx(by_transform(samples.real), rel=2e-5)
    assert found.q == pytest.approx(by_transform(samples.imag), rel=2e-5)
    envelope = peak_between_samples(held(samples), measure_samples(samples)).power
    assert found.largest <= envelope * (1 + 1e-6)


def test_a_carrier_has_full_rails_and_an_envelope_no_higher(held):
    samples = np.exp(2j * np.pi * (np.arange(4096) + 0.5) / 8).astype(np.complex64)
    found = rail_peaks(held(samples), measure_samples(samples))
    # Samples lie at odd sixteenths of a turn: the rails' crests stand between them.
    assert np.max(samples.real**2) == pytest.approx(np.cos(np.pi / 8) ** 2, rel=1e-6)
    assert found.i == pytest.approx(1.0, rel=1e-5)
    assert found.q == pytest.approx(1.0, rel=1e-5)


def test_an_empty_rail(held):
    samples = np.cos(2 * np.pi * np.arange(1000) / 10).astype(np.complex64)
    found = rail_peaks(held(samples), measure_samples(samples))
    assert (found.q, found.largest) == (0.0, found.i)


def test_a_crest_in_the_last_cell(held, band_noise):
    samples = band_noise(1, 5000, 0.25)
    samples[4990] *= 3
    found = rail_peaks(held(samples), measure_samples(samples), loops=False)
    assert found.largest >= max(samples[4990].real ** 2, samples[4990].imag ** 2) * (1 - 1e-6)
