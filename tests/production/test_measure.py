from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.production.measure import Subject, absolute, measure, measure_recipe

SIDECAR_KEYS = {
    "format", "version", "sample_rate_hz", "n_samples", "duration_s", "mean_dbfs", "peak_dbfs",
    "peak_between_samples_dbfs", "papr_db", "papr_between_samples_db", "n_zeros", "levels",
    "ccdf", "cdf", "pdf", "reference", "law", "versions", "warnings",
}  # fmt: skip


def test_the_keys_are_those_of_the_sidecar(lab):
    document = measure(Subject(name="x", signal=lab.held(lab.SINGLE), loops=True))
    assert not SIDECAR_KEYS - set(document)
    assert "seam" not in document
    assert "mean_dbm" not in document


def test_a_measured_recipe_has_the_figures_of_its_samples(lab):
    document = measure_recipe(lab.prepared(lab.SINGLE.replace("2 ms", "2.0001 ms")))
    power = np.abs(lab.held(lab.SINGLE).samples.astype(np.complex128)) ** 2
    assert document["is"] == "this loop"
    assert document["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=1e-5)
    assert document["papr_db"] == pytest.approx(10 * np.log10(power.max() / power.mean()), abs=1e-5)
    assert document["seam"]["is_clean"]
    (note,) = document["rounded"]
    assert note["asked"] == "2.0001 ms"
    assert (document["warnings"], document["notes"]) == ([], [])


def test_a_recording_is_not_read_past_its_ends(lab):
    held = lab.held(lab.SINGLE)
    # Half a sample past the end the loop would go on; made to jump, only the loop overshoots.
    held.samples[:4000] *= -1
    held.samples[-1] = held.samples.max() * 3
    loop = measure(Subject(name="x", signal=held, loops=True, cycle_samples=4))
    once = measure(Subject(name="x", signal=held, loops=False, cycle_samples=4))
    assert once["is"] == "a recording"
    assert "seam" in loop
    assert "seam" not in once
    assert once["peak_between_samples_dbfs"] <= loop["peak_between_samples_dbfs"]
    assert once["mean_dbfs"] == loop["mean_dbfs"]


def test_absolute_levels_stand_together(lab):
    subject = Subject(name="x", signal=lab.held(lab.CARRIER), loops=True, reference_level_dbm=-12.5)
    document = measure(subject)
    assert document["mean_dbm"] == pytest.approx(-12.5, abs=1e-6)
    assert document["peak_envelope_dbm"] == pytest.approx(-12.5, abs=1e-6)
    figures = {"mean_dbfs": -10.0, "peak_between_samples_dbfs": -2.0}
    assert absolute(figures, 3.0) == {
        "reference_level_dbm": 3.0,
        "mean_dbm": -7.0,
        "peak_envelope_dbm": 1.0,
    }


def test_errors_name_the_subject(lab):
    held = lab.held(lab.CARRIER)
    held.samples[5] = np.nan
    with pytest.raises(SignalError) as caught:
        measure(Subject(name="run7.iq", signal=held, loops=False))
    assert caught.value.where == "run7.iq"
    assert "sample 5" in caught.value.problem


@pytest.mark.parametrize("workers", [1, 2, 5])
def test_figures_do_not_depend_on_workers(lab, workers):
    subject = Subject(name="x", signal=lab.held(lab.SINGLE), loops=True)
    assert measure(subject, workers=workers) == measure(subject)


def test_a_rate_that_is_a_ratio(lab):
    document = measure_recipe(
        lab.prepared(lab.CARRIER, overrides=["sample_rate=1625/6 kHz", "duration=3250 samples"])
    )
    assert document["sample_rate_hz"] == pytest.approx(1625e3 / 6, rel=1e-15)
    assert document["duration_s"] == float(Fraction(3250 * 6, 1_625_000))


def test_a_recipe_whose_loops_are_all_alike_says_so(lab):
    tones = measure_recipe(lab.prepared(lab.TONES))
    assert "8 tones" in tones["process"]["says"]
    assert "levels" not in tones["process"]
    noise = measure_recipe(lab.prepared(lab.NOISE))
    assert noise["process"]["levels"][0]["low_db"] < noise["process"]["levels"][0]["high_db"]
