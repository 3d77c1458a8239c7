"""The verbs from Python."""

import json
import subprocess
import sys

import pytest

import wavegen
from wavegen.core.errors import ArgumentsError, RecipeError
from wavegen.tuning.limits import Limits
from wavegen.tuning.request import TuneRequest

SHORT = ["duration=2000 symbols"]


def test_a_stimulus_is_made_measured_and_matched(tmp_path):
    recipe = wavegen.load_recipe("harbour-link-qpsk", SHORT)
    made = wavegen.make(recipe, out=tmp_path)
    assert made["files"]
    assert "PAPR" in str(made)
    assert "<table>" in made._repr_html_()
    file = tmp_path / "harbour-link-qpsk" / made["files"][0]["name"]
    measured = wavegen.measure(file)
    assert measured["papr_db"] == pytest.approx(made["papr_db"], abs=1e-6)
    assert wavegen.match(file, file)["verdict"] == "match"


def test_a_recipe_is_predicted_and_measured():
    recipe = wavegen.load_recipe("harbour-link-qpsk", SHORT)
    assert wavegen.predict(recipe)["law"]["name"]
    assert wavegen.measure(recipe)["is"] == "this loop"
    with pytest.raises(ArgumentsError):
        wavegen.measure(recipe, "x.sigmf-meta")
    assert "no law" in str(wavegen.predict("causeway-two-carriers-cancelled"))


def test_a_recipe_is_tuned(tmp_path):
    request = TuneRequest(
        limits=Limits(evm_percent=8.0), methods=("clip",), seconds=5.0, probability=1e-3
    )
    found = wavegen.tune("valley-cell-20mhz", request, out=tmp_path, overrides=["duration=0.5 ms"])
    assert found["best"]["method"] == "clip"
    assert found["evaluations"]
    assert "clip" in str(found)


def test_every_result_shows_itself(tmp_path):
    recipe = wavegen.load_recipe("harbour-link-qpsk", SHORT)
    made = wavegen.make(recipe, out=tmp_path)
    file = tmp_path / "harbour-link-qpsk" / made["files"][0]["name"]
    found = [made, wavegen.predict(recipe), wavegen.measure(file), wavegen.match(file, file)]
    for result in found:
        text = str(result)
        assert repr(result) == text
        assert max(map(len, text.splitlines())) <= 80
        shown = result._repr_html_()
        assert shown.count("<table>") == shown.count("</table>") == len(result.tables) > 0
        row = result.row()
        assert row
        assert all(value is None or isinstance(value, str | int | float) for value in row.values())
        json.dumps(dict(result))
    assert "<pre>" in recipe._repr_html_()


def test_what_is_wrong_is_raised():
    with pytest.raises(RecipeError):
        wavegen.load_recipe("no-such-recipe")
    with pytest.raises(AttributeError):
        _ = wavegen.nothing


def test_importing_the_package_loads_nothing_heavy():
    code = (
        "import sys, wavegen; print([n for n in ('numpy','scipy','pydantic') if n in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
