"""The pictures of a stimulus and of a measurement."""

from wavegen.reports.figures.stimulus import level_words, pictures_of

ALL = ["ccdf", "density", "power-time", "spectrum", "seam"]


def test_a_stimulus_has_all_of_them(made_document, gated_views):
    pictures = pictures_of(made_document, gated_views, title="T")
    assert [item.name for item in pictures if item.name != "constellation"] == ALL
    assert all(item.caption and item.alternative for item in pictures)
    axes = pictures[0].figure.axes[0]
    names = axes.get_legend_handles_labels()[1]
    assert "on-time, over its own mean" in names
    assert "4 on-times" in next(i.caption for i in pictures if i.name == "power-time")
    assert "clean" in pictures[-1].caption


def test_a_measurement_has_those_of_its_samples(measured_document, gated_views):
    pictures = pictures_of(measured_document, gated_views, title="T")
    assert pictures[0].name == "ccdf"
    alone = pictures_of(measured_document, None, title="T")
    assert {item.name for item in alone} <= {"ccdf", "density"}


def test_levels_in_words(made_document):
    said = level_words(made_document)
    assert said.startswith("It exceeds the mean by: 10 % at ")
    assert level_words({"levels": []}) == "No level is resolved."
