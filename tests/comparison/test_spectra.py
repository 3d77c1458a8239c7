from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.comparison import spectra
from wavegen.comparison.curves import ExactCurve
from wavegen.comparison.side import Side
from wavegen.comparison.spectra import (
    refuse_too_narrow,
    side_spectrum,
    spectrum_difference,
    spectrum_warnings,
)
from wavegen.core.errors import SignalError
from wavegen.core.signal import Signal
from wavegen.laws.gaussian import GaussianLaw

N = 1 << 16


@dataclass(frozen=True, eq=False, kw_only=True)
class Held(Signal):
    samples: np.ndarray

    def compute(self, start, stop, *arrays):
        return self.samples[start:stop].copy()


@pytest.fixture
def side(rng):
    """Cyclic noise of a width about a centre, both in Hz."""

    def side(name="field", *, rate_hz=1e6, width_hz=2e5, centre_hz=0.0, **settings):
        frequency = np.fft.fftfreq(N, 1 / rate_hz)
        lines = np.abs(frequency - centre_hz) <= width_hz / 2
        spectrum = np.where(lines, rng.standard_normal(N) + 1j * rng.standard_normal(N), 0)
        samples = np.fft.ifft(spectrum).astype(np.complex64)
        signal = Held(
            sample_rate_hz=Fraction(rate_hz), n_samples=N, mean_power=None, samples=samples
        )
        return Side(
            name=name,
            is_="a loop",
            curve=ExactCurve(source=GaussianLaw()),
            signal=signal,
            loops=True,
            **settings,
        )

    return side


def difference(first, second):
    return spectrum_difference(side_spectrum(first), side_spectrum(second))


def test_widths_and_centres(side):
    found = difference(side(width_hz=2e5, centre_hz=5e4), side(width_hz=1e5))
    assert found.width_ratio == pytest.approx(2, rel=0.05)
    assert found.offset_hz == pytest.approx(5e4, rel=0.05)


def test_equal_densities_differ_by_their_own_noise(side):
    found = difference(side(), side(rate_hz=2e6))
    # 40 bands of 5 kHz: each estimated from 5e3 N / 1e6 = 330 independent lines, 0.24 dB.
    assert abs(found.largest_db) < 1.2
    assert not spectrum_warnings((side(), side()), found)


def test_densities_are_compared_centre_on_centre(side):
    assert abs(difference(side(centre_hz=1e5), side()).largest_db) < 1.2


def test_centres_are_left_where_they_are_if_asked(side):
    found = spectrum_difference(
        side_spectrum(side(centre_hz=1e5)), side_spectrum(side()), is_centred=False
    )
    assert found.difference_db.min() < -40  # where only the second one is
    assert found.offset_hz == pytest.approx(1e5, rel=0.05)


def test_a_tilt_is_seen(side):
    first, second = side(), side()
    samples = second.signal.samples
    tilted = samples + np.roll(samples, 2) * 0.5
    second = side()
    object.__setattr__(second.signal, "samples", tilted.astype(np.complex64))
    assert abs(difference(first, second).largest_db) > 1


def test_what_cannot_hold_the_other_is_refused(side):
    wide, narrow = side("stimulus", width_hz=8e5), side(rate_hz=5e5, width_hz=4e5)
    with pytest.raises(SignalError) as caught:
        refuse_too_narrow((wide, narrow), difference(wide, narrow))
    assert caught.value.where == "field"
    with pytest.raises(SignalError):
        refuse_too_narrow((narrow, wide), difference(narrow, wide))
    refuse_too_narrow((wide, wide), difference(wide, wide))


def test_unequal_widths_are_told(side):
    first, second = side("stimulus", width_hz=2e5), side(width_hz=1.2e5)
    (text,) = spectrum_warnings((first, second), difference(first, second))
    assert text.startswith("field occupies 11")
    assert "stimulus" in text


def test_no_samples_no_spectrum(side):
    assert (
        side_spectrum(Side(name="x", is_="a curve", curve=ExactCurve(source=GaussianLaw()))) is None
    )
    assert side_spectrum(side(is_power=True)) is None


def test_long_records_are_looked_at_here_and_there(side, monkeypatch):
    whole = side_spectrum(side())
    monkeypatch.setattr(spectra, "LONG_RECORD", N // 2)
    monkeypatch.setattr(spectra, "STRETCH_SAMPLES", 1 << 13)
    parts = side_spectrum(side())
    assert parts.occupied.width_hz == pytest.approx(whole.occupied.width_hz, rel=0.02)
    assert parts.spectrum.total_power == pytest.approx(whole.spectrum.total_power, rel=0.1)
    half = side()
    half.signal.samples[N // 2 :] = 0
    assert side_spectrum(half).occupied.width_hz == pytest.approx(2e5, rel=0.05)
    half.signal.samples[:] = 0
    with pytest.raises(SignalError):
        side_spectrum(half)
