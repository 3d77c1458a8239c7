from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError, SignalError
from wavegen.core.timespan import TimeSpan
from wavegen.dsp.bursts import Bursts
from wavegen.files.format import Annotation
from wavegen.meters.burst_search import pattern_bursts
from wavegen.production.measure_settings import GateSettings
from wavegen.production.measured_gate import find_gate, within_period
from wavegen.production.subject import Subject

SLOT = TimeSpan(Fraction(100), "samples")
N = 4000


@pytest.fixture
def subject(lab):
    signal = lab.held(lab.NOISE)
    bursts = Bursts.of_slots((True, False), 1000)
    signal.samples[:] = bursts.apply(signal.samples, 0)
    return Subject(name="x", signal=signal, loops=True)


def gated(subject, **settings):
    return find_gate(subject, subject.signal, GateSettings(**settings))


def test_nothing_is_gated_unless_asked_or_known(subject):
    assert find_gate(subject, subject.signal, None) is None


def test_by_level(subject):
    found = gated(subject, by="level", guard=TimeSpan(Fraction(5), "samples"))
    assert (found.n_bursts, found.bursts.ramp_samples) == (4, 5)
    assert found.duty == pytest.approx(0.5, abs=0.01)


def test_a_pattern_repeats_and_is_moved(subject):
    found = gated(subject, by="pattern", pattern="1100", slot=SLOT, delay=SLOT)
    assert found.bursts.runs[:2] == ((100, 300), (500, 700))
    assert found.duty == 0.5
    # It went on before its first slot: moved by three slots it begins on.
    late = TimeSpan(Fraction(300), "samples")
    found = gated(subject, by="pattern", pattern="1100", slot=SLOT, delay=late)
    is_on = found.bursts.is_on(0, 400)
    np.testing.assert_array_equal(np.flatnonzero(np.diff(is_on)) + 1, [100, 300])
    assert is_on[0]


@pytest.mark.parametrize(
    ("settings", "where"),
    [
        ({"pattern": "1111", "slot": SLOT}, "--gate"),
        ({"pattern": "10"}, "--gate"),
        ({"pattern": "10", "slot": TimeSpan.parse("1 ps")}, "--slot"),
        ({"pattern": "10", "slot": SLOT, "guard": TimeSpan.parse("50 samples")}, "--guard"),
    ],
)
def test_patterns_that_mean_nothing(subject, settings, where):
    with pytest.raises(ArgumentsError) as caught:
        gated(subject, by="pattern", **settings)
    assert caught.value.where == where


def test_by_markers(subject):
    marks = (Annotation(start_sample=10, n_samples=20, label="a"), Annotation(start_sample=50))
    marked = Subject(name="x", signal=subject.signal, loops=True, annotations=marks)
    assert gated(marked, by="markers").bursts.runs == ((10, 30),)
    with pytest.raises(SignalError):
        gated(marked, by="markers", label="b")


def test_bursts_of_one_data_period():
    even = pattern_bursts(Bursts(period_samples=100, runs=((10, 30), (60, 70))), n_samples=1000)
    assert within_period(even, 200).runs == ((10, 30), (60, 70), (110, 130), (160, 170))
    assert within_period(even, 1000) is even.bursts
    odd = pattern_bursts(Bursts(period_samples=1000, runs=((10, 30), (510, 531))), n_samples=1000)
    assert within_period(odd, 500) is None
