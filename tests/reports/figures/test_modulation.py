"""Picture of constellations."""

import numpy as np
import pytest

from wavegen.reports.figures.modulation import Cloud, constellation_figure, evm_words


def test_each_class_has_its_panel_with_its_evm_three_at_most():
    ideal = np.array([1, 1j, -1, -1j], np.complex64)
    clouds = [
        Cloud(name=f"group {k}", received=ideal * 1.1, ideal=ideal, evm_percent=10.0)
        for k in range(4)
    ]
    figure = constellation_figure(clouds, title="T")
    titles = [axes.get_title(loc="left") for axes in figure.axes]
    assert titles == [f"group {k}\nEVM 10 %" for k in range(3)]
    for axes in figure.axes:
        assert axes.get_aspect() == 1
        low, high = axes.get_xlim()
        assert low < -1.1
        assert high > 1.1


def test_received_points_are_seen_inside_those_sent():
    ideal = np.array([1, -1], np.complex64)
    figure = constellation_figure([Cloud(name="x", received=ideal, ideal=ideal)], title="T")
    received, sent = figure.axes[0].lines
    assert sent.get_markerfacecolor() == "none"
    assert received.get_markersize() < sent.get_markersize()


def test_a_long_name_is_cut():
    ideal = np.array([1, -1], np.complex64)
    figure = constellation_figure([Cloud(name="n" * 500, received=ideal, ideal=ideal)], title="T")
    assert len(figure.axes[0].get_title(loc="left")) < 50


@pytest.mark.parametrize(
    ("percent", "words"),
    [(47.234, "47.2 %"), (0.4044, "0.404 %"), (0.0999, "0.1 %"), (1e-7, "below 0.001 %")],
)
def test_evm_has_the_digits_that_mean_something(percent, words):
    assert evm_words(percent) == words
