"""What figures share."""

import sys

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
