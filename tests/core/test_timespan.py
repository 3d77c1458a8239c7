from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.core.timespan import TimeSpan
from wavegen.core.units import QuantityError


@pytest.mark.parametrize(
    ("text", "rate", "samples"),
    [
        ("2.5 us", 2_000_000, Fraction(5)),
        ("1/3 ms", 3_000, Fraction(1)),
        ("-4 ns", 1_000_000, Fraction(-1, 250)),
        ("0 s", 10, Fraction(0)),
        ("12.5 samples", 7, Fraction(25, 2)),
        ("1 sample", 7, Fraction(1)),
    ],
)
def test_read_exactly_in_samples(text, rate, samples):
    assert TimeSpan.parse(text).samples(Fraction(rate)) == samples


@pytest.mark.parametrize(
    "value", ["", "5", 5, 0.1, True, None, [], "5 Hz", "5 symbols", "x", "1e13 s", "9e98 samples"]
)
def test_anything_else_is_refused(value):
    with pytest.raises(QuantityError) as caught:
        TimeSpan.parse(value)
    assert caught.value.allowed
    assert caught.value.remedy


def test_look_alikes_are_named():
    with pytest.raises(QuantityError, match=r"Did you mean ms\?"):
        TimeSpan.parse("5 mS")


@given(st.fractions(-1000, 1000, max_denominator=10**9), st.sampled_from(["s", "samples"]))
def test_text_reads_back_to_the_same_value(value, unit):
    span = TimeSpan(value, unit)
    assert TimeSpan.parse(span.text()) == span


def test_text_is_the_shortest():
    assert str(TimeSpan.parse("0.002 s")) == "2 ms"
    assert str(TimeSpan.parse("3 samples")) == "3 samples"
