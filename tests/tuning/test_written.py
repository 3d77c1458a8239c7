"""The tuned recipe: comments kept, what was set on top written, paths from its new place."""

from pathlib import Path

from wavegen.recipe.load import load_recipe, load_text
from wavegen.stages.crest.clip import Clip
from wavegen.stages.crest.clip_filter import ClipFilter
from wavegen.tuning.written import tuned_text

STAGE = ClipFilter(ceiling_db=6.123, rounds=4)


def test_a_method_where_there_was_none(made):
    loaded = load_text(made.CELL, overrides=["seed=9"])
    text = tuned_text(loaded, STAGE, (0, False), folder=Path())
    recipe = load_text(text).recipe
    assert recipe.stages == (STAGE,)
    assert recipe.seed == 9
    for comment in ("# for the tests", "# one carrier", "# leaves room beside it"):
        assert comment in text


def test_another_in_the_place_of_one(made):
    text = (
        made.CELL + "stages:\n  - {kind: scale, gain: 1 dB}\n  - {kind: clip, ceiling: 9 dB} # x\n"
    )
    made_text = tuned_text(load_text(text), STAGE, (1, True), folder=Path())
    assert load_text(made_text).recipe.stages[1] == STAGE
    assert "# one carrier" in made_text


def test_an_anchor_shared_by_two_stages_is_written_out(made):
    text = made.CELL + "stages:\n  - &a {kind: clip, ceiling: 9 dB}\n  - *a\n"
    found = load_text(tuned_text(load_text(text), Clip(ceiling_db=7.0), (1, True), folder=Path()))
    assert [stage.ceiling_db for stage in found.recipe.stages] == [9.0, 7.0]


def test_files_are_found_from_the_new_folder(tmp_path):
    (tmp_path / "bits.txt").write_text("0110" * 50, encoding="ascii")
    path = tmp_path / "carrier.yaml"
    path.write_text(
        "wavegen: 1\nsample_rate: 4 MHz\nduration: 100 symbols\nsignal:\n"
        "  kind: single_carrier\n  constellation: qpsk\n  symbol_rate: 1 MHz\n"
        "  data: {kind: file, path: bits.txt}   # measured\n",
        encoding="utf-8",
    )
    out = tmp_path / "output" / "carrier"
    out.mkdir(parents=True)
    text = tuned_text(load_recipe(path), STAGE, (0, False), folder=out)
    assert "# measured" in text
    (out / "carrier-tuned.yaml").write_text(text, encoding="utf-8")
    found = load_recipe(out / "carrier-tuned.yaml")
    assert (found.folder / found.recipe.signal.data.path).read_text(encoding="ascii")[:4] == "0110"
    assert load_text(text, folder=out).recipe.stages == (STAGE,)
