"""The pictures of comparisons and tunings."""

import pytest

from wavegen.reports.figures.compared import (
    gain_pictures,
    match_pictures,
    shape_pictures,
    tune_pictures,
)

ROWS = [
    {"probability": q, "stimulus_db": x, "field_db": x + 0.1, "difference_db": -0.1}
    for q, x in ((0.5, -1.6), (0.1, 3.6), (0.01, 6.6), (0.001, 8.4))
]


def test_both_sides_of_a_match_are_drawn():
    document = {"stimulus": {"name": "a"}, "field": {"name": "b"}, "levels": ROWS}
    (picture,) = match_pictures(document)
    axes = picture.figure.axes[0]
    assert [line.get_label() for line in axes.lines] == ["a", "b"]
    assert axes.get_ylim()[0] == pytest.approx(0.001)
    assert "1 %: -0.10 dB" in picture.alternative


def test_a_side_that_is_off_leaves_its_point_out():
    rows = [ROWS[0] | {"stimulus_db": None, "difference_db": None}, *ROWS[1:]]
    (picture,) = shape_pictures({"name": "a", "field": "b", "levels": rows})
    assert [line.get_xdata().size for line in picture.figure.axes[0].lines] == [3, 4]


def test_gain_with_its_compression_point():
    rows = [
        {"input_db": x, "gain_db": 30 - 0.1 * x, "low_db": 29.0, "high_db": 31.0} for x in range(5)
    ]
    (picture,) = gain_pictures({"gain": rows, "input_p1db_dbm": 3.0})
    axes = picture.figure.axes[0]
    assert axes.get_xlabel() == "input level, dBm"
    assert "3.00 dB" in axes.texts[0].get_text()
    (picture,) = gain_pictures({"gain": rows, "input_p1db_db": None})
    assert "over the input mean" in picture.figure.axes[0].get_xlabel()
    assert gain_pictures({"gain": []}) == []


def test_a_tuning_shows_every_trial_against_the_bound():
    trial = {"method": "clip", "evm_percent": 3.0, "level_db": 7.0}
    document = {
        "evaluations": [trial, trial | {"evm_percent": 5.0, "level_db": 6.0}],
        "reference": {"evm_percent": 5.0, "level_db": 5.8},
        "best": trial,
        "probability": 1e-4,
        "limits": {"evm_percent": 8.0},
    }
    (picture,) = tune_pictures(document)
    labels = picture.figure.axes[0].get_legend_handles_labels()[1]
    assert labels == ["clip", "least-distortion projection"]
    assert "7.00 dB at EVM 3.00 %" in picture.alternative
    assert tune_pictures(document | {"evaluations": []}) == []
