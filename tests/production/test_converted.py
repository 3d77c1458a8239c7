import json
from fractions import Fraction

import pytest

from wavegen.files.read import open_recording
from wavegen.laws.term import NoLaw
from wavegen.production.converted import Change, origin_of

GATE = "stages: [{kind: gate, duty: 25 %, period: 0.5 ms}]\n"


def document(lab, tmp_path, text):
    return lab.make(text, tmp_path).document


def test_the_law_is_found_again_at_the_same_rate(lab, tmp_path):
    found = document(lab, tmp_path, lab.TONES)
    origin = origin_of(found, folder=tmp_path, rate_factor=Fraction(1))
    assert origin.law is not None
    assert origin.law.name == found["law"]["name"]
    assert origin.notes == ()
    assert origin.bursts is None


def test_the_law_is_left_at_another_rate(lab, tmp_path):
    origin = origin_of(
        document(lab, tmp_path, lab.TONES), folder=tmp_path, rate_factor=Fraction(3, 2)
    )
    assert "change of rate" in origin.law.reason
    assert len(origin.notes) == 1


def test_bursts_follow_the_rate(lab, tmp_path):
    found = document(lab, tmp_path, lab.SINGLE + GATE)
    for factor in (Fraction(1), Fraction(3, 2)):
        origin = origin_of(found, folder=tmp_path, rate_factor=factor)
        assert origin.bursts.period_samples == 2000 * factor
        assert origin.bursts.duty == Fraction(1, 4)
    found |= {"converted": {"rate_factor": "2", "before": {"rate_factor": "3", "before": None}}}
    origin = origin_of(found, folder=tmp_path, rate_factor=Fraction(1, 2))
    assert origin.bursts.period_samples == 6000


def test_overrides_count(lab, tmp_path):
    found = lab.make(lab.SINGLE + GATE, tmp_path, overrides=["stages[0].duty=50 %"]).document
    origin = origin_of(found, folder=tmp_path, rate_factor=Fraction(1))
    assert origin.bursts.duty == Fraction(1, 2)


def test_a_recipe_that_cannot_be_built(lab, tmp_path):
    found = document(lab, tmp_path, lab.TONES)
    found["recipe"]["text"] = "wavegen: 1\n"
    (note,) = origin_of(found, folder=tmp_path, rate_factor=Fraction(1)).notes
    assert "the law could not be carried over" in note


def test_nothing_is_built_where_nothing_is_asked(lab, tmp_path):
    found = document(lab, tmp_path, lab.SINGLE)
    found["recipe"]["text"] = "nonsense"
    origin = origin_of(found | {"law": None}, folder=tmp_path, rate_factor=Fraction(1))
    assert isinstance(origin.law, NoLaw)
    assert (origin.bursts, origin.notes) == (None, ())


@pytest.mark.parametrize("earlier", [None, {"before": None}])
def test_a_change_as_json(lab, tmp_path, earlier):
    made = lab.make(lab.CARRIER, tmp_path)
    change = Change(
        source=open_recording(made.files[0]),
        sha512="ab" * 64,
        rate_factor=Fraction(3, 2),
        gain_db=-1.0,
    )
    found = change.document(earlier)
    assert found["from"] == "case.sigmf-data"
    assert (found["rate_factor"], found["gain_db"]) == ("3/2", -1)
    assert found["before"] == earlier
    assert json.loads(json.dumps(found)) == found
