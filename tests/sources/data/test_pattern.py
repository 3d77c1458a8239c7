from fractions import Fraction

import pytest

from wavegen.core.site import Site
from wavegen.core.units import QuantityError
from wavegen.sources.data.pattern import BitText, Pattern


def words(text, *, n_bits, period):
    site = Site(sample_rate_hz=Fraction(1), n_samples=10, seed=1, label="a", path="signal")
    made = Pattern(bits=BitText.parse(text)).bind(site, n_bits=n_bits, period=period)
    return made.words(0, period).tolist(), site.notes


def test_bits_repeat_and_run_on_from_symbol_to_symbol():
    assert words("1100", n_bits=1, period=8) == ([1, 1, 0, 0, 1, 1, 0, 0], [])
    assert words("110", n_bits=2, period=3) == ([3, 1, 2], [])
    got, notes = words("110", n_bits=2, period=2)
    assert got == [3, 1]
    assert [note.where for note in notes] == ["signal.data"]


def test_hexadecimal():
    assert BitText.parse("0xF0 a").bits.tolist() == [1, 1, 1, 1, 0, 0, 0, 0, 1, 0, 1, 0]
    assert Pattern(bits=BitText.parse("0x00F")).period_bits() == 12
    assert BitText.parse("11 00").text() == "11 00"


@pytest.mark.parametrize(
    "value", [1100, 0.5, None, [1, 0], "", "  ", "12", "0x", "0xG", "1" * 65537]
)
def test_refused(value):
    with pytest.raises(QuantityError) as caught:
        BitText.parse(value)
    assert "65536" in caught.value.allowed


def test_the_longest():
    assert BitText.parse("0x" + "F" * 16384).bits.sum() == 65536
