"""Pictures over time."""

import numpy as np
import pytest

from wavegen.meters.envelope import Envelope
from wavegen.reports.figures.time import envelope_figure, seam_picture, time_unit


@pytest.mark.parametrize(
    ("span", "unit"), [(12, "s"), (0.5, "ms"), (2e-5, "µs"), (3e-8, "ns"), (1e-12, "ns")]
)
def test_unit_suits_the_span(span, unit):
    assert time_unit(span)[1] == unit


def test_power_is_over_the_mean_and_on_times_are_shaded():
    power = np.array([1.0, 2.0, 0.0, 1.0])
    envelope = Envelope(
        lowest=power / 2, mean=power, highest=power * 2, duration_s=4e-3, total_mean=1.0
    )
    figure = envelope_figure(envelope, title="T", on_times_s=[(0, 1e-3), (3e-3, 4e-3)])
    axes = figure.axes[0]
    span, mean = axes.patches[-2:]
    assert mean.get_data().values[:2] == pytest.approx([0, 3.0103], abs=1e-4)
    assert span.get_data().values[1] == pytest.approx(6.0206, abs=1e-4)
    assert len(axes.patches) == 4
    assert axes.get_xlabel() == "time, ms"


def test_seam_stands_in_the_middle():
    figure = seam_picture(np.exp(0.1j * np.arange(20)), sample_rate_hz=1e6, title="T")
    low, high = figure.axes[0].get_xlim()
    assert low == pytest.approx(-10)
    assert high == pytest.approx(9)


def flat(level=1.0):
    power = np.full(8, level)
    return Envelope(lowest=power, mean=power, highest=power, duration_s=8e-3, total_mean=level)


def test_a_constant_envelope_stands_inside_the_picture():
    low, high = envelope_figure(flat(), title="T").axes[0].get_ylim()
    assert low <= -7
    assert high >= 2


def test_on_times_have_a_bar_that_grey_shows_too():
    axes = envelope_figure(flat(), title="T", on_times_s=[(0, 1e-3), (3e-3, 4e-3)]).axes[0]
    (bar,) = axes.collections
    assert bar.get_label() == "on: 2 times"
    assert bar.get_facecolor()[0][:3].mean() < 0.3  # dark
    starts = [path.vertices[:, 0].min() for path in bar.get_paths()]
    assert starts == pytest.approx([0, 3])  # ms
    shade = axes.patches[0].get_facecolor()[:3]
    assert np.mean(shade) < 0.93  # seen on white


def test_a_second_axis_tells_dbm():
    figure = envelope_figure(flat(), title="T", mean_dbm=-10.0)
    figure.draw_without_rendering()
    (second,) = figure.axes[0].child_axes
    assert second.get_ylim()[0] == pytest.approx(figure.axes[0].get_ylim()[0] - 10)


def test_times_are_written_with_three_digits():
    power = np.ones(7)
    envelope = Envelope(
        lowest=power, mean=power, highest=power, duration_s=16.3835e-3, total_mean=1.0
    )
    labels = envelope_figure(envelope, title="T").axes[0].get_legend_handles_labels()[1]
    assert "mean of each 2.34 ms" in labels


def test_real_samples_have_no_quadrature_at_the_seam():
    around = np.exp(0.1j * np.arange(20))
    figure = seam_picture(around, sample_rate_hz=1e6, title="T", is_real=True)
    assert figure.axes[0].get_legend_handles_labels()[1] == ["samples"]
