"""Exact numbers to text and back."""

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.core.units import DIMENSIONS, parse_quantity, split_quantity
from wavegen.recipe.exact import write_number, write_quantity


@pytest.mark.parametrize(
    ("value", "suffix", "text"),
    [
        (Fraction(3840000), "_hz", "3.84 MHz"),
        (Fraction(812500, 3), "_hz", "1625/6 kHz"),
        (Fraction(15000), "_hz", "15 kHz"),
        (Fraction(-(10**7)), "_hz", "-10 MHz"),
        (Fraction(0), "_hz", "0 Hz"),
        (Fraction(10**9), "_hz", "1 GHz"),
        (Fraction(1, 100), "_s", "10 ms"),
        (Fraction(1, 3), "_s", "1000/3 ms"),
        (Fraction(5, 10**6), "_s", "5 us"),
        (-3.5, "_db", "-3.5 dB"),
        (45.0, "_deg", "45 deg"),
        (50.0, "_ohm", "50 ohm"),
        (64, "_symbols", "64 symbols"),
        (1, "_samples", "1 samples"),
        (Fraction(9, 128), "_fraction", "0.0703125"),
        (Fraction(1, 3), "_fraction", "1/3"),
    ],
)
def test_the_text_a_person_would_write(value: Fraction | float, suffix: str, text: str) -> None:
    assert write_quantity(value, DIMENSIONS[suffix]) == text


rationals = st.fractions(-(10**12), 10**12, max_denominator=10**9)


@given(value=rationals, suffix=st.sampled_from(sorted(DIMENSIONS)))
def test_exact_values_survive(value: Fraction, suffix: str) -> None:
    dimension = DIMENSIONS[suffix]
    assert parse_quantity(write_quantity(value, dimension), dimension) == value


floats = st.floats(-1e30, 1e30).filter(lambda x: x == 0 or abs(x) > 1e-30)


@given(value=floats, suffix=st.sampled_from(sorted(DIMENSIONS)))
def test_floats_survive_bit_for_bit(value: float, suffix: str) -> None:
    dimension = DIMENSIONS[suffix]
    assert float(parse_quantity(write_quantity(value, dimension), dimension)) == value
    assert float(split_quantity(write_number(value))[0]) == value


@pytest.mark.parametrize("value", [1e-300, 1e300, Fraction(10**70 + 1, 3)])
def test_what_has_no_text_is_refused(value: Fraction | float) -> None:
    with pytest.raises(ValueError, match=r"text|characters|number"):
        write_number(value)
    with pytest.raises(ValueError, match=r"text|characters|number"):
        write_quantity(value, DIMENSIONS["_hz"])


@pytest.mark.parametrize("value", [float("nan"), float("inf")])
def test_numbers_that_are_none(value: float) -> None:
    with pytest.raises(ValueError, match="is not a number"):
        write_number(value)
