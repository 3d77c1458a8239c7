import numpy as np
import pytest

from wavegen.core.units import QuantityError
from wavegen.sources.mapping.apsk import RATIOS_16, RATIOS_32, TABLES, rated_apsk
from wavegen.sources.mapping.constellation import Constellation


@pytest.mark.parametrize(
    ("name", "rate"),
    [("16apsk", rate) for rate in RATIOS_16] + [("32apsk", rate) for rate in RATIOS_32],
)
def test_named_with_a_code_rate(name, rate):
    made = Constellation.parse(f"{name} {rate}")
    assert made == rated_apsk(name, rate)
    assert np.mean(np.abs(made.points) ** 2) == pytest.approx(1, rel=1e-14)
    assert np.unique(made.points.round(9)).size == made.points.size
    assert abs(made.points.mean()) < 1e-12
    assert Constellation.parse(made.text()) == made


def test_the_name_alone_is_rate_3_4():
    assert Constellation.parse("32apsk") == Constellation.parse("32apsk 3/4")


@pytest.mark.parametrize("name", TABLES)
def test_tables_number_every_point_of_every_ring(name):
    _, rings, degrees = TABLES[name]
    assert sorted(rings) == sorted([0] * 4 + [1] * 12 + [2] * (len(rings) - 16))
    assert len(set(zip(rings, degrees, strict=True))) == len(rings)


@pytest.mark.parametrize("name", ["16apsk 3/5", "16apsk x", "32apsk 2/3", "16apsk "])
def test_unknown_code_rates(name):
    with pytest.raises(QuantityError) as caught:
        Constellation.parse(name)
    assert "9/10" in caught.value.allowed


def test_rings_are_the_named_constellation_in_another_order():
    value = {"rings": [4, 12], "ratios": [2.85], "phases": ["45 deg", "15 deg"]}
    made = Constellation.parse(value)
    named = Constellation.parse("16apsk")
    order = np.lexsort
    one, other = (
        c.points[order((c.points.imag.round(9), c.points.real.round(9)))] for c in (made, named)
    )
    assert one == pytest.approx(other, abs=1e-12)
    assert made.text() == value
    assert Constellation.parse(made.text()) == made


def test_phases_are_half_a_step_unless_given():
    given = {"rings": [4, 12], "ratios": [2.85], "phases": ["45 deg", "15 deg"]}
    short = {"rings": [4, 12], "ratios": [2.85]}
    assert np.array_equal(Constellation.parse(given).points, Constellation.parse(short).points)
    assert Constellation.parse({"rings": [8]}).points.size == 8


@pytest.mark.parametrize(
    ("value", "key"),
    [
        ({}, "rings"),
        ({"rings": [4, 11], "ratios": [2]}, "rings"),
        ({"rings": [4, -4, 16]}, "rings"),
        ({"rings": [4, 12.0], "ratios": [2]}, "rings"),
        ({"rings": 16}, "rings"),
        ({"rings": [True, 1]}, "rings"),
        ({"rings": [1 << 17]}, "rings"),
        ({"rings": [4, 12]}, "ratios"),
        ({"rings": [4, 12], "ratios": [0.5]}, "ratios"),
        ({"rings": [4, 12], "ratios": [2, 3]}, "ratios"),
        ({"rings": [4, 12, 16], "ratios": [5, 3]}, "ratios"),
        ({"rings": [4, 12], "ratios": ["x"]}, "ratios"),
        ({"rings": [4, 12], "ratios": 2.85}, "ratios"),
        ({"rings": [4, 12], "ratios": [2.85], "phases": ["45 deg"]}, "phases"),
        ({"rings": [4, 12], "ratios": [2.85], "phases": [45, 15]}, "phases"),
        ({"rings": [4], "phase": ["45 deg"]}, "phase"),
    ],
)
def test_refused(value, key):
    with pytest.raises(QuantityError) as caught:
        Constellation.parse(value)
    assert caught.value.key == key
