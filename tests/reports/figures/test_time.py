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
