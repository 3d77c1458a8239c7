"""Pictures of power statistics."""

import numpy as np
import pytest

from wavegen.reports.figures.power import (
    CcdfCurve,
    Spread,
    ccdf_figure,
    density_figure,
    gaussian_curve,
)

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


def shown(figure):
    return [line for line in figure.axes[0].lines if line.get_label()[0] != "_"]


def test_a_loop_ends_at_its_peak_and_not_in_the_air():
    step = np.where(LEVEL < 0, 1.0, 0.0)
    carrier = CcdfCurve(name="carrier", level_db=LEVEL, probability=step, peak_db=0.0)
    figure = ccdf_figure([carrier], title="T")
    (line,) = shown(figure)
    assert list(line.get_xdata()[-2:]) == [0, 0]
    assert line.get_ydata()[-1] < figure.axes[0].get_ylim()[0]
    assert figure.axes[0].get_ylim()[0] == pytest.approx(1e-4)


def test_law_reference_and_measurement_differ_by_their_dashes():
    figure = ccdf_figure([curve(), curve(), curve(kind="law"), gaussian_curve()], title="T")
    dashes = {
        str(line.get_linestyle()) + str(line._unscaled_dash_pattern) for line in shown(figure)
    }
    assert len(dashes) == 4


def test_the_complex_gaussian_goes_on_to_the_edge():
    short = CcdfCurve(name="QPSK", level_db=LEVEL[LEVEL < 3], probability=CCDF[LEVEL < 3])
    figure = ccdf_figure([short, gaussian_curve()], title="T")
    gaussian = shown(figure)[1]
    assert gaussian.get_xdata()[-1] > figure.axes[0].get_xlim()[1]
    place = int(np.argmin(np.abs(gaussian.get_xdata() - 8.3934)))
    assert gaussian.get_ydata()[place] == pytest.approx(1e-3, rel=0.1)  # 10 log10(ln 1000)


def test_the_process_behind_a_loop_is_a_band():
    spread = Spread(
        name="process",
        probability=np.array([0.1, 0.01]),
        low_db=np.array([3.5, 6.5]),
        high_db=np.array([3.7, 6.8]),
    )
    (band,) = ccdf_figure([curve()], title="T", spread=spread).axes[0].collections
    corners = band.get_paths()[0].vertices
    assert corners[:, 0].min() == pytest.approx(3.5)
    assert corners[:, 0].max() == pytest.approx(6.8)
    # It follows the curve between its rows: both ends at 3 %, neither a chord.
    probability, low_db, high_db = spread.along(curve())
    own = np.array([curve().level_at(q) for q in probability])
    assert probability.size > 10
    assert np.all(low_db < own)
    assert np.all(high_db > own)
    assert np.all(high_db - low_db < 0.31)


def test_levels_in_dbm_stand_over_those_in_db():
    figure = ccdf_figure([curve()], title="T", mean_dbm=-7.0, level_name="P, dBm")
    figure.draw_without_rendering()
    (second,) = figure.axes[0].child_axes
    low, high = second.get_xlim()
    first = figure.axes[0].get_xlim()
    assert (low, high) == pytest.approx((first[0] - 7, first[1] - 7))
    assert second.get_xlabel() == "P, dBm"


def test_density_of_a_constant_envelope_is_one_bar():
    """All of it within one step of 0.05 dB: 20 / dB; shown over 6 dB at least."""
    level = np.arange(-600, 2) / 20
    pdf = np.where(np.isclose(level, -0.05), 20.0, 0.0)
    figure = density_figure(level, pdf, np.where(level < -1e-9, 0.0, 1.0), title="T")
    left = figure.axes[0]
    low, high = left.get_xlim()
    assert high - low == pytest.approx(6, abs=0.2)
    heights = left.patches[0].get_data().values
    edges = left.patches[0].get_data().edges
    assert heights.max() == pytest.approx(20)
    assert np.sum(heights * np.diff(edges)) == pytest.approx(1)


def test_bars_hold_as_much_as_the_density():
    figure = density_figure(LEVEL, -np.gradient(CCDF, LEVEL), 1 - CCDF, title="T")
    data = figure.axes[0].patches[0].get_data()
    assert data.values.size <= 121
    inside = np.sum(data.values * np.diff(data.edges))
    assert inside == pytest.approx(CCDF[0] - CCDF[-1], abs=2e-3)


def test_an_interval_that_says_nothing_is_not_shaded():
    empty = np.zeros(LEVEL.size)
    known = curve(low=np.where(LEVEL < 0, 0.9 * CCDF, 0.0), high=np.where(LEVEL < 0, CCDF, 1.0))
    unknown = curve(low=empty, high=empty + 1)
    axes = ccdf_figure([known, unknown], title="T").axes[0]
    (first,) = axes.collections
    assert max(path.vertices[:, 0].max() for path in first.get_paths()) < 0.01
