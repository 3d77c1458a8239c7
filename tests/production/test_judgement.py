"""Verdicts of files against laws; the statistics behind them: tests/meters/test_equivalence.py."""

from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.files.datatypes import CF32_LE, CI8, CI16_LE
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.mapped import GatedLaw
from wavegen.laws.tabulated import tabulated
from wavegen.laws.term import NoLaw
from wavegen.meters.batches import measure_batches
from wavegen.production.judgement import (
    DEFAULT,
    ON_TIME,
    WHOLE,
    Judgement,
    Question,
    check_question,
    data_samples_of,
    holds_over_seeds,
    judge,
    judge_files,
    law_of,
    rounding_slack_db,
    worst,
)

NO_LAW = NoLaw(reason="for the test")


def noise(n, seed=1):
    rng = np.random.default_rng(seed)
    return ((rng.standard_normal(n) + 1j * rng.standard_normal(n)) / 8).astype(np.complex64)


def codes(samples, *, is_gated=False):
    found = measure_batches(samples)
    return SimpleNamespace(
        statistics=found.statistics,
        on_statistics=found.statistics if is_gated else None,
        sampled=found,
    )


def test_noise_agrees_with_its_law_and_not_with_another():
    found = judge(GaussianLaw(), codes(noise(2_000_000)), CF32_LE, DEFAULT)
    assert (found.verdict, found.about, found.of) == ("agrees", "the process it samples", WHOLE)
    assert found.statement == "agrees within 0.2 dB down to 0.01 %"
    assert found.comparison.verdict == "agrees"
    bent = noise(2_000_000)
    bent *= 1 + 0.1 * np.abs(bent) ** 2
    found = judge(GaussianLaw(), codes(bent), CF32_LE, DEFAULT)
    assert found.verdict == "differs"
    assert "against the law" in found.statement


def test_tolerance_and_reach_are_those_asked_for():
    record = codes(noise(40_000))
    assert judge(GaussianLaw(), record, CF32_LE, DEFAULT).verdict == "undecided"
    found = judge(GaussianLaw(), record, CF32_LE, Question(tolerance_db=0.5, down_to=1e-2))
    assert found.verdict == "agrees"
    assert found.statement == "agrees within 0.5 dB down to 1 %"


def test_no_law_is_no_judgement():
    assert judge(NO_LAW, codes(noise(1000)), CF32_LE, DEFAULT) is None
    assert not holds_over_seeds(NO_LAW)
    assert holds_over_seeds(GaussianLaw())
    assert not holds_over_seeds(ConstantLaw())


def test_a_law_of_every_loop_needs_no_interval():
    even = np.full(1000, 0.5j, np.complex64)
    file = codes(even)
    file.sampled = None
    found = judge(ConstantLaw(), file, CI16_LE, DEFAULT)
    assert (found.verdict, found.about) == ("agrees", "this loop")
    assert found.comparison is None
    even[3] *= 1.1
    found = judge(ConstantLaw(), codes(even), CI16_LE, DEFAULT)
    assert found.verdict == "differs"
    assert "peak" in found.statement


def test_a_gated_signal_is_judged_by_its_on_time():
    gated = GatedLaw(source=GaussianLaw(), duty_fully_on=0.25, ramp=np.empty(0))
    found = judge(gated, codes(noise(2_000_000), is_gated=True), CF32_LE, DEFAULT)
    assert (found.verdict, found.of) == ("agrees", ON_TIME)
    found = judge(GaussianLaw(), codes(noise(1000), is_gated=True), CF32_LE, DEFAULT)
    assert found.verdict == "undecided"
    assert "law of the on-time is not known" in found.statement
    steady = GatedLaw(source=ConstantLaw(), duty_fully_on=0.5, ramp=np.empty(0))
    found = judge(steady, codes(noise(1000), is_gated=True), CF32_LE, DEFAULT)
    assert (found.verdict, found.about) == ("undecided", "this loop")


def test_a_pattern_speaks_for_random_data_only_so_far():
    law = SimpleNamespace(
        name="x",
        holds="over seeds",
        lowest_probability=1e-3,
        peak_db=np.inf,
        ccdf=GaussianLaw().ccdf,
        level_db=GaussianLaw().level_db,
    )
    found = judge(law, codes(noise(400_000)), CF32_LE, DEFAULT)
    assert found.down_to == 1e-3
    assert "down to 0.1 %" in found.statement
    assert found.comparison.levels[-1].probability == 1e-3


def test_rounding_is_allowed_for():
    # 8 codes RMS: 0.71 codes are 0.74 dB of that, and the noise of a sixth of a code 0.011 dB.
    statistics = SimpleNamespace(mean=(8 / 128) ** 2)
    slack = 20 * np.log10(1 + np.sqrt(0.5) / 8) + 10 * np.log10(1 + 1 / 6 / 64)
    assert rounding_slack_db(statistics, CI8) == pytest.approx(slack)
    assert rounding_slack_db(statistics, CI16_LE) < 0.004
    assert rounding_slack_db(statistics, CF32_LE) == 0


def test_the_worst_stands_for_all():
    made = {
        word: Judgement(verdict=word, statement=word) for word in ("agrees", "undecided", "differs")
    }
    assert worst([made["agrees"], made["differs"], made["undecided"]]) is made["differs"]
    assert worst([made["agrees"], None, made["undecided"]]) is made["undecided"]
    assert worst([made["agrees"], made["agrees"]]) is made["agrees"]
    assert worst([None, None]) is None


@pytest.mark.parametrize(
    "question", [Question(tolerance_db=0), Question(down_to=0), Question(down_to=0.5)]
)
def test_questions_that_mean_nothing(question):
    with pytest.raises(ArgumentsError):
        check_question(question)
    check_question(DEFAULT)


def test_law_of_a_recipe(lab):
    assert law_of(lab.prepared(lab.CARRIER)).holds == "every loop"
    assert law_of(lab.prepared(lab.TONES)).holds == "every loop"
    single = law_of(lab.prepared(lab.SINGLE))
    assert single.holds == "over seeds"
    assert tabulated(single).level_db(1e-3) == pytest.approx(single.level_db(1e-3), abs=1e-3)
    clipped = lab.NOISE + "stages: [{kind: clip, ceiling: 6 dB}]\n"
    assert law_of(lab.prepared(clipped)).level_db(1e-6) == pytest.approx(6, abs=1e-3)
    filtered = lab.TONES + "stages: [{kind: filter, bandwidth: 1 MHz}]\n"
    assert isinstance(law_of(lab.prepared(filtered)), NoLaw)


def test_data_that_come_round_again_count_once(lab):
    pattern = lab.SINGLE.replace("qpsk", "qpsk, data: {kind: pattern, bits: '11000110'}")
    signal = lab.held(pattern)
    assert data_samples_of(GaussianLaw(), signal) == 16  # four symbols of four samples
    assert data_samples_of(GaussianLaw(), lab.held(lab.SINGLE)) == 8000
    assert data_samples_of(ConstantLaw(), signal) is None
    assert data_samples_of(NO_LAW, signal) is None


def test_every_file_is_judged_on_its_own():
    good, bad = codes(noise(1000)), codes(noise(1000))
    bad.statistics = replace(bad.statistics, mean=bad.statistics.mean)
    even = np.full(1000, 0.5j, np.complex64)
    files = [
        SimpleNamespace(channels=(codes(even),), datatype=CI16_LE),
        SimpleNamespace(channels=(good,), datatype=CI16_LE),
    ]
    found = judge_files(ConstantLaw(), files, 0, DEFAULT)
    assert [item.verdict for item in found] == ["agrees", "differs"]
