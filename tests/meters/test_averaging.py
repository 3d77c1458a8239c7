import numpy as np
import pytest

from wavegen.meters.averaging import GAUSSIAN_OFFSET_DB, average_offset_db, true_mean_db
from wavegen.meters.power import measure_samples


def test_offsets_are_those_of_the_samples(band_noise):
    samples = band_noise(4, 50_000, 0.5)
    statistics = measure_samples(samples)
    power = np.abs(samples.astype(np.complex128)) ** 2
    log = np.mean(10 * np.log10(power)) - 10 * np.log10(power.mean())
    volt = 20 * np.log10(np.mean(np.sqrt(power))) - 10 * np.log10(power.mean())
    assert average_offset_db(statistics, "log") == pytest.approx(log, abs=5e-4)
    assert average_offset_db(statistics, "voltage") == pytest.approx(volt, abs=5e-4)
    assert average_offset_db(statistics, "power") == 0


def test_a_constant_envelope_reads_the_same_in_all_ways():
    statistics = measure_samples(np.full(100, 0.3 + 0.4j, np.complex64))
    for averaging in GAUSSIAN_OFFSET_DB:
        assert average_offset_db(statistics, averaging) == pytest.approx(0, abs=1e-6)


def test_zeros_count_as_amplitude_but_have_no_decibels():
    statistics = measure_samples(np.array([1, 0], np.complex64))
    assert average_offset_db(statistics, "log") == pytest.approx(10 * np.log10(2))
    assert average_offset_db(statistics, "voltage") == pytest.approx(-10 * np.log10(2))


def test_the_true_mean_is_higher():
    assert true_mean_db(-30.0, "power") == -30
    assert true_mean_db(-30.0, "log") == pytest.approx(-27.493, abs=1e-3)
    assert true_mean_db(-30.0, "voltage") == pytest.approx(-28.951, abs=1e-3)
