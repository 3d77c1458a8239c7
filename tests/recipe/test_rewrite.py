"""Values are set in a recipe's text, and everything a person wrote around them stays."""

from fractions import Fraction

import pytest

from wavegen.core.timespan import TimeSpan
from wavegen.recipe.dump import stage_text
from wavegen.recipe.find import shipped_recipes
from wavegen.recipe.load import load_text
from wavegen.recipe.rewrite import insert_stage, replace_stage, rewrite
from wavegen.stages.channel.scale import Scale
from wavegen.stages.crest.clip import Clip
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.stages.crest.peak_windowing import PeakWindowing

TEXT = """# For the acceptance of the pier link.
wavegen: 1
title: "Pier link"   # quoted on purpose

seed: 3
sample_rate: 4 MHz
duration: 2 ms
signal: {kind: tones, count: 8, spacing: 10 kHz, phases: newman}  # eight tones
stages:
  - {kind: scale, gain: 1 dB}   # cable
  # the ceiling of last week
  - kind: clip_filter
    ceiling: 7.50 dB   # agreed with the laboratory
    rounds: 2
# end
"""


def test_one_value_changes_one_line():
    made = rewrite(TEXT, ["stages[1].ceiling=6.8 dB"]).splitlines()
    changed = [(a, b) for a, b in zip(TEXT.splitlines(), made, strict=True) if a != b]
    assert changed == [
        (
            "    ceiling: 7.50 dB   # agreed with the laboratory",
            "    ceiling: 6.8 dB    # agreed with the laboratory",
        )
    ]


def test_nothing_set_changes_nothing():
    assert rewrite(TEXT, []) == TEXT


@pytest.mark.parametrize("path", [path for _, _, path in shipped_recipes()], ids=lambda p: p.stem)
def test_shipped_recipes_survive(path):
    text = path.read_text(encoding="utf-8")
    made = rewrite(text, ["seed=77"]).splitlines()
    assert [line for line in text.splitlines() if not line.startswith("seed:")] == (
        [line for line in made if line != "seed: 77"]
    )


def test_overrides_are_what_set_does():
    overrides = [
        "title=Quay",
        "bench={average_power_at_device: 0 dBm, path: [{name: a, role: device}]}",
        "output.peak=-3 dBFS",
        "stages[2]={kind: clip, ceiling: 9 dB}",
    ]
    made = rewrite(TEXT, overrides)
    assert load_text(made).recipe == load_text(TEXT, overrides=overrides).recipe
    assert "# eight tones" in made


def test_the_same_method_keeps_its_comments():
    old = load_text(TEXT).recipe.stages[1]
    new = ClipFilter(ceiling_db=6.125, rounds=16)
    made = replace_stage(TEXT, 1, old, new)
    assert load_text(made).recipe.stages == (Scale(gain_db=1.0), new)
    for comment in (
        "# cable",
        "# the ceiling of last week",
        "# agreed with the laboratory",
        "# end",
    ):
        assert comment in made


def test_another_method_takes_the_place():
    old = load_text(TEXT).recipe.stages[1]
    new = PeakWindowing(ceiling_db=7.0, length=TimeSpan(Fraction(1, 2_000_000), "s"))
    made = replace_stage(TEXT, 1, old, new)
    assert load_text(made).recipe.stages[1] == new
    assert "# cable" in made
    assert "# For the acceptance" in made


def test_a_setting_that_goes_back_to_its_default_goes():
    old = load_text(TEXT).recipe.stages[1]
    made = replace_stage(TEXT, 1, old, ClipFilter(ceiling_db=7.5))
    assert load_text(made).recipe.stages[1] == ClipFilter(ceiling_db=7.5)


@pytest.mark.parametrize("index", [0, 1, 2])
def test_a_stage_is_inserted(index):
    made = insert_stage(TEXT, index, Clip(ceiling_db=9.0))
    stages = list(load_text(TEXT).recipe.stages)
    stages.insert(index, Clip(ceiling_db=9.0))
    assert load_text(made).recipe.stages == tuple(stages)
    assert "# agreed with the laboratory" in made


def test_the_first_stage_of_all():
    bare = TEXT.partition("stages:")[0]
    made = insert_stage(bare, 0, Clip(ceiling_db=9.0))
    assert load_text(made).recipe.stages == (Clip(ceiling_db=9.0),)
    assert "# eight tones" in made


def test_lists_keep_their_indent():
    flush = TEXT.replace("\n  - ", "\n- ").replace("\n    ", "\n  ").replace("\n  #", "\n#")
    made = rewrite(flush, ["seed=4"])
    assert made == flush.replace("seed: 3", "seed: 4")


def test_a_stage_on_one_line():
    assert stage_text(ClipFilter(ceiling_db=6.5)) == "{kind: clip_filter, ceiling: 6.5 dB}"
