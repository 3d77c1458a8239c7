import numpy as np
import pytest

from wavegen.core.units import QuantityError
from wavegen.sources.mapping.constellation import Constellation
from wavegen.sources.subcarriers import PilotValues


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
