"""A figure with its words."""

from wavegen.reports.figures.look import new_figure
from wavegen.reports.figures.picture import Picture


def test_a_picture_holds_what_a_page_needs():
    figure, _ = new_figure("T")
    made = Picture(name="ccdf", figure=figure, caption="C", alternative="A")
    assert (made.name, made.caption, made.alternative) == ("ccdf", "C", "A")
    assert made.figure is figure
