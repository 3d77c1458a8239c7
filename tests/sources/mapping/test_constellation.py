import pickle

import numpy as np
import pytest

from wavegen.core.units import QuantityError
from wavegen.sources.mapping import MAPPINGS
from wavegen.sources.mapping.constellation import Constellation


@pytest.mark.parametrize("name", MAPPINGS)
def test_every_mapping_has_its_name_unit_power_zero_mean_and_distinct_points(name):
    made = Constellation.parse(name)
    assert made.name == name
    assert made.points.dtype == np.complex128
    assert made.points.size == 1 << made.n_bits
    assert np.mean(np.abs(made.points) ** 2) == pytest.approx(1.0, abs=1e-12)
    assert np.mean(made.points) == pytest.approx(0.0, abs=1e-12)
    assert np.unique(made.points.round(9)).size == made.points.size


@pytest.mark.parametrize("name", MAPPINGS)
def test_the_wide_table_repeats_the_points(name):
    made = Constellation.parse(name)
    words = np.arange(made.wide.size)
    expected = made.points[words % made.points.size].astype(np.complex64)
    assert np.array_equal(made.wide, expected)
    assert made.wide.size == (256 if made.n_bits <= 8 else 65536)


def test_points_on_any_scale():
    made = Constellation.parse([[3, 3], [-3, 3], [-3, -3], [3, -3]])
    assert made.points == pytest.approx(np.array([1 + 1j, -1 + 1j, -1 - 1j, 1 - 1j]) / np.sqrt(2))
    assert (made.name, made.n_bits) == ("points", 2)


def test_a_misspelt_name_gets_the_nearest():
    with pytest.raises(QuantityError, match="unknown constellation '16qan'") as caught:
        Constellation.parse("16qan")
    assert "16qam" in caught.value.remedy


@pytest.mark.parametrize(
    "value",
    [
        [],
        [[1, 1]],
        [[1, 1], [2, 2], [3, 3]],
        [[0, 0], [0, 0]],
        [[1, float("nan")], [0, 1]],
        [[1, 2, 3], [1, 2, 3]],
        [1, 2],
        [["1", "x"], ["2", "3"]],
        None,
        7,
    ],
)
def test_what_makes_no_constellation(value):
    with pytest.raises(QuantityError):
        Constellation.parse(value)


def test_a_worker_gets_the_points_alone():
    made = Constellation.parse("4096qam")
    assert made.wide.size == 65536
    packed = pickle.dumps(made)
    assert len(packed) < 70_000
    assert np.array_equal(pickle.loads(packed).wide, made.wide)  # noqa: S301 - our own bytes
