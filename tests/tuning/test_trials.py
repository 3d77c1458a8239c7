"""Trials are made once, within the time, and the best of them is found again."""

import pytest

from wavegen.tuning.space import space_of
from wavegen.tuning.trials import OutOfTime, unit_of


def test_each_is_made_once_and_kept(begun, space):
    trials, bench = begun()
    first = trials.evaluate(space, (3,), 6.5)
    assert trials.evaluate(space, (3,), 6.5000001) is first
    assert bench.n == trials.n_made == 1
    again, other = begun()
    assert again.evaluate(space, (3,), 6.5) == first
    assert other.n == 0, "it came from the journal"


def test_the_time_ends_what_is_not_known_yet(begun, space):
    trials, _ = begun(seconds=1.5)
    trials.evaluate(space, (0,), 7.0)
    trials.evaluate(space, (0,), 7.1)  # begun at 1.0 s, over at 2.0 s
    with pytest.raises(OutOfTime):
        trials.evaluate(space, (0,), 7.2)
    assert trials.evaluate(space, (0,), 7.0)
    assert trials.left() == 0
    trials.allow(5.0)
    assert trials.evaluate(space, (0,), 7.2)


def test_the_best_keeps_the_limits_and_costs_few_transforms(begun, space):
    trials, _ = begun()
    for place, ceiling_db in ((3, 6.1), (3, 6.5), (5, 6.11), (0, 5.0)):
        trials.evaluate(space, (place,), ceiling_db)
    best = trials.best("clip_filter", worth=0.03)
    assert trials.place_of(best) == (3,)
    assert best.settings["ceiling_db"] == 6.1
    assert trials.best("clip_filter", guard_db=1.0).settings["ceiling_db"] == 6.5
    assert trials.best("clip") is None


def test_settings_that_do_not_go_together_are_a_failure(begun):
    trials, bench = begun()
    space = space_of("peak_windowing", None, band_hz=1e6, highest_db=11.0)
    wrong = type(space)(
        kind="peak_windowing",
        base=space.base,
        axes=tuple(
            axis
            if axis.field != "window"
            else type(axis)(field="window", values=("hann",), is_ordered=False)
            for axis in space.axes
        ),
        start=space.start,
        low_db=1.0,
        high_db=11.0,
        pairs=0,
    )
    found = trials.evaluate(wrong, (*space.start[:-1], 0), 7.0)
    assert "Hann" in found.fault
    assert bench.n == 0
    assert trials.outcome(found).margin_db < 0


def test_progress_is_told(begun, space):
    told = []
    trials, _ = begun(seconds=10.0)
    trials.progress = lambda *heard: told.append(heard)
    trials.evaluate(space, (3,), 6.5)
    assert told == [("searching: clip_filter, trial 1, 6.53 dB so far", 1000, 10000)]


def test_units(made):
    assert unit_of(made.evaluation()) == "dB"
    assert unit_of(made.evaluation(output_dbm=3.0)) == "dBm"
