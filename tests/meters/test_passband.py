import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.meters.passband import PassbandStatistics
from wavegen.meters.power import measure_samples


def test_a_carrier_is_a_sine():
    # P(2 cos^2 > x) = (2/pi) arccos sqrt(x/2); the peak stands 3.0103 dB over the mean.
    rf = PassbandStatistics(envelope=measure_samples(np.ones(1000, np.complex64)))
    assert rf.papr_db == pytest.approx(3.0103, abs=1e-4)
    power = np.array([0.1, 1.0, 1.9])
    want = 2 / np.pi * np.arccos(np.sqrt(power / 2))
    assert rf.ccdf(10 * np.log10(power)) == pytest.approx(want, abs=1e-9)
    assert rf.level_db([0.5, 0.0]) == pytest.approx([0.0, 3.0103], abs=1e-4)
    assert rf.over_envelope_db(0.5) == pytest.approx(0.0, abs=1e-4)


def test_it_agrees_with_a_carrier_in_time(band_noise):
    # The waveform itself, on a carrier that visits all phases: both count the same population
    # of 40 000 envelopes; 4 sigma of the finite number of phases, 16 an envelope.
    envelope = band_noise(3, 40_000, 0.5)
    rng = np.random.default_rng(4)
    phase = 2 * np.pi * rng.random((16, envelope.size))
    power = 2 * (envelope * np.exp(1j * phase)).real ** 2
    rf = PassbandStatistics(envelope=measure_samples(envelope))
    for level_db in (-10.0, 0.0, 6.0, 9.0):
        share = np.mean(power > 10 ** (level_db / 10) * np.mean(np.abs(envelope) ** 2))
        sigma = np.sqrt(share / power.size)
        assert float(rf.ccdf(level_db)) == pytest.approx(share, abs=4 * sigma + 0.004 * share)


def test_levels_and_curve_belong_together(band_noise):
    rf = PassbandStatistics(envelope=measure_samples(band_noise(3, 20_000, 0.5)))
    levels = rf.level_db([0.3, 0.1, 1e-3])
    assert rf.ccdf(levels) == pytest.approx([0.3, 0.1, 1e-3], rel=1e-6)
    assert np.all(np.diff(rf.ccdf(np.linspace(-20, 14, 200))) <= 0)
    assert float(rf.ccdf(rf.papr_db + 1e-9)) == 0
    assert np.shape(rf.ccdf(1.0)) == ()


def test_no_probability_is_refused(band_noise):
    rf = PassbandStatistics(envelope=measure_samples(band_noise(3, 2000, 0.5)))
    with pytest.raises(ArgumentsError):
        rf.level_db(1.5)
