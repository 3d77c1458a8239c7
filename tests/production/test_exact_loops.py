"""Loops that are known sample by sample stay so behind a clip, an amplifier or a gate."""

from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.files.datatypes import CF32_LE
from wavegen.laws.listed import ListedLaw
from wavegen.meters.batches import measure_batches
from wavegen.production.judgement import DEFAULT, judge, law_of
from wavegen.production.verify import compare_with_loop

# 64 tones on 400 instants: the samples are no dense picture of the continuous wave.
TONES = "{kind: tones, count: 64, spacing: 10 kHz, phases: random}"
PATTERN = (
    "{kind: single_carrier, constellation: 16qam, symbol_rate: 1 MHz, "
    "data: {kind: prbs, sequence: pn9}, "
    "pulse: {kind: root_raised_cosine, roll_off: 0.22, span: 32 symbols}}"
)
CARRIER = "{kind: carrier}"
CLIP = "{kind: clip, ceiling: 3 dB}"
RAPP = "{kind: rapp, input_back_off: 3 dB, smoothness: 2}"
GATE = "{kind: gate, duty: 30 %, period: 250 us, ramp: 5 us}"
DELAY = "{kind: delay, delay: 17 samples}"


def recipe(lab, signal, *stages):
    return f"{lab.HEAD}signal: {signal}\nstages: [{', '.join(stages)}]\n"


@pytest.mark.parametrize(
    ("signal", "stages"),
    [
        (TONES, (CLIP,)),
        (TONES, (RAPP,)),
        (TONES, (GATE,)),
        (TONES, (DELAY, GATE, CLIP)),
        (TONES, (GATE, RAPP)),
        (PATTERN, (CLIP,)),
        (PATTERN, (RAPP, CLIP)),
        (CARRIER, (GATE,)),
    ],
)
def test_they_are_judged_at_every_level(lab, tmp_path, signal, stages):
    text = recipe(lab, signal, *stages)
    made = lab.make(text, tmp_path)
    law = made.document["law"]
    assert (law["verdict"], law["about"]) == ("agrees", "this loop")
    found = law_of(lab.prepared(text))
    assert isinstance(found, ListedLaw)
    power = np.abs(lab.held(text).samples.astype(np.complex128)) ** 2
    want = np.resize(found.in_order, power.size)
    # Each sample, not their distribution alone: float32 of the envelope, twice.
    np.testing.assert_allclose(power / power.mean(), want, atol=2e-5)


def test_what_is_not_the_loop_is_found(lab, tmp_path):
    judged = lab.make(recipe(lab, TONES, CLIP), tmp_path / "clipped")
    # The same loop made without its clip, or with the gate 40 us later, is another.
    law = law_of(lab.prepared(recipe(lab, TONES, CLIP)))
    assert judged.document["law"]["peak_db"] == pytest.approx(3.0, abs=1e-4)
    for other in ((), ("{kind: clip, ceiling: 3.1 dB}",)):
        power = np.abs(lab.held(recipe(lab, TONES, *other)).samples.astype(np.complex128)) ** 2
        file = measure_batches(np.sqrt(power).astype(np.complex64)).statistics
        assert compare_with_loop(law, file, CF32_LE)[0] == "differs"
    gated = law_of(lab.prepared(recipe(lab, TONES, GATE)))
    late = lab.held(recipe(lab, TONES, GATE, "{kind: delay, delay: 40 us}")).samples
    assert compare_with_loop(gated, measure_batches(late).statistics, CF32_LE)[0] == "agrees"
    other = lab.held(recipe(lab, TONES, "{kind: delay, delay: 40 us}", GATE)).samples
    assert compare_with_loop(gated, measure_batches(other).statistics, CF32_LE)[0] == "differs"


def test_too_many_samples_to_list_are_said(lab, monkeypatch):
    text = recipe(lab, TONES, GATE)
    monkeypatch.setattr("wavegen.laws.own_samples.LONGEST", 100)
    law = law_of(lab.prepared(text))
    codes = SimpleNamespace(sampled=None)
    found = judge(law, codes, CF32_LE, DEFAULT)
    assert found.verdict == "undecided"
    assert "too many samples to list" in found.statement
