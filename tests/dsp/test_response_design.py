import numpy as np
import pytest

from wavegen.dsp.occupied_bands import Band
from wavegen.dsp.response_design import derivative_taps, fit_response, smooth_step


def spectrum(taps, n=1 << 13):
    half = taps.size // 2
    placed = np.zeros(n, np.complex128)
    placed[np.arange(-half, half + 1)] = taps
    return np.fft.fftfreq(n), np.fft.fft(placed)


def hold(place):
    return np.log(np.sinc(place)).astype(np.complex128)


def skewed(place):
    """A slope, a ripple and a turn."""
    return 0.8 * place + 0.1 * np.cos(20 * place) + 2j * np.sin(5 * place)


@pytest.mark.parametrize(
    ("response", "band"),
    [(hold, Band(-0.45, 0.45)), (skewed, Band(-0.4, 0.3)), (skewed, Band(0.1, 0.2))],
)
@pytest.mark.parametrize("tolerance", [1e-3, 1e-6])
def test_the_response_is_followed_inside_the_band(response, band, tolerance):
    fit = fit_response(response, band, tolerance=tolerance, longest=1 << 11)
    place, got = spectrum(fit.taps)
    inside = (place >= band.low) & (place <= band.high)
    error = np.abs(got[inside] / np.exp(response(place[inside])) - 1).max()
    assert error <= 1.05 * fit.error  # seen on another grid
    assert fit.error <= tolerance
    assert np.abs(got).max() < 1.05 * np.exp(response(np.linspace(-0.6, 0.6, 999)).real).max()


def test_an_even_response_has_real_even_taps():
    taps = fit_response(hold, Band(-0.4, 0.4), tolerance=1e-4, longest=256).taps
    assert taps.dtype == np.float64
    np.testing.assert_allclose(taps, taps[::-1], atol=1e-15)


def test_the_longest_filter_is_given_with_its_error():
    fit = fit_response(
        lambda place: 1j * 200 * np.abs(place), Band(-0.4, 0.4), tolerance=1e-9, longest=32
    )
    assert fit.taps.size == 65
    assert fit.error > 1e-3


@pytest.mark.parametrize("order", [1, 2])
def test_derivatives(order):
    taps = derivative_taps(order, 256, passband=0.45)
    place, got = spectrum(taps)
    inside = np.abs(place) <= 0.45
    want = (2j * np.pi * place[inside]) ** order
    # 1.3e-5 of the second derivative at 256 taps, which is 8 at the edge.
    assert np.abs(got[inside] - want).max() < 2e-5
    assert abs(got[np.abs(place) == 0.5]).max() < 1e-3


def test_smooth_step():
    values = smooth_step(np.linspace(-0.5, 1.5, 2001))
    assert np.diff(values).min() >= 0
    np.testing.assert_allclose(values + values[::-1], 1.0, atol=1e-15)
