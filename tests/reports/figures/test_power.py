"""Pictures of power statistics."""

import numpy as np
import pytest

from wavegen.reports.figures.power import CcdfCurve, ccdf_figure, density_figure

LEVEL = np.arange(-10, 12, 0.05)
CCDF = np.exp(-(10 ** (LEVEL / 10)))


def curve(**more):
    return CcdfCurve(name="loop", level_db=LEVEL, probability=CCDF, **more)


def test_levels_are_read_off_the_curve():
    assert curve().level_at(0.001) == pytest.approx(8.3934, abs=0.002)
    assert curve().level_at(1e-12) is None


def test_ccdf_figure_shows_what_it_is_given():
    figure = ccdf_figure(
        [curve(low=CCDF * 0.9, high=CCDF * 1.1), curve(kind="reference")],
        title="T",
        mean_dbm=-10.0,
    )
    axes = figure.axes[0]
    assert axes.get_yscale() == "log"
    assert axes.get_xlabel().endswith("dB")
    assert axes.get_ylabel()
    texts = [item.get_text() for item in axes.texts]
    assert "8.39 dB" in texts
    assert len(axes.collections) == 1  # the interval
    dashes = {str(line.get_linestyle()) for line in axes.lines if line.get_label()[0] != "_"}
    assert len(dashes) == 2
    (second,) = axes.child_axes
    assert second.get_xlabel().endswith("dBm")


def test_a_curve_of_a_document_may_lack_an_interval():
    made = CcdfCurve.of("x", {"level_db": [0, 1], "probability": [0.5, 0.1], "low": None})
    assert made.low is None
    assert made.level_at(0.3) == pytest.approx(np.log(0.5 / 0.3) / np.log(5))


def test_a_constant_envelope_can_be_drawn():
    step = np.where(LEVEL < 0, 1.0, 0.0)
    ccdf_figure([CcdfCurve(name="carrier", level_db=LEVEL, probability=step)], title="T")


def test_density_figure_has_two_labelled_panels():
    figure = density_figure(LEVEL, -np.gradient(CCDF, LEVEL), 1 - CCDF, title="T")
    left, right = figure.axes
    assert "1/dB" in left.get_ylabel()
    assert "CDF" in right.get_ylabel()


def test_levels_that_are_given_are_written_as_they_are():
    figure = ccdf_figure([curve()], title="T", marks=[(0.01, 7.654)])
    assert [item.get_text() for item in figure.axes[0].texts] == ["7.65 dB"]
