import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.production.predict import PROBABILITIES, predict
from wavegen.recipe.load import load_text

HEAD = "wavegen: 1\nsample_rate: 4 MHz\nduration: 2 ms\n"


def said(body, duration=None):
    text = HEAD if duration is None else HEAD.replace("2 ms", duration)
    return predict(load_text(text + body, name="case"))


def test_noise_follows_the_exponential_down_to_1e_9():
    document = said("signal: {kind: noise, bandwidth: 1 MHz}\n")
    law = document["law"]
    assert law["holds"] == "over seeds"
    assert law["peak_db"] is None
    for row in law["levels"]:
        exact = 10 * np.log10(-np.log(row["probability"]))
        assert row["level_db"] == pytest.approx(exact, abs=1e-3)
    assert [row["probability"] for row in law["levels"]] == list(PROBABILITIES)
    step = np.diff(law["level_db"])
    assert step.max() <= 0.0501
    assert law["probability"][-1] <= 1e-9


def test_tones_hold_for_every_loop():
    law = said("signal: {kind: tones, count: 2, spacing: 1 MHz, phases: equal}\n")["law"]
    assert law["holds"] == "every loop"
    assert law["peak_db"] == pytest.approx(3.0103, abs=1e-4)


def test_behind_a_clip_the_wall_stands_at_the_ceiling():
    clip = "stages: [{kind: clip, ceiling: 6 dB}]\n"
    law = said("signal: {kind: noise, bandwidth: 1 MHz}\n" + clip)["law"]
    levels = {row["probability"]: row["level_db"] for row in law["levels"]}
    assert levels[1e-6] == pytest.approx(6.0, abs=1e-3)
    assert levels[0.1] > 3.622


def test_what_has_no_law_says_so_by_name():
    body = """\
signal: {kind: noise, bandwidth: 1 MHz}
stages: [{kind: clip, ceiling: 6 dB}, {kind: filter, bandwidth: 1.5 MHz}]
"""
    document = said(body)
    assert document["law"] is None
    assert "filter" in document["no_law"]


def test_rounding_and_faults_are_those_of_make():
    document = said("signal: {kind: carrier}\n", duration="2.0001 ms")
    assert document["n_samples"] == 8000
    assert document["rounded"]
    with pytest.raises(RecipeError):
        said("signal: {kind: noise, bandwidth: 9 MHz}\n")
