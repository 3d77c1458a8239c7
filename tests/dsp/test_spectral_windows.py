import numpy as np
import pytest

from wavegen.dsp.spectral_windows import (
    KAISER_BETA,
    WINDOW_NAMES,
    noise_bandwidth_bins,
    spectral_window,
)

SIDE_LOBES_DB = {"kaiser": -122, "blackman_harris": -92, "hann": -31.4, "rectangular": -13.2}


@pytest.mark.parametrize("name", WINDOW_NAMES)
def test_side_lobes(name) -> None:
    """Highest response beyond the first minimum; figures as the docstring states them."""
    padded = np.abs(np.fft.fft(spectral_window(name, 256), 256 * 64))[: 128 * 64]
    response = 20 * np.log10(padded / padded[0] + 1e-12)
    first_null = int(np.argmax(np.diff(response) > 0))
    assert response[first_null:].max() == pytest.approx(SIDE_LOBES_DB[name], abs=0.5)


@pytest.mark.parametrize(("name", "bins"), [("hann", 1.5), ("rectangular", 1.0)])
def test_noise_bandwidth(name, bins) -> None:
    assert noise_bandwidth_bins(spectral_window(name, 512)) == pytest.approx(bins, abs=1e-9)


def test_kaiser_reaches_as_stated() -> None:
    assert np.sqrt(1 + (KAISER_BETA / np.pi) ** 2) == pytest.approx(5.2, abs=0.05)
    assert noise_bandwidth_bins(spectral_window("kaiser", 4096)) == pytest.approx(2.3, abs=0.01)


def test_five_sixths_of_overlap_weigh_samples_alike() -> None:
    square = spectral_window("kaiser", 6 * 128) ** 2
    weights = square.reshape(6, -1).sum(axis=0)
    assert weights.min() / weights.max() > 0.99
