import json

import numpy as np
import pytest

from wavegen.production.check import check
from wavegen.production.judgement import Question
from wavegen.production.stimulus import find_stimulus


@pytest.fixture(scope="module")
def made(lab, tmp_path_factory):
    """Noise long enough to agree within 1 dB down to 1 %."""
    out = tmp_path_factory.mktemp("referee")
    question = Question(tolerance_db=1.0, down_to=0.01)
    return lab.make(lab.NOISE, out, overrides=["duration=20 ms"], question=question)


@pytest.fixture
def copy(made, tmp_path):
    for path in made.files:
        (tmp_path / path.name).write_bytes(path.read_bytes())
    return tmp_path


def against_law(folder, **options):
    document = check(find_stimulus(folder), **options)
    return document, document["files"][0]["against_law"]


def rewrite(folder, change):
    path = folder / "case.sigmf-data"
    codes = np.fromfile(path, "<i2").reshape(-1, 2)
    change(codes)
    codes.tofile(path)


def test_equal_bytes_have_the_verdict_of_the_sidecar(made, copy, monkeypatch):
    def refuse(*_, **__):
        raise AssertionError

    monkeypatch.setattr("wavegen.production.referee.render", refuse)
    document, found = against_law(copy)
    assert found["from"] == "as its sidecar says"
    assert found["channels"] == [made.document["files"][0]["against_law"]]
    assert found["channels"][0]["verdict"] == "agrees"
    assert not document["differs_from_law"]


def test_another_question_is_put_to_the_file_itself(copy):
    _, found = against_law(copy, question=Question(tolerance_db=0.05, down_to=0.01))
    assert found["from"] == "measured"
    assert found["channels"][0]["verdict"] == "undecided"
    _, found = against_law(copy, question=Question(tolerance_db=2.0, down_to=0.01))
    assert found["channels"][0]["verdict"] == "agrees"


def test_other_bytes_are_judged_anew_by_the_question_of_the_sidecar(copy):
    def touch(codes):
        codes[5, 0] += 1

    rewrite(copy, touch)
    document, found = against_law(copy)
    assert found["from"] == "measured"
    assert found["channels"][0]["verdict"] == "agrees"
    assert "within 1 dB down to 1 %" in found["channels"][0]["statement"]
    assert not document["differs_from_law"]


def test_a_file_that_no_longer_follows_its_law(copy):
    def limit(codes):
        np.clip(codes, -4000, 4000, out=codes)

    rewrite(copy, limit)
    document, found = against_law(copy)
    assert found["channels"][0]["verdict"] == "differs"
    assert document["differs_from_law"]


def test_a_recipe_that_cannot_be_built_here(copy):
    path = copy / "case.ccdf.json"
    document = json.loads(path.read_text(encoding="utf-8"))
    document["recipe"]["text"] = document["recipe"]["text"].replace("noise", "nonsense")
    path.write_text(json.dumps(document), encoding="utf-8")
    _, found = against_law(copy, question=Question(down_to=0.01))
    assert found["channels"][0]["verdict"] == "undecided"
    assert "cannot be built here" in found["channels"][0]["statement"]


def test_what_has_no_law_is_not_judged(lab, tmp_path):
    text = lab.SINGLE + "stages: [{kind: filter, bandwidth: 1.5 MHz}]\n"
    lab.make(text, tmp_path)
    assert against_law(tmp_path / "case", question=Question(down_to=0.01))[1] is None


def test_channels_are_judged_one_by_one(lab, tmp_path):
    lab.make(lab.NOISE + "second_channel: {signal: {kind: carrier}}\n", tmp_path)
    _, found = against_law(tmp_path / "case", question=Question(tolerance_db=3.0, down_to=0.1))
    assert [item["verdict"] for item in found["channels"]] == ["agrees", "agrees"]
    assert found["channels"][1]["statement"] == "agrees at every level"


def test_bursts_and_their_on_time(lab, tmp_path):
    gate = "stages: [{kind: gate, duty: 50 %, period: 1 ms}]\n"
    made = lab.make(lab.NOISE + gate, tmp_path, overrides=["duration=20 ms"])
    _, found = against_law(tmp_path / "case", question=Question(tolerance_db=0.21))
    stated = made.document["law"]["statement"].replace("0.2 dB", "0.21 dB")
    assert found["channels"][0]["statement"].split("about")[0] == stated.split("about")[0]
