"""The pictures of a stimulus and of a measurement."""

import pytest

from wavegen.core.timespan import TimeSpan
from wavegen.production.measure import measure
from wavegen.production.measure_settings import GateSettings, MeasureSettings
from wavegen.production.subject import Subject
from wavegen.production.views import views_of
from wavegen.reports.figures.stimulus import absolute_of, level_words, pictures_of

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


def named(pictures, name):
    return next(item for item in pictures if item.name == name)


def labels_of(picture):
    return picture.figure.axes[0].get_legend_handles_labels()[1]


@pytest.mark.parametrize(
    "gate",
    [
        GateSettings(by="level"),
        GateSettings(by="pattern", pattern="10", slot=TimeSpan.parse("0.5ms")),
    ],
)
def test_bursts_that_were_found_are_shaded(gated, gate):
    """A file knows no gate: what measure finds in it is shaded all the same."""
    signal = gated.built.signal
    document = measure(
        Subject(name="file", signal=signal, loops=True), settings=MeasureSettings(gate=gate)
    )
    views = views_of(signal, loops=True)
    assert views.on_times_s == ()
    picture = named(pictures_of(document, views, title="T"), "power-time")
    assert "4 on-times are shaded" in picture.caption
    (bar,) = [item for item in picture.figure.axes[0].collections if item.get_label()[0] != "_"]
    ends = [(p.vertices[:, 0].min(), p.vertices[:, 0].max()) for p in bar.get_paths()]
    # on for half of each millisecond; what is found by level may lie off by its window and ramp
    for number, (start, stop) in enumerate(ends):
        assert start == pytest.approx(number, abs=0.03)
        assert stop == pytest.approx(number + 0.5, abs=0.03)


def test_too_many_bursts_are_told_and_not_shaded(measured_document, gated_views):
    each = [{"start_sample": k, "stop_sample": k + 1} for k in range(300)]
    on_time = measured_document["on_time"] | {"bursts": {"n_bursts": 300, "each": each}}
    document = measured_document | {"on_time": on_time}
    picture = named(pictures_of(document, gated_views, title="T"), "power-time")
    assert "300 on-times are too many" in picture.caption
    assert labels_of(picture)[0] != "on: 300 times"


def test_what_was_before_is_laid_over_it(made_document, gated, gated_views):
    signal = gated.built.signal
    views = views_of(signal, loops=True, before=("before its peaks are reduced", signal))
    pictures = pictures_of(made_document, views, title="T")
    assert "before its peaks are reduced" in labels_of(named(pictures, "ccdf"))
    assert any("before its peaks" in label for label in labels_of(named(pictures, "spectrum")))
    plain = pictures_of(made_document, gated_views, title="T")
    assert "before its peaks are reduced" not in labels_of(named(plain, "ccdf"))


def test_levels_at_the_device_by_hand(made_document):
    """The bench asks for -20 dBm over the period; over bursts half on, the period has 3 dB less."""
    found = absolute_of(made_document)
    assert found.mean_dbm == pytest.approx(-20)
    assert found.name == "level at the input of amplifier, dBm"
    over = made_document["on_time"]["mean_dbfs"] - made_document["mean_dbfs"]
    burst = made_document | {"bench": made_document["bench"] | {"averaged_over": "burst"}}
    assert 2.5 < over < 4
    assert absolute_of(burst).mean_dbm == pytest.approx(-20 - over)
    assert absolute_of({"mean_dbm": -7.0}).mean_dbm == -7.0
    assert absolute_of({}).mean_dbm is None


def test_channels_and_their_leakage_stand_in_the_spectrum(made_document, gated_views):
    picture = named(pictures_of(made_document, gated_views, title="T"), "spectrum")
    assert "over the carrier's: adjacent -" in picture.caption


def test_names_of_a_second_channel_differ(made_document, gated_views):
    names = {item.name for item in pictures_of(made_document, gated_views, title="T", suffix="-b")}
    assert {"ccdf-b", "seam-b"} <= names
