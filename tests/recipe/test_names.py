"""Names cannot leave their folder."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.core.units import QuantityError
from wavegen.recipe.names import LONGEST, check_name, check_text, check_title


@pytest.mark.parametrize(
    "name",
    [
        "",
        ".",
        "..",
        "...",
        "a/b",
        "/etc/passwd",
        "..\\x",
        "a\0b",
        "a\nb",
        "a\tb",
        " a",
        "a ",
        "a\x1b[31m",
        "a\x85",
        "a\u2028b",
        "a\u202eb",
        "\ud800",
        "x" * (LONGEST + 1),
    ],
)
def test_refused(name: str) -> None:
    with pytest.raises(QuantityError) as caught:
        check_name(name)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("name", ["a", ".hidden", "a..b", "Träger 2 (−3 dB)", "x" * LONGEST])
def test_taken(name: str) -> None:
    check_name(name)


def test_a_title_names_no_file() -> None:
    check_title("")
    check_title("Rate 1/2 at 3.84 Msym/s, C:\\ and ..")
    for wrong in ("a\nb", "a\tb", "x" * (LONGEST + 1), "a\x00"):
        with pytest.raises(QuantityError):
            check_title(wrong)


def test_text_may_have_lines() -> None:
    check_text("a\n\tb/../c")
    with pytest.raises(QuantityError):
        check_text("a\x00")


@given(name=st.text(max_size=20))
def test_what_is_taken_stays_in_its_folder(name: str) -> None:
    try:
        check_name(name)
    except QuantityError:
        return
    assert name not in {"", ".", ".."}
    assert not set(name) & set("/\\\0\n\r\t")
