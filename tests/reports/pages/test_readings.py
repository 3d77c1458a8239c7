"""What the page's script knows of a figure."""

import numpy as np
import pytest

from wavegen.meters.envelope import Envelope
from wavegen.reports.figures.look import rendered
from wavegen.reports.figures.power import CcdfCurve, ccdf_figure
from wavegen.reports.figures.time import envelope_figure
from wavegen.reports.figures.trade import difference_figure
from wavegen.reports.pages.readings import readings_of


def test_panels_scales_and_curves():
    level = np.arange(-10, 12, 0.05)
    share = np.exp(-(10 ** (level / 10)))
    figure = ccdf_figure([CcdfCurve(name="loop", level_db=level, probability=share)], title="T")
    rendered(figure, "svg")
    (panel,) = readings_of(figure)
    left, top, right, bottom = panel["box"]
    assert 0 < left < right < 8 * 72
    assert 0 < top < bottom < 5.4 * 72
    assert panel["y"]["log"]
    assert panel["y"]["to"] == 1.0
    (curve,) = panel["curves"]
    assert curve["name"] == "loop"
    k = int(np.searchsorted(curve["x"], 0.0))
    assert curve["y"][k] == pytest.approx(np.exp(-(10 ** (curve["x"][k] / 10))), rel=1e-4)
    assert len(curve["x"]) <= 600


def test_steps_are_read_at_their_middle():
    power = np.array([1.0, 2.0, 4.0])
    envelope = Envelope(lowest=power, mean=power, highest=power, duration_s=3e-3, total_mean=1.0)
    figure = envelope_figure(envelope, title="T")
    rendered(figure, "svg")
    (panel,) = readings_of(figure)
    (curve,) = panel["curves"]
    assert curve["x"] == pytest.approx([0.5, 1.5, 2.5])
    assert curve["y"] == pytest.approx([0, 3.0103, 6.0206], abs=1e-4)


def test_an_axis_that_falls_is_read_too():
    rows = [
        {"probability": q, "difference_db": d, "low_db": None, "high_db": None}
        for q, d in ((0.5, 0.1), (0.1, 0.2), (0.01, 0.3))
    ]
    figure = difference_figure(rows, title="T", name="a less b, dB", tolerance_db=0.2)
    rendered(figure, "svg")
    (panel,) = readings_of(figure)
    assert panel["x"]["from"] > panel["x"]["to"]
    (curve,) = panel["curves"]
    assert curve["x"] == [0.01, 0.1, 0.5]
    assert curve["y"] == [0.3, 0.2, 0.1]
