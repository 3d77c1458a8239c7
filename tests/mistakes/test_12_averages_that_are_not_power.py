"""Mistake: mean power taken from averaged decibels, averaged volts, or a peak hold.

Size: of noise, -2.51 dB and -1.05 dB; a peak hold climbs for as long as it is left on. Remedy: only
power is averaged here; what the other averages read of a signal can be shown, and a field figure
that was averaged otherwise can be set right if the signal is noise-like.
"""

import numpy as np
import pytest

from wavegen.meters.averaging import GAUSSIAN_OFFSET_DB, average_offset_db, true_mean_db
from wavegen.meters.power import measure_samples

N = 400_000


@pytest.fixture(scope="module")
def noise():
    rng = np.random.default_rng(12)
    return (rng.standard_normal((2, N)) / np.sqrt(2)).T.copy().view(np.complex128)[:, 0]


def test_offsets_as_published():
    # Textbook: -2.5068 and -1.0491 dB.
    assert GAUSSIAN_OFFSET_DB["log"] == pytest.approx(-2.5068, abs=1e-4)
    assert GAUSSIAN_OFFSET_DB["voltage"] == pytest.approx(-1.0491, abs=1e-4)


@pytest.mark.parametrize(("averaging", "spread_db"), [("log", 5.57), ("voltage", 4.5)])
def test_other_averages_read_low(noise, averaging, spread_db):
    statistics = measure_samples(noise.astype(np.complex64))
    got = average_offset_db(statistics, averaging)
    # Standard error of the mean of N such figures (5.57 dB of spread): 4 sigma, 0.04 dB.
    assert got == pytest.approx(GAUSSIAN_OFFSET_DB[averaging], abs=4 * spread_db / np.sqrt(N))


def test_they_read_every_signal_differently():
    # So no constant repairs them: a carrier loses nothing, two equal tones 3.01 dB in decibels.
    index = np.arange(N)
    carrier = measure_samples(np.ones(1000, np.complex64))
    tones = np.exp(2j * np.pi * 0.1234567 * index) + np.exp(-2j * np.pi * 0.1234567 * index)
    assert average_offset_db(carrier, "log") == pytest.approx(0, abs=1e-6)
    got = average_offset_db(measure_samples(tones.astype(np.complex64)), "log")
    assert got == pytest.approx(-3.0103, abs=0.05)  # mean of 20 log10 |2 cos| is 0 dB: exact


def test_the_mean_of_the_program_is_that_of_power(noise):
    statistics = measure_samples(noise.astype(np.complex64))
    assert statistics.mean == pytest.approx(np.mean(np.abs(noise) ** 2), rel=1e-6)
    read_db = statistics.mean_db + average_offset_db(statistics, "log")
    assert true_mean_db(read_db, "log") == pytest.approx(statistics.mean_db, abs=0.04)


def test_peak_hold_climbs_with_time(noise):
    power = np.abs(noise) ** 2
    held_db = [10 * np.log10(power[:count].max()) for count in (1000, 20_000, N)]
    assert np.all(np.diff(held_db) > 0.3)
