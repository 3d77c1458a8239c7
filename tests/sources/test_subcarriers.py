import numpy as np
import pytest

from wavegen.core.units import QuantityError
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.subcarriers import IndexSet, PilotValues, SymbolSet


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


def test_pilot_values_repeat_and_have_unit_mean_power() -> None:
    values = PilotValues.parse([2, [0, 2], -4]).over(5, np.zeros(5, np.uint8))
    assert np.isclose(np.mean(np.abs(values) ** 2), 1)
    assert np.allclose(values / values[0], [1, 1j, -2, 1, 1j])


def test_drawn_pilots_are_points_of_the_constellation() -> None:
    words = np.array([0, 1, 2, 3, 7, 255], np.uint8)
    pilots = PilotValues.parse({"random": "qpsk"})
    expected = Constellation.parse("qpsk").points[[0, 1, 2, 3, 3, 3]]
    assert np.allclose(pilots.over(6, words), expected)


@pytest.mark.parametrize(
    "value",
    [[], [0, 0], "qpsk", {"random": "qpsk", "x": 1}, {"drawn": "qpsk"}, [[1, 2, 3]], [True], 1],
)
def test_what_gives_no_pilot_values_is_refused(value) -> None:
    with pytest.raises(QuantityError):
        PilotValues.parse(value)


@pytest.mark.parametrize("value", [[float("nan")], [float("inf")], [[1, 1e30]]])
def test_pilot_values_are_finite(value) -> None:
    with pytest.raises(QuantityError):
        PilotValues.parse(value)
