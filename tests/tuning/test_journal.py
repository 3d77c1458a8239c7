"""Evaluations on disk: gone on with, kept, refused."""

import json

import pytest

from wavegen.core.errors import FileError
from wavegen.recipe.load import load_text
from wavegen.tuning.journal import Journal, key_of
from wavegen.tuning.limits import Limits
from wavegen.tuning.request import TuneRequest

KEY = {"recipe": "abc", "measured": "def"}


def test_what_was_added_is_there_again(tmp_path, made):
    path = tmp_path / "x.tuning.json"
    first = Journal(path, KEY)
    first.add(made.evaluation(text="a", level_db=6.0))
    first.add(made.evaluation(text="b", level_db=7.0))
    second = Journal(path, KEY)
    assert second.n_resumed == 2
    assert second.find("a") == made.evaluation(text="a", level_db=6.0)
    assert second.find("c") is None
    assert not json.loads(path.read_text(encoding="utf-8"))["is_complete"]
    assert list(tmp_path.iterdir()) == [path], "no draft is left"


def test_results_stand_before_the_evaluations(tmp_path, made):
    path = tmp_path / "x.tuning.json"
    journal = Journal(path, KEY)
    journal.add(made.evaluation())
    journal.write({"best": None})
    document = json.loads(path.read_text(encoding="utf-8"))
    assert document["is_complete"]
    assert len(document["evaluations"]) == 1


@pytest.mark.parametrize("text", ["", "[]", "{}", '{"format": "wavegen.tuning", "key": 1}'])
def test_a_file_that_is_none_is_kept_unless_told(tmp_path, text, made):
    path = tmp_path / "x.tuning.json"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(FileError):
        Journal(path, KEY)
    assert path.read_text(encoding="utf-8") == text
    Journal(path, KEY, overwrite=True).add(made.evaluation())
    assert Journal(path, KEY).n_resumed == 1


def test_another_recipe_is_refused(tmp_path, made):
    path = tmp_path / "x.tuning.json"
    Journal(path, KEY).add(made.evaluation())
    with pytest.raises(FileError) as refused:
        Journal(path, {**KEY, "recipe": "xyz"})
    assert "--overwrite" in refused.value.remedy
    assert Journal(path, {**KEY, "recipe": "xyz"}, overwrite=True).n_resumed == 0


def test_the_key_follows_recipe_and_meters_but_not_limits(made):
    loaded = load_text(made.CELL)
    base = TuneRequest(limits=Limits(evm_percent=8.0))
    key = key_of(loaded, base)
    assert key == key_of(loaded, TuneRequest(limits=Limits(evm_percent=5.0), seconds=5.0))
    assert key == key_of(load_text(made.CELL.replace("# one carrier", "# two")), base)
    assert key != key_of(load_text(made.CELL, overrides=["seed=6"]), base)
    assert key != key_of(loaded, TuneRequest(limits=Limits(evm_percent=8.0), probability=1e-3))
