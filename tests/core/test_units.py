"""Values with units are read exactly, or refused with what to do."""

from decimal import Decimal
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.core.units import (
    DIMENSIONS,
    QuantityError,
    dimension_of,
    format_hz,
    format_s,
    key_of,
    parse_quantity,
    split_quantity,
)

HZ = DIMENSIONS["_hz"]
S = DIMENSIONS["_s"]


@pytest.mark.parametrize(
    ("text", "suffix", "value"),
    [
        ("3.84 MHz", "_hz", Fraction(3840000)),
        ("3.84MHz", "_hz", Fraction(3840000)),
        ("1625/6 kHz", "_hz", Fraction(812500, 3)),
        ("-1.5/4 kHz", "_hz", Fraction(-375)),
        ("1e6 Hz", "_hz", Fraction(10**6)),
        ("2.5E-3 GHz", "_hz", Fraction(2500000)),
        ("+7 Hz", "_hz", Fraction(7)),
        ("  7 Hz ", "_hz", Fraction(7)),
        ("10 ms", "_s", Fraction(1, 100)),
        ("5 us", "_s", Fraction(5, 10**6)),
        ("5 \u00b5s", "_s", Fraction(5, 10**6)),
        ("5 \u03bcs", "_s", Fraction(5, 10**6)),
        ("1 ps", "_s", Fraction(1, 10**12)),
        ("-3 dB", "_db", Fraction(-3)),
        ("-10.5 dBm", "_dbm", Fraction(-21, 2)),
        ("-1 dBFS", "_dbfs", Fraction(-1)),
        ("45°", "_deg", Fraction(45)),
        ("45 deg", "_deg", Fraction(45)),
        ("5 %", "_percent", Fraction(5)),
        ("20 ppm", "_ppm", Fraction(20)),
        ("50 Ω", "_ohm", Fraction(50)),
        ("1 sample", "_samples", Fraction(1)),
        ("64 symbols", "_symbols", Fraction(64)),
        ("144/2048", "_fraction", Fraction(9, 128)),
        ("0.1", "_fraction", Fraction(1, 10)),
    ],
)
def test_a_value_is_read_exactly(text: str, suffix: str, value: Fraction) -> None:
    assert parse_quantity(text, DIMENSIONS[suffix]) == value


@pytest.mark.parametrize(
    ("text", "suffix", "guess"),
    [
        ("3.84 mHz", "_hz", "MHz"),
        ("3.84 mhz", "_hz", "MHz"),
        ("3.84 Mhz", "_hz", "MHz"),
        ("15 KHz", "_hz", "kHz"),
        ("10 MS", "_s", "ms"),
        ("10 \u00b5S", "_s", "\u03bcs"),
        ("3 db", "_db", "dB"),
        ("3 dbm", "_dbm", "dBm"),
        ("-1 dBfs", "_dbfs", "dBFS"),
        ("64 symbol's", "_symbols", "symbols"),
        ("50 Ohm", "_ohm", "ohm"),
    ],
)
def test_a_look_alike_unit_is_named(text: str, suffix: str, guess: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, DIMENSIONS[suffix])
    assert caught.value.remedy == f"Did you mean {guess}?"


@pytest.mark.parametrize("text", ["10 dBm", "10 dBc", "3 V", "3 MHz"])
def test_a_unit_of_another_dimension_is_refused(text: str) -> None:
    with pytest.raises(QuantityError):
        parse_quantity(text, DIMENSIONS["_db"])


@pytest.mark.parametrize("text", ["3840000", "1e6", "1/2"])
def test_a_bare_number_is_refused_with_the_fix(text: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, HZ)
    assert f"{text} Hz" in caught.value.remedy


def test_a_fraction_takes_no_unit() -> None:
    with pytest.raises(QuantityError) as caught:
        parse_quantity("5 %", DIMENSIONS["_fraction"])
    assert "without a unit" in caught.value.allowed


@pytest.mark.parametrize(
    "text",
    [
        "",
        " ",
        "Hz",
        "inf Hz",
        "-inf",
        "nan",
        "NaN Hz",
        ".inf",
        "infinity Hz",
        "1e400 Hz",
        "1e-400 Hz",
        "1e999999999 Hz",
        "1.5.2 Hz",
        "1,5 MHz",
        "1 000 Hz",
        "1_000 Hz",
        "0x10 Hz",
        "1/2/3 Hz",
        "1/0 Hz",
        "1/0.0",
        "1/-2 Hz",
        ".5 MHz",
        "5. MHz",
        "--5 Hz",
        "5 - 3 Hz",
        "1:30 s",
        "٣ Hz",  # digits of another script
        "１ Hz",
        "5 Hz Hz",
        "5\n6 Hz",
        "9" * 5000 + " Hz",
    ],
)
def test_what_is_no_number_is_refused(text: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, HZ)
    assert caught.value.problem
    assert caught.value.allowed
    assert caught.value.remedy
    assert len(str(caught.value)) < 300


def test_an_error_has_no_place_inside_its_value_unless_told() -> None:
    assert QuantityError(problem="p", allowed="a", remedy="r").key == ""
    assert QuantityError(problem="p", allowed="a", remedy="r", key="[2]").key == "[2]"


@given(
    number=st.decimals(allow_nan=False, allow_infinity=False, places=9, min_value=-(10**9)),
    unit=st.sampled_from(sorted(HZ.units)),
)
def test_decimals_are_exact(number: Decimal, unit: str) -> None:
    text = f"{number:f} {unit}"
    if len(text) <= 64:
        assert parse_quantity(text, HZ) == Fraction(number) * HZ.units[unit]


@given(
    above=st.integers(-(10**15), 10**15),
    below=st.integers(1, 10**15),
    unit=st.sampled_from(sorted(S.units)),
)
def test_ratios_are_exact(above: int, below: int, unit: str) -> None:
    assert parse_quantity(f"{above}/{below} {unit}", S) == Fraction(above, below) * S.units[unit]


@given(value=st.floats(-1e90, 1e90).filter(lambda x: x == 0 or abs(x) > 1e-90))
def test_a_float_survives_its_text(value: float) -> None:
    assert float(split_quantity(repr(value))[0]) == value


@given(text=st.text(max_size=80))
def test_any_text_is_read_or_refused(text: str) -> None:
    for dimension in DIMENSIONS.values():
        try:
            parse_quantity(text, dimension)
        except QuantityError:
            continue


def test_every_suffix_has_an_example_that_it_reads() -> None:
    for suffix, dimension in DIMENSIONS.items():
        assert dimension.suffix == suffix
        parse_quantity(dimension.example, dimension)


def test_keys_lose_their_suffix_and_nothing_else() -> None:
    assert key_of("average_power_at_device_dbm") == "average_power_at_device"
    assert key_of("edge_fraction") == "edge"
    assert key_of("is_gated") == "is_gated"
    assert dimension_of("roll_off") is None
    assert dimension_of("hz") is None


def test_frequencies_and_times_for_people() -> None:
    assert format_hz(Fraction(812500, 3)) == "270.8333333 kHz"
    assert format_hz(2.4e9) == "2.4 GHz"
    assert format_hz(0.5) == "0.5 Hz"
    assert format_s(0) == "0 s"
    assert format_s(1.5) == "1.5 s"
