"""What goes wrong at a bench, by hand."""

import pytest

from wavegen.production.bench import generator_level, path_levels
from wavegen.production.bench_mistakes import SheetFacts, edges, mistakes
from wavegen.recipe.bench import Bench, PathStage

BENCH = Bench(
    average_power_at_device_dbm=0.0,
    path=(
        PathStage(name="cable", gain_db=-2.0, average_limit_dbm=11.0, peak_limit_dbm=14.0),
        PathStage(name="amplifier", role="device", gain_db=20.0, peak_limit_dbm=10.5),
    ),
)
PAPR_DB = 10.0
FACTS = SheetFacts(
    longest_burst_s=None,
    first_sample_db=None,
    last_sample_db=-6.0,
    bandwidth_hz=1e6,
    unreduced_papr_db=12.5,
)


def levels():
    found = path_levels(BENCH, PAPR_DB)
    return [generator_level(BENCH, found), *found]


def test_each_mistake_and_what_it_exceeds():
    """Cable: 2 dBm average, 12 dBm peak; amplifier: 0 and 10 dBm."""
    confused, unreduced, highest, last = mistakes(FACTS, levels(), 0.0, 11.0)
    assert (confused["average_dbm"], confused["peak_envelope_dbm"]) == pytest.approx((11, 21))
    assert confused["exceeds"] == [
        "cable.average_limit",  # 13 > 11
        "cable.peak_limit",  # 23 > 14
        "amplifier.peak_limit",  # 21 > 10.5
    ]
    assert unreduced["average_dbm"] == pytest.approx(0)
    assert unreduced["over_peak_db"] == pytest.approx(2.5)
    assert unreduced["exceeds"] == ["cable.peak_limit", "amplifier.peak_limit"]  # 14.5, 12.5
    # a carrier at the peak: its average is 10 dB higher, 12 dBm at the cable
    assert highest["over_average_db"] == pytest.approx(10)
    assert highest["exceeds"] == ["cable.average_limit"]
    assert last["average_dbm"] == pytest.approx(-6)
    assert last["exceeds"] == []


def test_a_signal_without_reduction_that_ends_at_nothing():
    quiet = SheetFacts(
        longest_burst_s=None,
        first_sample_db=1.0,
        last_sample_db=None,
        bandwidth_hz=1e6,
        unreduced_papr_db=None,
    )
    assert len(mistakes(quiet, levels(), 0.0, 11.0)) == 2
    assert edges(quiet, path_levels(BENCH, PAPR_DB), 0.0) == {
        "first_dbm": pytest.approx(1.0),
        "last_dbm": None,
    }


def test_an_average_over_bursts_is_not_that_of_the_period():
    """Of a burst that is on for a quarter, samples are told over a period 6 dB lower."""
    found = edges(FACTS, path_levels(BENCH, PAPR_DB), 6.0)
    assert found["last_dbm"] == pytest.approx(-12)
