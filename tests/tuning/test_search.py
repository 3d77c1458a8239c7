"""The search on functions whose answer is known."""

import math

import pytest

from wavegen.tuning.search import (
    Goal,
    Outcome,
    descend,
    least_cost,
    lowest_ceiling,
)

GOAL = Goal()


class Counted:
    """A function that remembers where it was asked."""

    def __init__(self, function):
        self.function = function
        self.asked = []

    def __call__(self, at):
        self.asked.append(at)
        return self.function(at)


def margin_of(slope, root, curve=0.0):
    """Margin of a limit that is met at ``root``; the cost is the ceiling itself."""
    return lambda at: Outcome(cost=at, margin_db=slope * (at - root) + curve * (at - root) ** 2)


@pytest.mark.parametrize("start", [1.0, 5.0, 6.8, 9.0, 12.0])
@pytest.mark.parametrize("slope", [1.5, 5.0, 15.0])
def test_a_root_is_found_with_the_margin_in_hand(start, slope):
    trial = Counted(margin_of(slope, 6.5, slope / 20))
    found = lowest_ceiling(trial, low=1.0, high=12.0, start=start, goal=GOAL)
    assert GOAL.guard_db <= found.margin_db <= GOAL.guard_db + GOAL.width_db + 1e-9
    assert len(trial.asked) <= 9


def test_a_step_in_the_margin_is_closed_in_on():
    trial = Counted(lambda at: Outcome(cost=at, margin_db=1.0 if at > 7.123 else -3.0))
    found = lowest_ceiling(trial, low=1.0, high=12.0, start=6.0, goal=GOAL)
    assert 7.123 < found.cost < 7.2
    assert len(trial.asked) <= 14


def test_failures_count_as_far_below():
    def function(at):
        return Outcome(cost=at, margin_db=-math.inf if at < 4 else 5 * (at - 6.0))

    found = lowest_ceiling(function, low=1.0, high=12.0, start=1.5, goal=GOAL)
    assert found.cost == pytest.approx(6.015, abs=0.01)


def test_what_is_never_kept_ends_at_the_upper_bound():
    trial = Counted(lambda at: Outcome(cost=at, margin_db=-1.0))
    assert lowest_ceiling(trial, low=1.0, high=12.0, start=6.0, goal=GOAL) is None
    assert max(trial.asked) == 12.0


def test_what_is_always_kept_ends_at_the_lower_bound():
    trial = Counted(lambda at: Outcome(cost=at, margin_db=20.0))
    assert lowest_ceiling(trial, low=1.0, high=12.0, start=6.0, goal=GOAL).cost == 1.0


def test_nothing_that_cannot_win_is_gone_on_with():
    trial = Counted(margin_of(5.0, 6.5))
    assert lowest_ceiling(trial, low=1, high=12, start=6.4, goal=GOAL, beat=6.0) is None
    assert trial.asked == [6.4]  # misses its limits, and costs more already


def test_a_valley_is_walked_down():
    trial = Counted(lambda at: Outcome(cost=(at - 5.3) ** 2, margin_db=1.0))
    found = least_cost(trial, low=1.0, high=12.0, start=8.0, goal=GOAL)
    assert found.cost <= 0.1**2 + 1e-9


def test_a_valley_that_keeps_no_limit_has_no_answer():
    found = least_cost(
        lambda at: Outcome(cost=at, margin_db=-1.0), low=1, high=12, start=8, goal=GOAL
    )
    assert found is None


def grid_cost(index, _beat):
    place, kind = index
    return abs(place - 4) + (0.5 if kind == 0 else 0.0 if kind == 2 else 2.0)


def test_steps_along_ordered_settings_and_every_value_of_others():
    found = descend(grid_cost, start=(0, 0), sizes=[7, 3], is_ordered=[True, False], gain=0.01)
    assert found == (4, 2)


def test_a_gain_too_small_is_not_worth_a_step():
    found = descend(grid_cost, start=(0, 0), sizes=[7, 3], is_ordered=[True, False], gain=0.6)
    assert found == (4, 0)


def test_each_place_is_asked_once():
    asked = []

    def cost(index, beat):
        asked.append(index)
        return grid_cost(index, beat)

    descend(cost, start=(6, 1), sizes=[7, 3], is_ordered=[True, False], gain=0.01)
    assert len(asked) == len(set(asked))


def test_no_settings_at_all():
    assert descend(lambda *_: 1.0, start=(), sizes=[], is_ordered=[], gain=0.1) == ()
