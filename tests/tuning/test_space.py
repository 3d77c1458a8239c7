"""What may be set of a method."""

from fractions import Fraction

import pytest

from wavegen.core.timespan import TimeSpan
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.stages.crest.peak_windowing import PeakWindowing
from wavegen.stages.passband import Passband
from wavegen.tuning.space import searchable_kinds, space_of

BAND = {"band_hz": 10e6, "highest_db": 11.0}


def test_the_ceiling_ends_at_the_peak_of_the_signal():
    space = space_of("clip", None, **BAND)
    assert (space.low_db, space.high_db) == (1.0, pytest.approx(11.1))
    assert space.stage((), 6.54321).ceiling_db == 6.543


def test_other_settings_begin_at_their_defaults():
    space = space_of("clip_filter", None, **BAND)
    (rounds,) = space.axes
    assert rounds.values[space.start[0]] == ClipFilter(ceiling_db=7.0).rounds
    stage = space.stage((0,), 7.0)
    assert stage == ClipFilter(ceiling_db=7.0, rounds=1)
    assert space.told(stage) == {"ceiling_db": 7.0, "rounds": 1}
    assert space.pairs_of(stage) == 1


def test_what_the_recipe_has_is_kept_and_stands_among_the_values():
    band = (Passband(low_hz=Fraction(-5), high_hz=Fraction(5)),)
    present = ClipFilter(ceiling_db=6.0, rounds=6, passbands=band)
    space = space_of("clip_filter", present, **BAND)
    assert space.axes[0].values == (1, 2, 4, 6, 8, 16, 32)
    assert space.start == (3,)
    assert space.stage((0,), 7.0).passbands == band


def test_lengths_follow_the_band():
    space = space_of("peak_windowing", None, **BAND)
    axes = {axis.field: axis.values for axis in space.axes}
    assert TimeSpan(Fraction(2, 10_000_000), "s") in axes["length"]
    stage = space.stage(space.start, 7.0)
    assert isinstance(stage, PeakWindowing)
    assert space.told(stage)["length"].endswith("s")
    assert stage.suppression_db == 50.0


def test_a_method_without_a_ceiling():
    assert "selected_mapping" in searchable_kinds()
    space = space_of("selected_mapping", None, **BAND)
    assert not space.has_ceiling
    assert "ceiling_db" not in space.told(space.stage(space.start))


def test_settings_that_a_search_cannot_choose():
    assert "tone_reservation" in searchable_kinds()
    why = space_of("tone_reservation", None, **BAND)
    assert isinstance(why, str)
    assert "recipe" in why
