"""One method on a bench whose answer is known."""

import math

import pytest

from wavegen.tuning.method_search import MethodSearch
from wavegen.tuning.search import INFEASIBLE, Goal
from wavegen.tuning.space import space_of
from wavegen.tuning.trials import OutOfTime


def search_of(trials, space, **more):
    return MethodSearch(trials=trials, space=space, goal=Goal(), start_db=8.0, **more)


def test_the_ceiling_alone(begun, space):
    trials, bench = begun()
    cost = search_of(trials, space).first()
    best = trials.best("clip_filter", guard_db=Goal().guard_db)
    assert cost == best.cost
    # 8 % at 6 dB and a hundredth more at 8 rounds, 5 dB of EVM a dB of ceiling, 0.1 dB in hand
    assert best.settings["ceiling_db"] == pytest.approx(6.0 + 0.0216 + 0.015, abs=0.01)
    assert bench.n <= 6


def test_all_settings_until_more_saves_too_little(begun, space):
    trials, bench = begun()
    search_of(trials, space).all()
    rounds = [item.settings["rounds"] for item in trials.of("clip_filter")]
    # the level falls by 0.2 dB over the rounds: 8 to 16 saves 0.025 dB, 16 to 32 0.011 dB
    assert trials.best("clip_filter").settings["rounds"] in {16, 32}
    assert 1 not in rounds
    assert bench.n <= 16


def test_what_cannot_win_costs_one_trial(begun, space):
    trials, bench = begun()
    search = search_of(trials, space)
    search.first()
    n = bench.n
    assert search.cost((0,), 5.0) >= INFEASIBLE  # asked to beat what nothing reaches
    assert bench.n == n + 1


def test_the_time_is_over(begun, space):
    trials, _ = begun(seconds=2.5)
    with pytest.raises(OutOfTime):
        search_of(trials, space).all()
    assert len(trials.of("clip_filter")) == 3


def test_a_method_without_a_ceiling_is_asked_once_a_place(begun, made):
    trials, bench = begun()
    bench.try_out = lambda space, stage: made.evaluation(
        method=space.kind, text=str(stage), level_db=9.0 - math.log2(stage.candidates) / 4
    )
    space = space_of("selected_mapping", None, band_hz=1e6, highest_db=11.0)
    search_of(trials, space).all()
    assert trials.best("selected_mapping").level_db == pytest.approx(9 - 5 / 4)


def test_a_valley(begun, space):
    trials, _ = begun()
    search_of(trials, space, is_monotone=False).first()
    assert trials.best("clip_filter").settings["ceiling_db"] == pytest.approx(6.0, abs=0.2)
