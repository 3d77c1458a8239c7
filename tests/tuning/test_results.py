"""What comes of a tune, as JSON values."""

import json
from pathlib import Path

import pytest

from wavegen.recipe.load import load_text
from wavegen.tuning.evaluation import Evaluation
from wavegen.tuning.limits import Limits
from wavegen.tuning.reference import Reference
from wavegen.tuning.request import TuneRequest
from wavegen.tuning.results import MethodResult, Tuned, front


@pytest.fixture
def tuned(made):
    def tuned(**more):
        best = made.evaluation(level_db=6.0, percent=7.9)
        given = {
            "loaded": load_text(made.CELL, name="cell"),
            "request": TuneRequest(limits=Limits(evm_percent=8.0, aclr_db=45.0)),
            "before": made.evaluation(method="", text="", level_db=9.5, percent=0.0, settings={}),
            "methods": (MethodResult(kind="clip", state="kept", best=best),),
            "best": best,
            "confirmation": None,
            "reference": Reference(evaluation=made.evaluation(level_db=5.9, percent=7.9)),
            "evaluations": (best,),
            "n_resumed": 0,
            "notes": (),
            "channels": "own",
            "folder": Path("output/cell"),
            "files": ("cell-tuned.yaml",),
        }
        return Tuned(**{**given, **more})

    return tuned


def test_the_best_with_its_distances(tuned):
    document = tuned().document()
    json.dumps(document, allow_nan=False)
    best = document["best"]
    assert best["bound_db"] == pytest.approx(5.9)
    assert best["over_bound_db"] == pytest.approx(0.1)
    assert best["gained_db"] == 3.5
    assert best["level_before_db"] == 9.5
    assert (best["binding"], best["settings"]) == ("EVM", {"ceiling_db": 6.0})
    assert document["nearest"] is None


def test_without_a_best_the_nearest(tuned, made):
    missed = made.evaluation(percent=9.0, ratio_db=46.0)
    far = made.evaluation(percent=20.0, ratio_db=46.0)
    before = made.evaluation(method="", text="", percent=12.0, ratio_db=40.0, settings={})
    methods = (
        MethodResult(kind="a", state="missed", best=far),
        MethodResult(kind="b", state="missed", best=missed),
        MethodResult(kind="c", state="unsuited", reason="no"),
    )
    found = tuned(best=None, before=before, methods=methods, reference=None)
    assert found.nearest == missed
    assert not found.is_unfinished
    document = found.document()
    assert document["best"] is None
    assert document["nearest"]["evm_percent"] == 9.0
    late = MethodResult(kind="d", state="unfinished")
    assert tuned(best=None, methods=(*methods, late)).is_unfinished
    assert not tuned(methods=(*tuned().methods, late)).is_unfinished


def test_behind_an_amplifier_power_counts(tuned, made):
    before = made.evaluation(output_dbm=20.0, input_dbm=-10.0)
    best = made.evaluation(output_dbm=21.5, input_dbm=-8.0)
    request = TuneRequest(limits=Limits(evm_percent=8.0), device=Path("folder/amp.csv"))
    document = tuned(before=before, best=best, request=request).document()
    assert document["best"]["gained_db"] == 1.5
    assert document["best"]["bound_db"] is None
    assert (document["objective"], document["device"]) == ("output_dbm", "amp.csv")


def test_the_front_is_what_nothing_beats_in_both(made):
    points = [(5.0, 7.0), (6.0, 6.5), (6.5, 6.6), (8.0, 6.0), (5.0, 7.5)]
    every = tuple(made.evaluation(percent=evm, level_db=level) for evm, level in points)
    failed = Evaluation(method="clip", text="x", settings={}, fault="no")
    found = front((*every, failed))
    assert [(item.evm_percent, item.level_db) for item in found] == [
        (5.0, 7.0),
        (6.0, 6.5),
        (8.0, 6.0),
    ]
