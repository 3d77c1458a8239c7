"""One scalar to one value."""

from fractions import Fraction
from typing import Annotated, Any, Literal

import pytest
from annotated_types import Ge

from wavegen.core.registry import Member
from wavegen.core.units import DIMENSIONS, QuantityError
from wavegen.recipe.settings import Duration
from wavegen.recipe.tables import Tables
from wavegen.recipe.tree import Items, Place, Scalar, Table
from wavegen.recipe.values import describe_node, example_of, read_number, read_text, wanted

HERE = Place(1, 1)


def scalar(text: str, *, is_plain: bool = True) -> Scalar:
    return Scalar(text, is_plain, HERE)


@pytest.mark.parametrize(
    ("text", "hint", "suffix", "value"),
    [
        ("1/3", Fraction, None, Fraction(1, 3)),
        ("0.1", Fraction, None, Fraction(1, 10)),
        ("0.1", float, None, 0.1),
        ("1e3", int, None, 1000),
        ("16 samples", int, "_samples", 16),
        ("0.1 kHz", Fraction, "_hz", Fraction(100)),
        ("144/2048", Fraction, "_fraction", Fraction(9, 128)),
        ("-0.5 dB", float, "_db", -0.5),
    ],
)
def test_numbers(text: str, hint: type, suffix: str | None, value: object) -> None:
    made = read_number(scalar(text), hint, DIMENSIONS[suffix] if suffix else None)
    assert made == value
    assert type(made) is hint


@pytest.mark.parametrize(
    ("node", "hint", "suffix"),
    [
        (scalar("true"), float, None),
        (scalar("true"), float, "_db"),
        (scalar("3", is_plain=False), float, None),
        (scalar("3", is_plain=False), Fraction, "_fraction"),
        (scalar("3 dB"), float, None),
        (scalar("3"), float, "_db"),
        (scalar("1.5 samples"), int, "_samples"),
        (scalar("1/2"), int, None),
        (scalar(".inf"), float, None),
        (scalar("-.inf dB"), float, "_db"),
        (scalar("nan"), float, None),
        (scalar("1e400"), float, None),
        (scalar(""), float, None),
    ],
)
def test_no_numbers(node: Scalar, hint: type, suffix: str | None) -> None:
    with pytest.raises(QuantityError):
        read_number(node, hint, DIMENSIONS[suffix] if suffix else None)


def test_text() -> None:
    assert read_text(scalar("no"), "note") == "no"
    assert read_text(scalar("12", is_plain=False), "note") == "12"
    assert read_text(scalar("../taps.csv"), "path") == "../taps.csv"
    for node, field in [
        (scalar("12"), "note"),
        (scalar("1.5"), "note"),
        (scalar("false"), "note"),
        (scalar("../x"), "name"),
        (scalar("a/b"), "share"),
        (scalar("a\nb", is_plain=False), "title"),
        (scalar("", is_plain=False), "name"),
        (scalar("a\0b", is_plain=False), "path"),
    ]:
        with pytest.raises(QuantityError):
            read_text(node, field)


def test_words() -> None:
    assert describe_node(scalar("x")) == "'x'"
    assert describe_node(scalar("")) == "nothing"
    assert describe_node(Items((scalar("x"),), HERE)) == "a list of 1"
    assert describe_node(Table((), HERE)) == "a mapping"
    assert len(describe_node(scalar("x" * 9999))) < 80


@pytest.mark.parametrize(
    ("hint", "suffix", "words", "example"),
    [
        (Annotated[float, Ge(0)], "_db", "a number with a unit, such as -3 dB", "-3 dB"),
        (Fraction, None, "a number or a ratio", "13/48"),
        (int, None, "a whole number", "12"),
        (Literal["a", "b"], None, "a, b", "a"),
        (tuple[float, ...], None, "a list", "[0.22]"),
        (Duration, None, "a value", "10 ms"),
    ],
)
def test_what_a_type_wants(hint: Any, suffix: str | None, words: str, example: str) -> None:
    dimension = DIMENSIONS[suffix] if suffix else None
    assert wanted(hint, dimension) == words
    assert example_of(hint, dimension) == example


def test_a_member_shows_its_first_kind(tables: Tables) -> None:
    assert example_of(Annotated[Any, Member(("pulse",))], None, tables) == "{kind: round}"
