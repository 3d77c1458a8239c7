from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.units import QuantityError
from wavegen.sources.rotation import Rotation


@pytest.mark.parametrize(
    ("value", "turns", "text"),
    [
        ("pi/4", Fraction(1, 8), "pi/4"),
        ("3 pi/8", Fraction(3, 16), "3 pi/8"),
        ("3pi / 8", Fraction(3, 16), "3 pi/8"),
        ("3*pi/8", Fraction(3, 16), "3 pi/8"),
        ("-pi/2", Fraction(-1, 4), "-pi/2"),
        ("3 pi/2", Fraction(-1, 4), "-pi/2"),
        ("-pi", Fraction(1, 2), "pi"),
        ("2 pi", Fraction(0), "0"),
        ("45 deg", Fraction(1, 8), "pi/4"),
        ("67.5 °", Fraction(3, 16), "3 pi/8"),
        (0, Fraction(0), "0"),
        ("0", Fraction(0), "0"),
    ],
)
def test_rotations_are_read_and_written(value, turns, text) -> None:
    found = Rotation.parse(value)
    assert found.turns == turns
    assert str(found) == text
    assert Rotation.parse(text) == found


@pytest.mark.parametrize(
    "value",
    [
        "",
        "pi/0",
        "1/4",
        0.25,
        90,
        "pi/4 deg",
        "pie",
        True,
        None,
        [0],
        "0.001 deg",
        "pi/99999",
        "3.7 pi/8",
    ],
)
def test_what_is_no_rotation_is_refused(value) -> None:
    with pytest.raises(QuantityError) as caught:
        Rotation.parse(value)
    assert "3 pi/8" in caught.value.remedy  # one of its own kind, no frequency


@pytest.mark.parametrize("text", ["pi/4", "3 pi/8", "-pi/3", "pi", "0", "7 pi/9"])
def test_factors_stand_at_multiples_of_the_angle(text) -> None:
    rotation = Rotation.parse(text)
    expected = np.exp(2j * np.pi * float(rotation.turns) * np.arange(100))
    # complex128: 100 angles of up to 2 pi, each good to a few times 2e-16 of its size
    assert np.allclose(rotation.over(100), expected, rtol=0, atol=1e-12)
    assert np.array_equal(
        rotation.over(3 * rotation.period)[rotation.period :][:5],
        rotation.over(2 * rotation.period)[:5],
    )


def test_quarter_turns_are_exact() -> None:
    assert Rotation.parse("pi/2").over(5).tolist() == [1, 1j, -1, -1j, 1]
    assert Rotation.parse("-pi/2").over(5).tolist() == [1, -1j, -1, 1j, 1]
