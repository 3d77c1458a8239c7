import argparse
from fractions import Fraction

import pytest

from wavegen.cli.options import level_dbm, place, positive, rate, workers
from wavegen.core.errors import ArgumentsError


def test_values_are_read_exactly():
    assert rate("1625/6 kHz") == Fraction(812_500, 3)
    assert rate("20MHz") == 20_000_000
    assert level_dbm("-12.5 dBm") == -12.5
    assert positive("32768") == 32768.0
    assert workers("3") == 3


@pytest.mark.parametrize(
    ("read", "text"),
    [
        (rate, "20"),
        (rate, "0 Hz"),
        (rate, "-1 Hz"),
        (rate, "inf Hz"),
        (level_dbm, "-10 dB"),
        (level_dbm, "3"),
        (positive, "0"),
        (positive, "-1"),
        (positive, "3 dB"),
        (positive, "x"),
        (workers, "0"),
        (workers, "-1"),
        (workers, "\u00b2"),
        (workers, ""),
    ],
)
def test_what_is_no_value(read, text):
    with pytest.raises(argparse.ArgumentTypeError):
        read(text)


@pytest.mark.parametrize(
    ("text", "samples"),
    [(None, None), ("0 samples", 0), ("1 sample", 1), ("12ms", 3250), ("48 us", 13)],
)
def test_places_in_samples(text, samples):
    assert place(text, Fraction(1_625_000, 6), "--from") == samples


@pytest.mark.parametrize(
    "text", ["1 ms", "-1 samples", "1.5 samples", "3", "3 MHz", "x", "1 symbols"]
)
def test_what_is_no_place(text):
    with pytest.raises(ArgumentsError) as caught:
        place(text, Fraction(1_625_000, 6), "--from")
    assert caught.value.where == "--from"
