"""The top level of a recipe: durations, the bench, the files."""

from fractions import Fraction

import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.units import QuantityError
from wavegen.recipe.dump import dump
from wavegen.recipe.format_request import FormatRequest
from wavegen.recipe.load import load_text
from wavegen.recipe.settings import Duration, Extent, Output
from wavegen.recipe.tables import Tables


@pytest.mark.parametrize(
    ("text", "value", "unit"),
    [
        ("10 ms", Fraction(1, 100), "seconds"),
        ("1/3 s", Fraction(1, 3), "seconds"),
        ("140 symbols", Fraction(140), "symbols"),
        ("1 symbol", Fraction(1), "symbols"),
        ("12288 samples", Fraction(12288), "samples"),
        ("1e3 samples", Fraction(1000), "samples"),
        ("2 PRBS periods", Fraction(2), "periods"),
        ("1 prbs period", Fraction(1), "periods"),
    ],
)
def test_a_duration_keeps_its_value_and_unit(text: str, value: Fraction, unit: str) -> None:
    made = Duration.parse(text)
    assert made.at == Extent(value=value, unit=unit)  # type: ignore[arg-type]
    assert (made.multiple, made.least, made.most) == (None, None, None)
    assert Duration.parse(made.text()) == made
    assert str(made.at) == made.text()


def test_a_duration_with_bounds() -> None:
    made = Duration.parse({"at": "10 ms", "multiple": "16 samples", "most": "200 symbols"})
    assert made.multiple == Extent(value=Fraction(16), unit="samples")
    assert made.most == Extent(value=Fraction(200), unit="symbols")
    assert made.text() == {"at": "10 ms", "multiple": "16 samples", "most": "200 symbols"}
    assert Duration.parse(made.text()) == made


@pytest.mark.parametrize(
    ("value", "key"),
    [
        ({"at": "10 ms", "least": "11 ms"}, "at"),
        ({"at": "10 ms", "most": "9 ms"}, "most"),
        ({"at": "10 ms", "least": "9 samples", "most": "8 samples"}, "most"),
        ({"at": "10 ms", "multiple": True}, "multiple"),
        ({"at": None}, "at"),
        ({"at": {"at": "1 ms"}}, "at"),
        (True, ""),
        (10.5, ""),
        ("ten ms", ""),
    ],
)
def test_durations_that_make_no_sense(value: object, key: str) -> None:
    with pytest.raises(QuantityError) as caught:
        Duration.parse(value)
    assert caught.value.key == key
    assert caught.value.remedy


def test_bounds_in_other_units_are_left_to_whoever_knows_the_rate() -> None:
    Duration.parse({"at": "10 ms", "least": "99999999 samples"})


def test_an_output_without_a_word() -> None:
    made = Output()
    assert made.iq == (FormatRequest(format="sigmf", datatype="ci16_le"),)
    assert made.peak_dbfs == -1
    assert made.average_dbfs is None
    assert Output(average_dbfs=-12.0).peak_dbfs is None


def test_files_are_told_apart_by_format_and_name() -> None:
    one = FormatRequest(format="sound", datatype="int16")
    Output(iq=(one, FormatRequest(format="sound", datatype="int16", name="b")))
    Output(iq=(one, FormatRequest(format="pairs", datatype="ci16_le")))
    Output(iq=(one, FormatRequest(format="sound", datatype="float32")))
    Output(iq=(one, FormatRequest(format="sound", datatype="int16", bits=12, align="left")))
    with pytest.raises(QuantityError) as caught:
        Output(iq=(one, FormatRequest(format="sound", datatype="int16", bits=16)))
    assert caught.value.key == "iq[1]"
    with pytest.raises(QuantityError):  # one file on systems that fold case
        Output(
            iq=(
                FormatRequest(format="sound", datatype="int16", name="B"),
                FormatRequest(format="sound", datatype="int16", name="b"),
            )
        )


def test_a_second_channel_loads_and_comes_back(head: str, tables: Tables) -> None:
    text = f"""{head}signal: {{kind: choosy}}
second_channel: {{signal: {{kind: choosy, high: 2}}, stages: [{{kind: ceiling, ceiling: 7 dB}}]}}
"""
    recipe = load_text(text, tables=tables).recipe
    second = recipe.second_channel
    assert second is not None
    assert (second.level_db, len(second.stages)) == (0.0, 1)
    assert load_text(dump(recipe, tables=tables), tables=tables).recipe == recipe
    for wrong in (
        "second_channel: {level: 3 dB}",
        "second_channel: {signal: {kind: choosy}, x: 1}",
    ):
        with pytest.raises(RecipeError):
            load_text(f"{head}signal: {{kind: choosy}}\n{wrong}\n", tables=tables)


@pytest.mark.parametrize("text", ["4 foo bars", "0 PRBS periods", "4 parsecs", "1.5 PRBS periods"])
def test_what_is_no_duration_is_told_how_to_write_one(text):
    with pytest.raises(QuantityError) as caught:
        Extent.parse(text)
    assert "PRBS periods" in caught.value.allowed
    assert "10 ms" in caught.value.remedy
