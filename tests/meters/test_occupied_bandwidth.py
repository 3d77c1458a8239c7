import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.meters.occupied_bandwidth import occupied_bandwidth
from wavegen.meters.spectrum import spectrum_of


def flat(band, n=1 << 15):
    """A loop whose lines inside a band, cycles per sample, have equal power."""
    frequency = np.fft.fftfreq(n)
    is_in = (frequency >= band[0]) & (frequency < band[1])
    phases = np.exp(2j * np.pi * np.random.default_rng(1).random(n))
    return np.fft.ifft(np.where(is_in, phases, 0)).astype(np.complex64)


@pytest.mark.parametrize("band", [(-0.125, 0.125), (0.05, 0.25), (-0.4, -0.3)])
def test_a_flat_block_occupies_99_percent_of_its_width(band) -> None:
    """Tolerance: half a bin of 1/2048."""
    found = occupied_bandwidth(spectrum_of(flat(band), sample_rate_hz=1.0, n_fft=2048))
    width = band[1] - band[0]
    assert found.width_hz == pytest.approx(0.99 * width, abs=0.5 / 2048)
    assert found.low_hz == pytest.approx(band[0] + 0.005 * width, abs=0.5 / 2048)
    assert dict(found.rows())["occupied bandwidth (99 %)"].endswith("Hz")
    assert len(found.table().rows) == 3


def test_one_carrier_of_two() -> None:
    samples = flat((-0.3, -0.2)) + 3 * flat((0.1, 0.2))
    spectrum = spectrum_of(samples, sample_rate_hz=1.0, n_fft=2048)
    both = occupied_bandwidth(spectrum)
    assert both.width_hz > 0.4
    lower = occupied_bandwidth(spectrum, low_hz=-0.4, high_hz=0.0)
    assert lower.width_hz == pytest.approx(0.099, abs=0.5 / 2048)
    narrower = occupied_bandwidth(spectrum, low_hz=-0.4, high_hz=0.0, share=0.5)
    assert narrower.width_hz == pytest.approx(0.05, rel=0.02)


def test_a_part_outside_the_rate_is_refused() -> None:
    spectrum = spectrum_of(flat((-0.1, 0.1)), sample_rate_hz=1.0)
    with pytest.raises(SignalError):
        occupied_bandwidth(spectrum, low_hz=-0.6)
