import json

from wavegen.tuning.evaluation import Evaluation


def test_it_survives_json(made):
    first = made.evaluation(pairs=8.0, mask_margin_db=1.5, input_dbm=-3.0, output_dbm=27.0)
    assert Evaluation.of(json.loads(json.dumps(first.row()))) == first
    failed = Evaluation(method="clip", text="{kind: clip}", settings={}, fault="no such")
    assert Evaluation.of(json.loads(json.dumps(failed.row()))) == failed


def test_the_worst_of_sources_and_channels(made):
    found = made.evaluation(evm=(made.entry(3.0), made.entry(4.0, source="parts[1]"),
                                 made.entry(9.0, name="groups[0]")))  # fmt: skip
    assert found.evm_percent == 4.0
    assert found.aclr_db == 50.0


def test_what_is_made_small(made):
    assert made.evaluation(level_db=6.5).cost == 6.5
    assert made.evaluation(output_dbm=30.0).cost == -30.0
