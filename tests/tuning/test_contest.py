"""Several methods against each other."""

import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.tuning.contest import Contest, chosen_kinds, refuse_unsuited
from wavegen.tuning.search import Goal
from wavegen.tuning.space import REFERENCE, space_of

SIGNAL = {"band_hz": 1e6, "highest_db": 11.0}


def test_all_but_the_reference_unless_asked_for():
    assert REFERENCE not in chosen_kinds(())
    assert {"clip", "clip_filter", "peak_windowing"} <= set(chosen_kinds(()))
    assert chosen_kinds(("projection", "clip", "projection")) == ("projection", "clip")
    with pytest.raises(ArgumentsError) as refused:
        chosen_kinds(("clipfilter",))
    assert "clip_filter" in refused.value.remedy


def contest_of(trials, *kinds):
    spaces = {kind: space_of(kind, None, **SIGNAL) for kind in kinds}
    return Contest(trials=trials, spaces=spaces, goal=Goal())


def test_the_best_comes_first_and_what_cannot_be_used_last(begun, made):
    trials, bench = begun()
    plain = bench.try_out

    def try_out(space, stage):
        if space.kind == "clip":
            return made.evaluation(
                method="clip", text=str(stage), settings={}, fault="it cannot be so"
            )
        return plain(space, stage)

    bench.try_out = try_out
    contest = contest_of(trials, "clip", "tone_reservation", "clip_filter")
    results = contest.run(made.evaluation(level_db=9.5, percent=0.0), share=1.0)
    assert results[0].kind == "clip_filter"
    states = {item.kind: item.state for item in results}
    assert states == {"clip": "unsuited", "tone_reservation": "unsuited", "clip_filter": "kept"}
    assert results[0].best.settings["rounds"] > 8
    stage = contest.stage_of(results[0].best)
    assert stage.ceiling_db == results[0].best.settings["ceiling_db"]


def test_the_time_is_over_before_anything_is_kept(begun, made):
    trials, _ = begun(seconds=0.5)
    results = contest_of(trials, "clip_filter").run(made.evaluation(level_db=13.0), share=1.0)
    assert results[0].state in {"kept", "unfinished"}
    trials, _ = begun(seconds=0.0)
    results = contest_of(trials, "clip_filter").run(made.evaluation(level_db=8.0), share=1.0)
    assert results[0].state == "unfinished"
    assert results[0].best is None


def test_a_signal_that_misses_as_it_is_is_not_searched_long(begun, made):
    trials, bench = begun()
    bench.try_out = lambda space, stage: made.evaluation(
        method=space.kind, text=str(stage), settings=space.told(stage), percent=9.0,
        level_db=stage.ceiling_db,
    )  # fmt: skip
    results = contest_of(trials, "clip_filter").run(
        made.evaluation(level_db=9.5, percent=9.0), share=1.0
    )
    assert results[0].state == "missed"
    assert {item.settings["rounds"] for item in trials.of("clip_filter")} == {8}


def test_more_margin_in_hand(begun, made):
    trials, _ = begun()
    contest = contest_of(trials, "clip_filter")
    (result,) = contest.run(made.evaluation(level_db=9.5, percent=0.0), share=1.0)
    tighter = contest.tighten(result.best, guard_db=1.0, seconds=10.0)
    assert 1.0 <= trials.limits.margin_db(tighter) <= 1.1
    assert tighter.settings["rounds"] == result.best.settings["rounds"]


def test_methods_of_which_none_can_be_tried_are_refused():
    refuse_unsuited({"tone_reservation": "no tones", "clip": space_of("clip", None, **SIGNAL)})
    with pytest.raises(ArgumentsError) as refused:
        refuse_unsuited({"tone_reservation": "no tones"})
    assert "tone_reservation cannot be searched on this recipe: no tones" in refused.value.problem
