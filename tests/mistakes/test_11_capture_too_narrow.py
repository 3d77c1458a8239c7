"""Mistake: the output of a device captured through a filter narrower than what it makes.

Size: the gain of an amplifier driven 6 dB back reads 1.5 dB wrong where the capture is as wide as
the signal, 0.7 dB at 1.5 times, 0.02 dB at 3 times (own computation: noise through a Rapp curve).
Remedy: the bandwidth of the capture stands beside that of the signal, and below three times it is
said that the assumption fails.
"""

import numpy as np
import pytest

from wavegen.comparison.device_gain import device_gain
from wavegen.comparison.measured_side import measured_side
from wavegen.comparison.side import SideSettings
from wavegen.comparison.spectra import side_spectrum, spectrum_difference
from wavegen.files.format import ReadHints
from wavegen.production.subject_files import FilePart, open_subject

N, OVER = 1 << 17, 12
RATE_HZ = 1_200_000


@pytest.fixture(scope="module")
def device():
    """Noise 100 kHz wide, and what a Rapp amplifier 6 dB back makes of it."""
    rng = np.random.default_rng(11)
    spectrum = np.zeros(N, np.complex128)
    half = N // OVER // 2
    lines = np.arange(-half, half)
    spectrum[lines] = rng.standard_normal(lines.size) + 1j * rng.standard_normal(lines.size)
    source = np.fft.ifft(spectrum)
    source *= 10 ** (-6 / 20) / np.sqrt(np.mean(np.abs(source) ** 2))
    return source, source / (1 + np.abs(source) ** 4) ** 0.25


@pytest.fixture
def capture(tmp_path, device):
    """Both as loops; the output resampled to so many times the signal's width."""

    def side(name, samples, rate_hz):
        path = tmp_path / f"{name}.cf32_le"
        samples.astype("<c8").tofile(path)
        subject = open_subject(path, ReadHints(sample_rate_hz=rate_hz), FilePart(loops=True))
        return measured_side(subject, SideSettings(subject=str(path)))

    def capture(times):
        source, output = device
        n = int(N * times / OVER) // 2 * 2
        spectrum = np.fft.fft(output)
        kept = np.concatenate([spectrum[: n // 2], spectrum[-n // 2 :]])
        narrow = np.fft.ifft(kept) * n / N
        sides = side("in", source, RATE_HZ), side("out", narrow, RATE_HZ * n // N)
        spectra = spectrum_difference(*(side_spectrum(item) for item in sides))
        return device_gain(sides, spectra, tolerance_db=0.2, down_to=1e-3)

    return capture


def worst_db(found):
    true = -5 * np.log10(1 + 10 ** (found.points.input_db / 5))
    used = found.points.probability > 1e-4
    return float(np.abs(found.points.gain_db - true)[used].max())


def test_a_narrow_capture_mimics_compression(capture):
    errors = {times: worst_db(capture(times)) for times in (1.0, 1.5, 3.2)}
    # Single draws of 2^17 / 12 independent samples: about ten of them lie beyond 0.1 %.
    assert 1.0 < errors[1.0] < 2.2
    assert 0.4 < errors[1.5] < 1.1
    assert errors[3.2] < 0.06


@pytest.mark.parametrize(("times", "holds"), [(1.0, False), (1.5, False), (3.2, True)])
def test_and_it_is_said(capture, times, holds):
    told = next(item for item in capture(times).assumptions if item.name == "bandwidth")
    assert told.holds is holds
    assert ("mimics compression" in told.says) is not holds
