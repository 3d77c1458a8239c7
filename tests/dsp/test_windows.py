import numpy as np
import pytest
import scipy.signal

from wavegen.dsp.windows import (
    design_bandpass,
    design_lowpass,
    kaiser_beta,
    kaiser_half_length,
    kaiser_transition,
    kaiser_window,
)


@pytest.mark.parametrize("stopband_db", [30.0, 60.0, 100.0, 120.0])
def test_kaiser_parameter_and_length_are_those_of_another_implementation(stopband_db):
    assert kaiser_beta(stopband_db) == pytest.approx(scipy.signal.kaiser_beta(stopband_db), abs=0)
    taps, _ = scipy.signal.kaiserord(stopband_db, 2 * 0.013)  # of half the rate; odd or even count
    half = kaiser_half_length(transition=0.013, stopband_db=stopband_db)
    assert abs(2 * half + 1 - taps) <= 2


def test_window_is_that_of_another_implementation():
    expected = scipy.signal.windows.kaiser(2 * 50 + 1, 9.0)
    np.testing.assert_allclose(kaiser_window(50, 9.0), expected, rtol=1e-12)


def test_transition_and_half_length_are_inverse():
    assert kaiser_half_length(transition=kaiser_transition(half_length=500) * 1.000001) == 500


def response_db(taps, n=1 << 16):
    gain = np.abs(np.fft.fft(taps, n))
    return np.fft.fftfreq(n), 20 * np.log10(np.maximum(gain, 1e-12))


@pytest.mark.parametrize("stopband_db", [60.0, 80.0, 100.0])
def test_lowpass_is_flat_inside_and_as_far_down_as_stated_outside(stopband_db):
    taps = design_lowpass(passband_edge=0.10, stopband_edge=0.12, stopband_db=stopband_db)
    frequency, level = response_db(taps)
    assert level[np.abs(frequency) >= 0.12].max() < -stopband_db
    # A window makes passband and stopband ripple alike; the gain at zero, set to 1, ripples too.
    ripple = 20 * np.log10(1 + 10 ** (-stopband_db / 20))
    assert np.abs(level[np.abs(frequency) <= 0.10]).max() < 2 * ripple
    assert level[np.argmin(np.abs(frequency - 0.11))] == pytest.approx(-6.02, abs=0.1)


def test_bandpass_passes_one_side_only():
    taps = design_bandpass(centre=-0.2, passband_width=0.05, stopband_width=0.07, stopband_db=80.0)
    frequency, level = response_db(taps)
    inside = np.abs(frequency + 0.2) <= 0.025
    assert np.abs(level[inside]).max() < 0.01
    assert level[np.abs(frequency + 0.2) >= 0.035].max() < -80
    np.testing.assert_allclose(taps, taps[::-1].conj(), atol=1e-15)
