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
        ({"format": "sound", "names": "x"}, "names", "Did you mean name?"),
        ({"format": "sound", "name": 3}, "name", "Put the name in quotes."),
        ({"format": "sound", "name": ""}, "name", "Choose a word."),
        ({"format": "sound", "name": "../x"}, "name", "Use a hyphen or a space there."),
    ],
)
def test_what_is_no_request(value: object, key: str, remedy: str) -> None:
    with pytest.raises(QuantityError) as caught:
        FormatRequest.parse(value)
    assert caught.value.key == key
    assert caught.value.remedy == remedy
