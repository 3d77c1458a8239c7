"""What a rig measures of settings is what the recipe with these settings measures."""

import pytest

from wavegen.production.chain_cut import crest_place
from wavegen.production.fidelity import FidelityRequest, recipe_fidelity
from wavegen.production.figures import measure_figures
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text
from wavegen.stages.crest.clip import Clip
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.tuning.rig import set_up
from wavegen.tuning.space import space_of

NOISE = """wavegen: 1
sample_rate: 8 MHz
duration: 8 ms
signal: {kind: noise, bandwidth: 1 MHz}
"""


def rig_of(text, folder, **more):
    loaded = load_text(text)
    place = crest_place(loaded.recipe.stages)
    return set_up(
        loaded, FidelityRequest(), place=place, probability=1e-3, folder=folder, workers=2, **more
    )


def space(kind):
    return space_of(kind, None, band_hz=1e6, highest_db=11.0)


def test_the_figures_are_those_of_the_recipe(tmp_path, made):
    with rig_of(made.CELL, tmp_path) as rig:
        before = rig.untouched()
        after = rig.try_out(space("clip_filter"), ClipFilter(ceiling_db=6.0, rounds=4))
    text = made.CELL + "stages: [{kind: clip_filter, ceiling: 6 dB, rounds: 4}]\n"
    found = recipe_fidelity(load_text(text))
    assert before.level_db == pytest.approx(found.before.level_db(1e-3), abs=1e-5)
    assert before.evm_percent < 0.01
    assert after.level_db == pytest.approx(found.after.level_db(1e-3), abs=1e-5)
    assert after.evm_percent == pytest.approx(found.after.fidelity.evm[0].percent, abs=1e-5)
    assert after.aclr_db == pytest.approx(found.after.fidelity.aclr.worst_db, abs=1e-4)
    assert (after.method, after.pairs) == ("clip_filter", 4.0)
    assert after.text == "{kind: clip_filter, ceiling: 6 dB, rounds: 4}"
    assert after.settings == {"ceiling_db": 6.0, "rounds": 4}
    assert [item.name for item in after.evm] == ["all", "groups[0]"]


def test_a_stage_that_is_there_is_exchanged_and_what_follows_stays(tmp_path, made):
    text = made.CELL + "stages: [{kind: clip, ceiling: 4 dB}, {kind: rapp, input_back_off: 9 dB}]\n"
    with rig_of(text, tmp_path) as rig:
        found = rig.try_out(space("clip"), Clip(ceiling_db=7.0))
    other = prepare(load_text(text, overrides=["stages[0].ceiling=7 dB"])).built.signal
    power = measure_figures(other, settings=rig.plan.settings)
    assert found.level_db == pytest.approx(power.level_db(1e-3), abs=1e-5)


def test_without_symbols_the_error_of_the_waveform(tmp_path):
    with rig_of(NOISE, tmp_path) as rig:
        assert rig.untouched().evm_percent < 0.01
        found = rig.try_out(space("clip"), Clip(ceiling_db=5.0))
    assert [item.source for item in found.evm] == ["waveform"]
    assert found.evm_percent > 1


def test_what_cannot_be_built_is_a_failure_with_its_reason(tmp_path):
    with rig_of(NOISE, tmp_path) as rig:
        known = space("selected_mapping")
        found = rig.try_out(known, known.stage(known.start))
    assert "OFDM" in found.fault
    assert found.evm == ()


def test_settings_on_other_data(tmp_path, made):
    stage = ClipFilter(ceiling_db=6.0, rounds=2)
    with rig_of(made.CELL, tmp_path) as rig:
        found = rig.try_out(space("clip_filter"), stage)
        same, figures = rig.repeat(found, stage)
    assert same == found
    assert figures.level_db(1e-3) == pytest.approx(found.level_db, abs=1e-5)
    with rig_of(made.CELL.replace("seed: 5", "seed: 6"), tmp_path) as rig:
        other, _ = rig.repeat(found, stage)
    assert other != found
    assert other.evm_percent == pytest.approx(found.evm_percent, rel=0.1)
