from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.files.datatypes import CF32_LE, CI8, CI16_LE
from wavegen.meters.power import measure_samples
from wavegen.production.judgement import law_of
from wavegen.production.verify import compare_with_loop, law_levels, rounding_reach

TONES = "signal: {kind: tones, count: 8, spacing: 10 kHz, phases: newman}\n"


def compare_with_law(law, file):
    verdict, deviation = compare_with_loop(law, file.statistics, file.datatype)
    assert bool(deviation) == (verdict == "differs")
    return verdict


def levels_of(file, level_db):
    return law_levels(file.datatype, file.statistics, level_db)


def as_file(samples, datatype=CF32_LE):
    statistics = measure_samples(samples.astype(np.complex64))
    channel = SimpleNamespace(statistics=statistics)
    return SimpleNamespace(channels=(channel,), statistics=statistics, datatype=datatype)


def law(lab, phases="newman"):
    return law_of(lab.prepared(lab.TONES.replace("newman", phases)))


def tones(phases, n=8000):
    time = np.arange(n) / 4e6
    offsets = (np.arange(8) - 3.5) * 10e3
    return sum(np.exp(2j * np.pi * f * time + 1j * p) for f, p in zip(offsets, phases, strict=True))


NEWMAN = np.pi * np.arange(8) ** 2 / 8


def test_tones_by_numpy_agree_with_the_law_and_other_phases_differ(lab):
    right = as_file(tones(NEWMAN))
    assert compare_with_law(law(lab), right) == "agrees"
    assert compare_with_law(law(lab, "equal"), right) == "differs"
    assert compare_with_law(law(lab), as_file(tones(np.zeros(8)))) == "differs"


def test_a_fault_of_a_tenth_of_a_decibel_in_one_tone_is_seen(lab):
    loud = tones(NEWMAN) + 0.4 * np.exp(2j * np.pi * 35e3 * np.arange(8000) / 4e6 + 1j * NEWMAN[-1])
    assert compare_with_law(law(lab), as_file(loud)) == "differs"


@pytest.mark.parametrize("n_wrong", [100, 400])
def test_a_stretch_that_was_tampered_with_is_seen(lab, n_wrong):
    samples = tones(NEWMAN)
    samples[1000 : 1000 + n_wrong] *= 1.5
    assert compare_with_law(law(lab), as_file(samples)) == "differs"


def test_a_carrier(lab):
    constant = law_of(lab.prepared(lab.CARRIER))
    assert compare_with_law(constant, as_file(np.full(1000, 0.5j))) == "agrees"
    samples = np.full(1000, 0.5j)
    samples[10] *= 10 ** (0.03 / 20)
    assert compare_with_law(constant, as_file(samples)) == "differs"
    assert compare_with_law(constant, as_file(tones(NEWMAN))) == "differs"


def test_rounding_to_codes_is_allowed_for_and_no_more(lab):
    scaled = tones(NEWMAN) * 0.05
    rounded = (np.rint(scaled.real * 128) + 1j * np.rint(scaled.imag * 128)) / 128
    assert compare_with_law(law(lab), as_file(rounded, CI8)) == "agrees"
    assert compare_with_law(law(lab), as_file(rounded, CI16_LE)) == "differs"


def test_how_far_rounding_can_move_a_level():
    # A mean of -20 dBFS in 8 bits is 12.8 codes RMS; half a code on each rail is 0.7071 codes.
    below, above = levels_of(as_file(np.full(100, 0.1), CI8), np.array([0.0, -40.0]))
    half = np.sqrt(0.5)
    assert below[0] == pytest.approx(20 * np.log10((12.8 - half) / (12.8 + half)) - 0.01, abs=1e-6)
    assert above[0] == pytest.approx(20 * np.log10((12.8 + half) / (12.8 - half)) + 0.01, abs=1e-6)
    assert below[1] < -300  # less than a code: anything may have stood there
    below, above = levels_of(as_file(np.full(100, 0.1)), np.array([3.0]))
    assert (below, above) == (pytest.approx(2.99), pytest.approx(3.01))
    _, above = levels_of(as_file(np.full(100, 0.001), CI8), np.array([0.0]))
    assert above > 300


def test_a_single_spike_is_seen(lab):
    for factor, verdict in ((1.0, "agrees"), (1.01, "differs")):
        samples = tones(NEWMAN)
        samples[np.argmax(np.abs(samples))] *= factor
        assert compare_with_law(law(lab), as_file(samples)) == verdict


def test_what_gives_a_difference_away_is_told(lab):
    spike = tones(NEWMAN)
    spike[np.argmax(np.abs(spike))] *= 1.02
    statistics = as_file(spike).statistics
    assert "peak stands +0.1" in compare_with_loop(law(lab), statistics, CF32_LE)[1]
    fuller = tones(NEWMAN)
    fuller[np.abs(fuller) < np.median(np.abs(fuller))] *= 1.1  # the mean rises, no peak does
    said = compare_with_loop(law(lab), as_file(fuller).statistics, CF32_LE)[1]
    assert "the law says" in said


def test_reach_of_rounding():
    assert rounding_reach(CI8) == pytest.approx(np.sqrt(0.5) / 128)
    assert rounding_reach(CF32_LE) == 0
