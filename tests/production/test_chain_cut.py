"""A chain cut at one place gives what the recipe gives, and whatever else is put there."""

import numpy as np
import pytest

from wavegen.core.render import samples_of
from wavegen.production.chain_cut import crest_place, cut_chain, shelf_of, without_distortion
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text
from wavegen.stages.channel.scale import Scale
from wavegen.stages.crest.clip import Clip

HEAD = "wavegen: 1\nsample_rate: 4 MHz\nduration: 1 ms\nsignal: {kind: noise, bandwidth: 1 MHz}\n"
CHAIN = (
    HEAD
    + """stages:
  - {kind: scale, gain: 1 dB}
  - {kind: clip, ceiling: 6 dB}
  - {kind: resample, input_rate: 2 MHz}
  - {kind: delay, delay: 3 samples}
"""
)
DEVICE = (
    HEAD
    + """stages:
  - {kind: scale, gain: 1 dB}
  - {kind: rapp, input_back_off: 8 dB}
"""
)


def stages(text):
    return load_text(text).recipe.stages


def test_shelves():
    assert [shelf_of(stage) for stage in stages(CHAIN)] == [
        "channel",
        "crest",
        "channel",
        "channel",
    ]
    assert shelf_of(stages(DEVICE)[1]) == "device"


def test_where_peaks_are_reduced():
    assert crest_place(stages(CHAIN)) == (1, True)
    assert crest_place(stages(DEVICE)) == (1, False)
    assert crest_place((Scale(gain_db=1.0),)) == (1, False)
    assert crest_place((Clip(ceiling_db=9.0), Clip(ceiling_db=6.0))) == (1, True)
    assert crest_place(()) == (0, False)


def test_what_distorts_is_left_out():
    assert len(without_distortion(stages(CHAIN))) == 3
    assert without_distortion(stages(DEVICE)) == (Scale(gain_db=1.0),)


def test_the_same_stage_gives_the_same_samples():
    loaded = load_text(CHAIN)
    cut = cut_chain(loaded, index=1, skips=1)
    assert cut.source.sample_rate_hz == 2_000_000
    made, notes = cut.build(loaded.recipe.stages[1])
    whole = prepare(loaded).built.signal
    assert np.array_equal(samples_of(made), samples_of(whole))
    assert notes[0].where == "stages[1].ceiling"
    assert all(note.where.startswith(("stages[1]", "stages[2]")) for note in notes)


@pytest.mark.parametrize("stage", [None, Clip(ceiling_db=4.0)])
def test_another_stage_or_none(stage):
    loaded = load_text(CHAIN)
    made, _ = cut_chain(loaded, index=1, skips=1).build(stage)
    text = "{kind: clip, ceiling: 4 dB}" if stage else "{kind: scale, gain: 0 dB}"
    whole = prepare(load_text(CHAIN, overrides=[f"stages[1]={text}"])).built.signal
    assert np.array_equal(samples_of(made), samples_of(whole))


def test_a_stage_more():
    loaded = load_text(DEVICE)
    cut = cut_chain(loaded, index=1, skips=0)
    assert len(cut.later) == 1
    made, _ = cut.build(Clip(ceiling_db=5.0))
    text = (
        "stages=[{kind: scale, gain: 1 dB}, {kind: clip, ceiling: 5 dB}, "
        "{kind: rapp, input_back_off: 8 dB}]"
    )
    whole = prepare(load_text(HEAD, overrides=[text])).built.signal
    assert np.array_equal(samples_of(made), samples_of(whole))
