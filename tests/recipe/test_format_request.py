"""A format by name, or with its datatype and a file name."""

import pytest

from wavegen.core.units import QuantityError
from wavegen.recipe.format_request import FormatRequest


def test_formats_bring_their_datatype() -> None:
    assert FormatRequest.parse("sound").datatype == "int16"
    assert FormatRequest.parse({"format": "sound", "name": None}).name is None


def test_a_request_is_written_back_as_short_as_it_can_be() -> None:
    assert FormatRequest.parse({"format": "sound", "datatype": "int16"}).text() == "sound"
    made = FormatRequest.parse({"format": "sound", "datatype": "float32", "name": "loud"})
    assert made == FormatRequest(format="sound", datatype="float32", name="loud")
    assert made.text() == {"format": "sound", "datatype": "float32", "name": "loud"}
    assert FormatRequest.parse(made.text()) == made


@pytest.mark.parametrize(
    ("value", "key", "remedy"),
    [
        ("sond", "", "Did you mean sound?"),
        (3, "", "Write pairs."),
        (None, "", "Write pairs."),
        (["sound"], "", "Did you mean sound?"),
        ({"format": True}, "format", "Write pairs."),
        ({"datatype": "int16"}, "format", "Write pairs."),
        ({"format": "sound", "datatype": 16}, "datatype", "Write int16."),
        ({"format": "sound", "datatype": "int61"}, "datatype", "Did you mean int16?"),
        ({"format": "sound", "datatype": "ri16_le"}, "datatype", "Write int16."),
        (
            {"format": "pairs", "datatype": "ri16_le"},
            "datatype",
            "Add real: {centre: 30 MHz}, or write ci16_le.",
        ),
        (
            {"format": "pairs", "datatype": "ci16_le", "real": {"centre": "1 MHz"}},
            "datatype",
            "Write ri16_le.",
        ),
        (
            {"format": "sound", "real": {"centre": "1 MHz"}},
            "real",
            "Choose another format, or leave real out.",
        ),
        ({"format": "pairs", "real": 30}, "real", "Write it like real: {centre: 30 MHz}."),
        ({"format": "pairs", "real": {}}, "real", "Write it like real: {centre: 30 MHz}."),
        ({"format": "pairs", "real": {"centre": "0 Hz"}}, "real.centre", "Write it like 30 MHz."),
        ({"format": "pairs", "bits": 14}, "align", None),
        ({"format": "pairs", "align": "left"}, "align", None),
        ({"format": "pairs", "bits": 14, "align": "middle"}, "align", None),
        ({"format": "pairs", "bits": 14, "align": 3}, "align", None),
        ({"format": "pairs", "bits": 13, "align": "left"}, "bits", None),
        ({"format": "pairs", "bits": "14", "align": "left"}, "bits", "Write bits: 14."),
        ({"format": "pairs", "bits": True, "align": "left"}, "bits", "Write bits: 14."),
        ({"format": "pairs", "datatype": "cf32_le", "bits": 14, "align": "left"}, "bits", None),
        ({"format": "sound", "names": "x"}, "names", "Did you mean name?"),
        ({"format": "sound", "name": 3}, "name", "Put the name in quotes."),
        ({"format": "sound", "name": ""}, "name", "Choose a word."),
        ({"format": "sound", "name": "../x"}, "name", "Use a hyphen or a space there."),
    ],
)
def test_what_is_no_request(value: object, key: str, remedy: str | None) -> None:
    with pytest.raises(QuantityError) as caught:
        FormatRequest.parse(value)
    assert caught.value.key == key
    if remedy is not None:
        assert caught.value.remedy == remedy


@pytest.mark.parametrize("centre", [30, "30", "30 dB", None, ["30 MHz"]])
def test_a_centre_without_its_unit(centre: object) -> None:
    with pytest.raises(QuantityError) as caught:
        FormatRequest.parse({"format": "pairs", "real": {"centre": centre}})
    assert caught.value.key == "real.centre"


def test_words_and_real_samples_are_written_back() -> None:
    made = FormatRequest.parse({"format": "pairs", "bits": 14, "align": "left"})
    assert made.text() == {"format": "pairs", "datatype": "ci16_le", "bits": 14, "align": "left"}
    assert (made.chosen().n_bits, made.chosen().align) == (14, "left")
    real = FormatRequest.parse({"format": "pairs", "real": {"centre": "1625/6 kHz"}})
    assert real.datatype == "ri16_le"
    assert real.text() == {
        "format": "pairs",
        "datatype": "ri16_le",
        "real": {"centre": "1625/6 kHz"},
    }
    for one in (made, real):
        assert FormatRequest.parse(one.text()) == one
