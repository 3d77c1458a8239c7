import numpy as np
import pytest

from wavegen.comparison.curves import (
    ExactCurve,
    PointsCurve,
    SampledCurve,
    ScaleStatistics,
)
from wavegen.laws.gaussian import GaussianLaw
from wavegen.meters.batches import measure_batches
from wavegen.meters.intervals import SampledStatistics
from wavegen.meters.power import measure_samples

LAW = GaussianLaw()
DECADES = np.array([0.1, 0.01, 0.001, 0.0001])


def points(step_db=0.5, top_db=9.6, **settings):
    level = np.arange(-10.0, top_db, step_db)
    return PointsCurve(levels=level, probabilities=LAW.ccdf(level), **settings)


def test_an_exact_curve_is_its_source_shifted():
    curve = ExactCurve(source=LAW, shift_db=3.0)
    assert curve.level_db(0.01) == pytest.approx(float(LAW.level_db(0.01)) + 3)
    assert curve.ccdf(5.0) == pytest.approx(float(LAW.ccdf(2.0)))
    low, high = curve.level_interval(DECADES, confidence=0.99)
    assert low.tolist() == high.tolist() == curve.level_db(DECADES).tolist()
    assert curve.is_resolved(DECADES).all()
    assert not curve.event_samples(DECADES).any()


def test_a_recording_has_intervals_about_its_own_levels(noise, sampled):
    curve = sampled(noise(1 << 16))
    low, high = curve.level_interval(DECADES, confidence=0.95)
    level = curve.level_db(DECADES)
    assert ((low <= level) & (level <= high)).all()
    assert (high - low)[0] < 0.3
    assert curve.n_samples == 1 << 16
    assert curve.is_resolved(DECADES).tolist() == [True, True, True, False]


def test_levels_on_the_scale_of_the_samples_move_with_the_mean(noise):
    """Batches whose level drifts: over the mean that is known better than on the scale."""
    samples = noise(1 << 16) * np.linspace(0.9, 1.1, 1 << 16).astype(np.float32)
    found = measure_batches(samples)
    over_mean = SampledCurve(sampled=SampledStatistics.of(found))
    scale = SampledCurve(sampled=ScaleStatistics.of(found), shift_db=found.statistics.mean_db)
    assert scale.level_db(0.1) == pytest.approx(
        float(over_mean.level_db(0.1)) + found.statistics.mean_db
    )
    widths = [np.ptp(np.array(c.level_interval(0.3, confidence=0.95))) for c in (scale, over_mean)]
    assert widths[0] > 1.5 * widths[1]


def test_between_points_a_curve_bends_as_the_law_does():
    curve = points(step_db=1.0)
    asked = np.logspace(-3.4, -0.5, 50)
    # A straight line in ln q is off by up to 0.1 dB between points 1 dB apart, the cubic by less
    # than a quarter of that (seen: 0.005 dB); and it stays inside what it says of itself.
    error = curve.level_db(asked) - LAW.level_db(asked)
    assert np.abs(error).max() < 0.025
    low, high = curve.level_interval(asked, confidence=0.95)
    assert ((low <= LAW.level_db(asked)) & (LAW.level_db(asked) <= high)).all()
    assert curve.ccdf(LAW.level_db(0.01)) == pytest.approx(0.01, rel=0.1)
    assert curve.ccdf(-50.0) == pytest.approx(float(LAW.ccdf(-10.0)))


def test_beyond_the_points_nothing_is_known():
    curve = points()
    low, high = curve.level_interval([0.99, 1e-6], confidence=0.95)
    assert low[0] == -np.inf
    assert high[1] == np.inf
    assert not curve.is_resolved([0.99, 1e-6]).any()


def test_a_stated_number_of_samples_gives_the_interval():
    with_count, bare = points(n_samples=100_000), points()
    low, high = with_count.level_interval(DECADES, confidence=0.95)
    widths = high - low
    # Standard error of the level at q of n independent samples: 4.343 / (-ln q sqrt(q n)) dB.
    expected = 2 * 1.96 * 4.343 / (-np.log(DECADES) * np.sqrt(DECADES * 1e5))
    assert widths[:3] == pytest.approx(expected[:3], rel=0.15)
    low, high = bare.level_interval(DECADES, confidence=0.95)
    assert (high - low < 0.02)[:3].all()
    assert high[3] == np.inf  # the points end at 9.5 dB, above 1.3e-4


def test_only_what_ten_samples_show_is_resolved():
    assert points(n_samples=20_000).is_resolved([1e-3, 5e-4, 4e-4]).tolist() == [True, True, False]
    least = points().reach[0]
    assert points().is_resolved([10 * least, 9 * least]).tolist() == [True, False]
    assert points(is_exact=True).is_resolved([1e-9]).all()


def test_points_of_a_loop_are_exact_down_to_their_end():
    statistics = measure_samples(np.exp(1j * np.arange(4096)).astype(np.complex64) * 0.5)
    curve = statistics.curve()
    exact = PointsCurve(levels=curve.level_db, probabilities=curve.probability, is_exact=True)
    assert exact.level_db([0.5, 1e-6]) == pytest.approx([0, 0], abs=0.06)
    assert not exact.event_samples(0.1).any()
