"""The pictures of comparisons and tunings."""

import pytest

from wavegen.reports.figures.compared import (
    gain_pictures,
    match_pictures,
    shape_pictures,
    tune_pictures,
)

ROWS = [
    {
        "probability": q,
        "stimulus_db": x,
        "field_db": x + 0.1,
        "difference_db": -0.1,
        "low_db": -0.2,
        "high_db": 0.0,
    }
    for q, x in ((0.5, -1.6), (0.1, 3.6), (0.01, 6.6), (0.001, 8.4))
]
MATCH = {
    "stimulus": {"name": "a"},
    "field": {"name": "b"},
    "levels": ROWS,
    "tolerance_db": 0.2,
}


def named(axes):
    return [line for line in axes.lines if line.get_label()[0] != "_"]


def test_both_sides_of_a_match_are_drawn_and_their_difference():
    ccdf, difference = match_pictures(MATCH)
    axes = ccdf.figure.axes[0]
    assert [line.get_label() for line in named(axes)] == ["a", "b", "complex Gaussian"]
    assert axes.get_ylim()[0] == pytest.approx(0.001)
    assert "1 %: -0.10 dB" in ccdf.alternative
    axes = difference.figure.axes[0]
    (line,) = named(axes)
    assert list(line.get_ydata()) == [-0.1] * 4
    assert axes.get_ylim()[0] < -0.2
    assert axes.get_xlim()[0] > axes.get_xlim()[1]  # rarer to the right


def test_a_side_that_is_off_leaves_its_point_out():
    rows = [ROWS[0] | {"stimulus_db": None, "difference_db": None}, *ROWS[1:]]
    document = {"name": "a", "field": "b", "levels": rows, "tolerance_db": 0.2}
    ccdf, _ = shape_pictures(document)
    assert [line.get_xdata().size for line in named(ccdf.figure.axes[0])[:2]] == [3, 4]


def test_a_difference_that_is_not_known_is_not_drawn():
    rows = [row | {"difference_db": None} for row in ROWS]
    (ccdf,) = match_pictures(MATCH | {"levels": rows})
    assert "not known" in ccdf.alternative


def gain_document(**more):
    rows = [
        {"input_db": x, "gain_db": 30 - 0.1 * x, "low_db": 29.0, "high_db": 31.0} for x in range(5)
    ]
    return {"gain": rows, "levels": [], "gain_is": "output over input, dB"} | more


def test_gain_with_its_compression_point():
    absolute = [row | {"input_dbm": row["input_db"] - 20} for row in gain_document()["gain"]]
    (picture,) = gain_pictures(gain_document(gain=absolute, input_p1db_dbm=-17.0))
    axes = picture.figure.axes[0]
    assert axes.get_xlabel() == "input level, dBm"
    assert list(axes.lines[0].get_xdata()) == [-20, -19, -18, -17, -16]
    assert "-17.00 dBm" in axes.texts[0].get_text()
    assert "Down by 1 dB at -17.00 dBm" in picture.alternative
    (picture,) = gain_pictures(gain_document(input_p1db_db=None))
    assert "over the input mean" in picture.figure.axes[0].get_xlabel()
    assert picture.figure.axes[0].get_ylabel() == "output over input, dB"
    assert gain_pictures(gain_document(gain=[])) == []


def test_input_and_output_of_a_device_are_laid_over_each_other():
    # At 10 % the gain is 29.7 dB, 0.3 dB down; the mean gain is 29.9: a change of -0.2 dB.
    level = {"probability": 0.1, "change_db": -0.2, "compression_db": 0.3}
    rows = [row | {"probability": 0.5 ** (k + 1)} for k, row in enumerate(gain_document()["gain"])]
    document = gain_document(
        gain=rows,
        levels=[level],
        small_signal_gain_db=30.0,
        input={"name": "in"},
        output={"name": "out"},
    )
    _, ccdf = gain_pictures(document)
    before, after, _ = named(ccdf.figure.axes[0])
    assert (before.get_label(), after.get_label()) == ("input: in", "output: out")
    # at an input of 3 dB over the mean: 3 + 29.7 - 29.9
    assert after.get_xdata()[3] == pytest.approx(2.8)
    assert after.get_ydata()[3] == before.get_ydata()[3] == 0.0625
    assert "10 %: -0.20 dB" in ccdf.alternative


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
    assert labels == [
        "clip",
        "projection, the reference",
        "the best that was found",
    ]
    assert "7.00 dB at EVM 3.00 %" in picture.alternative
    assert tune_pictures(document | {"evaluations": []}) == []
