import pytest

from wavegen.core.index_set import IndexSet, SymbolSet
from wavegen.core.units import QuantityError


@pytest.mark.parametrize(
    ("value", "indices"),
    [
        ("-2..-1, 1..2", (-2, -1, 1, 2)),
        ("0..9 by 4", (0, 4, 8)),
        (" -3 .. -1 ,+1 .. 5 by 2", (-3, -2, -1, 1, 3, 5)),
        (7, (7,)),
        ([3, -1, "4..5"], (3, -1, 4, 5)),
        ("-21, -7, 7, 21", (-21, -7, 7, 21)),
    ],
)
def test_index_sets_are_read_in_their_order(value, indices) -> None:
    found = IndexSet.parse(value)
    assert found.indices == indices
    assert len(found) == len(indices)
    assert IndexSet.parse(str(found)) == found


@pytest.mark.parametrize(
    "value",
    ["", [], "  ", "5..1", "0..8 by 0", "1-3", "1...3", "1..2000000000", 1.5, True, None, "1,,2"],
)
def test_what_is_no_index_set_is_refused(value) -> None:
    with pytest.raises(QuantityError):
        IndexSet.parse(value)


@pytest.mark.parametrize(
    ("value", "numbers"),
    [("0..13 by 2, 3", (0, 2, 4, 6, 8, 10, 12, 3)), (5, (5,)), ([0, "4..5"], (0, 4, 5))],
)
def test_symbols_are_read_in_the_same_notation(value, numbers) -> None:
    found = SymbolSet.parse(value)
    assert found.numbers == numbers
    assert SymbolSet.parse(str(found)) == found


@pytest.mark.parametrize("value", ["", "-1", "-3..2", "5..1", True, None, 1.5, "1..9999999"])
def test_what_is_no_set_of_symbols_is_refused(value) -> None:
    with pytest.raises(QuantityError) as caught:
        SymbolSet.parse(value)
    assert "subcarrier" not in caught.value.problem + caught.value.allowed + caught.value.remedy


def test_far_indices_are_refused_before_they_are_expanded() -> None:
    with pytest.raises(QuantityError, match="far out"):
        IndexSet.parse("0..999999999")
