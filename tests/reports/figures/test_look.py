"""What figures share."""

import sys
from xml.etree import ElementTree as ET

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.reports.figures import look
from wavegen.reports.figures.look import (
    STROKES,
    check_installed,
    condensed,
    draw,
    legend,
    new_figure,
    note,
    rendered,
    stroke,
)


def grey(colour):
    red, green, blue = (int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5))
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def test_strokes_differ_without_their_colour():
    assert len({(item.dashes, item.mark) for item in STROKES}) == len(STROKES)
    assert max(grey(item.colour) for item in STROKES) < 0.45  # all dark enough on white
    assert stroke(7) == STROKES[1]


@pytest.mark.parametrize(("form", "start"), [("svg", b"<?xml"), ("png", b"\x89PNG")])
def test_the_same_figure_gives_the_same_bytes(form, start):
    made = []
    for _ in range(2):
        figure, (axes,) = new_figure("A title with $money$ & <tags>")
        draw(axes, [0, 1], [0, 1], stroke(0), label="$x_1$ <b>")
        legend(axes)
        made.append(rendered(figure, form))
    assert made[0] == made[1]
    assert made[0].startswith(start)
    if form == "svg":
        assert b"<tags>" not in made[0]
        assert b"$money$" in made[0]


def test_without_matplotlib_the_command_is_told(monkeypatch):
    monkeypatch.setitem(sys.modules, "matplotlib.figure", None)
    with pytest.raises(ArgumentsError) as caught:
        new_figure("x")
    assert "pip install" in caught.value.remedy


def test_condensed_keeps_the_mean():
    values = np.arange(1000.0)
    assert condensed(values, 2000) is not values
    assert condensed(values, 100).size == 100
    assert condensed(values, 100).mean() == values.mean()


@pytest.mark.parametrize(("missing", "name"), [("matplotlib", "Matplotlib"), ("jinja2", "Jinja")])
def test_what_is_missing_is_told_before_work_begins(monkeypatch, missing, name):
    check_installed()
    monkeypatch.setattr(look, "find_spec", lambda module: None if module == missing else object())
    with pytest.raises(ArgumentsError) as caught:
        check_installed()
    assert name in caught.value.problem
    assert "pip install" in caught.value.remedy


def test_a_long_title_takes_two_lines_and_stays_inside():
    figure, _ = new_figure("A very wide title of WWWWWWWWWWWWWW capitals " * 20)
    heading = figure.get_suptitle()
    assert heading.count("\n") <= 1
    assert heading.endswith("...")
    assert figure._suptitle.get_window_extent().width <= figure.bbox.width


@pytest.mark.parametrize(
    "title", ["two\nlines", "a\u202eb", "bell\x07", "half \udc80", "$x^{2", "東京", "\U0001f600"]
)
def test_any_title_can_be_written(title):
    figure, (axes,) = new_figure(title)
    axes.plot([0, 1], [0, 1], label=title)
    legend(axes)
    note(axes, title)
    for form in ("svg", "png"):
        assert rendered(figure, form)
    assert ET.fromstring(rendered(figure, "svg")).tag.endswith("svg")  # noqa: S314 - our own


def test_a_legend_covers_no_curve_and_cuts_long_names():
    figure, (axes,) = new_figure("T")
    axes.plot([0, 1], [0, 1], label="n" * 400)
    legend(axes)
    figure.draw_without_rendering()
    (made,) = figure.legends
    assert made.get_window_extent().y1 <= axes.get_window_extent().y0
    assert made.get_window_extent().width <= figure.bbox.width
