"""The projection at an EVM: found, refined while there is time, carried over to near EVMs."""

import math

import pytest

from wavegen.recipe.dump import stage_text
from wavegen.tuning.reference import Reference, find_reference
from wavegen.tuning.space import space_of


@pytest.fixture
def projected(begun, made):
    def projected(seconds=1000.0):
        trials, bench = begun(seconds=seconds)

        def try_out(space, stage):
            bench.n += 1
            bench.clock += 1.0
            better = math.log2(stage.rounds) / 10
            percent = 8 * 10 ** ((6.0 - stage.ceiling_db - better) * 6 / 20)
            return made.evaluation(
                method=space.kind, text=stage_text(stage), settings=space.told(stage),
                level_db=stage.ceiling_db, percent=percent,
            )  # fmt: skip

        bench.try_out = try_out
        return trials, bench, space_of("projection", None, band_hz=1e6, highest_db=11.0)

    return projected


def test_the_evm_is_met_with_the_most_rounds(projected):
    trials, bench, space = projected()
    found = find_reference(trials, space, evm_percent=6.0, start_db=7.0)
    most = space.axes[0].values[-1]
    assert found.evaluation.settings["rounds"] == most
    exact = 6.0 - math.log2(most) / 10 + 20 / 6 * math.log10(8 / 6)
    assert found.level_db(6.0) == pytest.approx(exact, abs=0.001)
    assert bench.n <= 12


def test_near_evms_follow_the_slope_and_far_ones_have_none(projected):
    trials, _, space = projected()
    found = find_reference(trials, space, evm_percent=6.0, start_db=7.0)
    apart = found.level_db(5.7) - found.level_db(6.0)
    assert apart == pytest.approx(20 / 6 * math.log10(6 / 5.7), abs=0.01)
    assert found.level_db(4.0) is None
    assert found.level_db(0.0) is None


def test_few_rounds_are_better_than_none(projected):
    trials, _, space = projected(seconds=1.5)
    found = find_reference(trials, space, evm_percent=6.0, start_db=7.0)
    assert found.evaluation.settings["rounds"] == space.axes[0].values[space.start[0]]


def test_no_time_no_reference(projected):
    trials, _, space = projected(seconds=0.0)
    assert find_reference(trials, space, evm_percent=6.0, start_db=7.0) is None


def test_json(made):
    assert Reference(evaluation=made.evaluation()).row()["level_db"] == 6.0
