"""Pictures of a trade-off and of a device."""

import numpy as np

from wavegen.reports.figures.trade import Front, difference_figure, front_figure, gain_figure


def test_points_that_nothing_beats_are_joined_in_the_order_of_evm():
    evm = np.array([5.0, 1.0, 3.0, 4.0])
    front = Front(name="clip", evm_percent=evm, level_db=np.array([7.5, 8.7, 8.1, 8.3]))
    figure = front_figure(
        [front], title="T", level_name="level, dB", bound=front, evm_limit_percent=4.0
    )
    axes = figure.axes[0]
    assert list(axes.lines[0].get_xdata()) == [1, 3, 5]
    assert list(axes.lines[1].get_xdata()) == [5, 1, 3, 4]
    assert "limit" in axes.get_xlabel()


def test_gain_with_and_without_interval():
    rows = [{"input_db": x, "gain_db": -0.1 * x} for x in range(5)]
    assert len(gain_figure(rows, title="T").axes[0].collections) == 0
    rows = [row | {"low_db": row["gain_db"] - 1, "high_db": row["gain_db"] + 1} for row in rows]
    figure = gain_figure(rows, title="T", compression_db=3.0)
    assert len(figure.axes[0].collections) == 1
    assert "3.00 dB" in figure.axes[0].texts[0].get_text()


def test_a_difference_is_drawn_with_intervals_and_tolerance():
    rows = [
        {"probability": 0.1, "difference_db": 0.05, "low_db": 0.0, "high_db": 0.1},
        {"probability": 0.01, "difference_db": -0.3, "low_db": None, "high_db": None},
    ]
    figure = difference_figure(rows, title="T", name="a less b, dB", tolerance_db=0.2)
    axes = figure.axes[0]
    (bars,) = axes.collections
    assert len(bars.get_segments()) == 1
    assert axes.get_ylim()[1] == -axes.get_ylim()[0] > 0.3
    assert axes.get_ylabel() == "a less b, dB"


def test_a_difference_of_exact_curves_has_no_interval():
    rows = [
        {"probability": q, "difference_db": 0.1, "low_db": 0.1, "high_db": 0.1} for q in (0.1, 0.01)
    ]
    axes = difference_figure(rows, title="T", name="a less b, dB", tolerance_db=0.2).axes[0]
    assert len(axes.collections) == 0
