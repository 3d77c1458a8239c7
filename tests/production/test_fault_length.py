"""The statistics of it: tests/laws/test_sample_size.py."""

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.laws.gaussian import GaussianLaw
from wavegen.meters.batches import measure_batches
from wavegen.meters.equivalence import compare_with_law
from wavegen.meters.intervals import SampledStatistics
from wavegen.production.fault_length import fault_rows, flat_width
from wavegen.production.judgement import law_of


def rows(lab, text, fault_db=0.1, probability=1e-3):
    prepared = lab.prepared(text)
    return fault_rows(
        law_of(prepared), prepared.built.signal, fault_db=fault_db, probability=probability
    )


def test_width_of_spectra():
    flat = np.zeros(8192)
    flat[:800] = flat[-1248:] = 1.0
    assert flat_width(flat) == pytest.approx(0.25, rel=0.01)
    assert flat_width(np.roll(flat, 4000)) == pytest.approx(0.25, rel=0.01)
    two = np.zeros(8192)
    two[800:1312] = two[4800:5312] = 1.0
    assert flat_width(two) == pytest.approx(0.125, rel=0.03)  # two clumps: by squares
    assert flat_width(np.ones(512)) == pytest.approx(1, rel=1e-3)


def test_noise_as_planned_elsewhere(lab):
    # The study of false alarms: 0.1 dB at 0.1 % in 80 % of records of 2 million at 4-fold.
    found = rows(lab, lab.NOISE)
    assert found["oversampling"] == pytest.approx(4, rel=0.05)
    assert found["n_samples"] == pytest.approx(1.9e6, rel=0.1)
    assert found["duration_s"] == pytest.approx(found["n_samples"] / 4e6)
    assert found["found_in"] == 0.8
    # As the square of the fault.
    assert rows(lab, lab.NOISE, 0.2)["n_samples"] == pytest.approx(found["n_samples"] / 4, rel=1e-3)


@pytest.mark.parametrize("probability", [1e-2, 1e-3])
def test_it_is_what_the_verdict_can_find(lab, probability):
    """A record of about the length planned states the fault as detectable.

    The plan takes the mean as known; over its own mean a level of noise is a third better known.
    """
    rng = np.random.default_rng(2)
    n, width = 1 << 19, 1 << 17
    spectrum = np.zeros(n, np.complex128)
    spectrum[:width] = rng.standard_normal(width) + 1j * rng.standard_normal(width)
    record = SampledStatistics.of(measure_batches(np.fft.ifft(spectrum).astype(np.complex64)))
    row = next(
        item
        for item in compare_with_law(record, GaussianLaw()).levels
        if item.probability == pytest.approx(probability)
    )
    planned = rows(lab, lab.NOISE, row.detectable_db, probability)["n_samples"]
    assert 0.8 * n < planned < 1.6 * n


def test_off_times_add_to_the_length(lab):
    gate = "stages: [{kind: gate, duty: 50 %, period: 1 ms}]\n"
    ratio = rows(lab, lab.NOISE + gate)["n_samples"] / rows(lab, lab.NOISE)["n_samples"]
    assert ratio == pytest.approx(2, rel=0.1)


def test_every_loop_shows_what_is_the_same_for_all(lab):
    assert rows(lab, lab.TONES)["n_samples"] is None


@pytest.mark.parametrize(
    ("fault_db", "probability", "where"),
    [(0.0, 1e-3, "--fault"), (-0.1, 1e-3, "--fault"), (11, 1e-3, "--fault"), (0.1, 0.3, "--at")],
)
def test_refused(lab, fault_db, probability, where):
    with pytest.raises(ArgumentsError) as caught:
        rows(lab, lab.NOISE, fault_db, probability)
    assert caught.value.where in {where, "down-to"}
