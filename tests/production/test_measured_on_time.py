from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.timespan import TimeSpan
from wavegen.dsp.bursts import Bursts
from wavegen.production.measure import measure
from wavegen.production.measure_settings import GateSettings, MeasureSettings
from wavegen.production.subject import Subject

PATTERN = GateSettings(by="pattern", pattern="10", slot=TimeSpan(Fraction(1000), "samples"))


def gated(lab, *, loops=False, second_db=0.0, **gate):
    signal = lab.held(lab.NOISE)
    signal.samples[:] = Bursts.of_slots((True, False), 1000).apply(signal.samples, 0)
    signal.samples[2000:3000] *= np.float32(10 ** (second_db / 20))
    settings = MeasureSettings(gate=GateSettings(**gate) if gate else PATTERN)
    document = measure(Subject(name="x", signal=signal, loops=loops), settings=settings)
    return document, signal.samples.reshape(8, 1000)[::2]


def test_on_time_and_all_of_the_time_are_both_labelled(lab):
    document, on = gated(lab)
    power = np.abs(on.astype(np.complex128)) ** 2
    assert "all of the time" in document["of"]
    found = document["on_time"]
    assert found["gate"] == "bursts by pattern: 4"
    assert "over the mean of that time" in found["is"]
    assert found["duty"] == 0.5
    assert found["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=1e-5)
    assert found["mean_dbfs"] - document["mean_dbfs"] == pytest.approx(3.0103, abs=1e-4)
    assert found["levels"][0]["low_db"] < found["levels"][0]["level_db"]
    assert len(found["ccdf"]["low"]) == len(found["ccdf"]["level_db"])


def test_of_a_loop_the_on_time_is_exact_and_its_process_apart(lab):
    found = gated(lab, loops=True)[0]["on_time"]
    assert "low_db" not in found["levels"][0]
    assert found["process_levels"][0]["low_db"] is not None


def test_bursts_at_two_levels_pooled_and_one_by_one(lab):
    document, on = gated(lab, second_db=-12.0, by="level", each=True)
    found = document["on_time"]
    power = np.abs(on.astype(np.complex128)) ** 2
    groups = found["bursts"]["at_one_level"]
    assert [group["n_bursts"] for group in groups] == [3, 1]
    # 250 independent values a burst: 3 sqrt(1 / 250 + 1 / 750) = 0.22, 0.86 dB.
    assert groups[0]["mean_dbfs"] - groups[1]["mean_dbfs"] == pytest.approx(12, abs=0.86)
    each = power / power.mean(axis=1)[:, np.newaxis]
    for figures, values in ((found, power / power.mean()), (found["one_by_one"], each)):
        level = np.sort(values.ravel())[-40]
        assert figures["levels"][1]["level_db"] == pytest.approx(10 * np.log10(level), abs=0.1)
    assert found["search"]["threshold_dbfs"] > found["search"]["closing_dbfs"]
    assert len(found["bursts"]["each"]) == 4


def test_without_bursts_it_is_said_why(lab):
    signal = lab.held(lab.NOISE)
    settings = MeasureSettings(gate=GateSettings(by="level"))
    document = measure(Subject(name="x", signal=signal, loops=False), settings=settings)
    assert document["on_time"]["n_samples"] == 0
    assert "no bursts were found" in document["warnings"][-1]["text"]


def test_several_files_share_one_on_time(lab):
    signal = lab.held(lab.NOISE)
    subjects = [Subject(name=name, signal=signal, loops=False) for name in "ab"]
    found = measure(*subjects, settings=MeasureSettings(gate=PATTERN))["on_time"]
    assert (found["n_samples"], found["duty"]) == (8000, 0.5)
    assert "bursts" not in found
