from fractions import Fraction

import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.core.timespan import TimeSpan
from wavegen.production.measure_settings import EXACT, rounded_samples, whole_samples

RATE = Fraction(20_000_000)


def test_times_in_samples():
    assert whole_samples(TimeSpan.parse("1 ms"), RATE, "--from") == 20_000
    assert rounded_samples(TimeSpan.parse("1.02 us"), RATE, "--guard") == 20
    assert rounded_samples(None, RATE, "--guard") is None


@pytest.mark.parametrize(("text", "least"), [("1.02 us", 0), ("-1 us", 0), ("0 s", 1)])
def test_times_that_are_no_samples(text, least):
    with pytest.raises(ArgumentsError) as caught:
        whole_samples(TimeSpan.parse(text), RATE, "--slot", least=least)
    assert caught.value.where == "--slot"


@pytest.mark.parametrize(("text", "least"), [("-1 us", 0), ("1 ns", 1)])
def test_times_that_are_too_short(text, least):
    with pytest.raises(ArgumentsError) as caught:
        rounded_samples(TimeSpan.parse(text), RATE, "--gate-window", least=least)
    assert "--gate-window" in str(caught.value)


def test_exact_figures_ask_for_nothing_else():
    assert not (EXACT.states_process)
    assert not (EXACT.finds_faults)
