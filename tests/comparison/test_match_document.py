import json

import pytest

from wavegen.comparison.difference import as_recorded, compare
from wavegen.comparison.match_document import (
    figure,
    needed_documents,
    recorded_document,
    row_document,
    side_document,
)
from wavegen.comparison.needed_samples import needed_samples


@pytest.fixture
def short(side, noise):
    sides = tuple(side(noise(1 << 12), name, loops=False) for name in "ab")
    return sides, compare(sides[0].curve, sides[1].curve)


def test_what_is_not_finite_is_null(short):
    _, found = short
    rows = [row_document(row) for row in found.rows]
    json.dumps(rows, allow_nan=False)
    assert rows[-1]["resolved"] is False
    assert rows[-1]["high_db"] is None
    assert figure(None) is None
    assert figure(1.23456) == 1.2346


def test_what_is_needed_is_told_in_samples_and_seconds(short):
    sides, found = short
    plans = needed_samples(sides[0].curve, sides[1].curve, found)
    document = needed_documents(plans, sides, ("input", "output"))[0]
    assert document["shows"] == plans[0].shows
    assert document["more_input_samples"] == plans[0].first_samples
    assert document["more_output_s"] == pytest.approx(plans[0].second_samples / 1e6)


def test_records_as_they_stand(short):
    sides, _ = short
    recorded = compare(*(as_recorded(item.curve) for item in sides))
    document = recorded_document(recorded)
    assert document["verdict"] == recorded.verdict == "differ"
    assert document["difference_db"] == pytest.approx(recorded.decisive.difference_db, abs=1e-4)


def test_sides_name_their_scale(side, noise):
    absolute = side_document(side(noise(1 << 12), level_dbm=-10.0))
    assert "mean_dbm" in absolute
    assert absolute["is_exact"]
    assert "mean_dbfs" in side_document(side(noise(1 << 12)))
