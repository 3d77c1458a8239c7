"""Plain scalars are what YAML 1.2 says, and old habits are told."""

import pytest

from wavegen.core.units import QuantityError
from wavegen.recipe.reader import read_tree
from wavegen.recipe.scalars import boolean, is_null, kind_of, plain
from wavegen.recipe.tree import Place, Scalar


def scalar(text: str, *, is_plain: bool = True) -> Scalar:
    return Scalar(text, is_plain, Place(1, 1))


@pytest.mark.parametrize(
    ("text", "kind"),
    [
        ("", "null"),
        ("~", "null"),
        ("null", "null"),
        ("true", "bool"),
        ("FALSE", "bool"),
        ("no", "text"),
        ("off", "text"),
        ("12", "int"),
        ("0o14", "int"),
        ("0x1F", "int"),
        ("-1.5e3", "float"),
        (".inf", "float"),
        (".NaN", "float"),
        ("1:30", "text"),
        ("1_000", "text"),
        ("3.84 MHz", "text"),
        ("144/2048", "text"),
    ],
)
def test_core_schema(text: str, kind: str) -> None:
    assert kind_of(scalar(text)) == kind
    assert kind_of(scalar(text, is_plain=False)) == "text"


@pytest.mark.parametrize("text", ["no", "yes", "on", "Off", "n", "0", "1", "", "nein"])
def test_only_true_and_false_are_booleans(text: str) -> None:
    with pytest.raises(QuantityError) as caught:
        boolean(scalar(text))
    meant = {"no": "false", "Off": "false", "n": "false", "yes": "true", "on": "true"}
    if text in meant:
        assert caught.value.remedy == f"Write {meant[text]}."


def test_quoted_true_is_text() -> None:
    assert boolean(scalar("True")) is True
    with pytest.raises(QuantityError):
        boolean(scalar("true", is_plain=False))


def test_plain_values() -> None:
    node, _ = read_tree('[1, -2.5, 1e3, x, "1", ~, false, 6 x 144/2048, {a: [1]}]')
    assert plain(node) == [1, -2.5, 1000.0, "x", "1", None, False, "6 x 144/2048", {"a": [1]}]
    assert [type(item) for item in plain(node)[:3]] == [int, float, float]  # type: ignore[index]
    assert is_null(scalar(""))
    assert not is_null(scalar("", is_plain=False))


@pytest.mark.parametrize(
    "text", [".inf", "-.inf", ".nan", "1e999", "0x1F", "0o17", "010", ".5", "5.", "9" * 5000]
)
def test_plain_refuses_odd_numbers(text: str) -> None:
    node, _ = read_tree(f"[1, {text}]")
    with pytest.raises(QuantityError):
        plain(node)
