import numpy as np
import pytest

from wavegen.comparison.curves import ExactCurve
from wavegen.comparison.gain import (
    GainPoints,
    SmallSignal,
    compression,
    fit_rapp,
    gain_points,
    points_at,
    small_signal,
)
from wavegen.meters.power import measure_samples


def rapp_gain_db(input_db, smoothness=2.0):
    return -10 / smoothness * np.log10(1 + 10 ** (smoothness * input_db / 10))


def p1db(smoothness=2.0):
    """Input level over saturation at which a Rapp curve has lost 1 dB (by its formula)."""
    return 10 / smoothness * np.log10(10 ** (smoothness / 10) - 1)


def loop(samples):
    found = measure_samples(samples)
    return ExactCurve(source=found, shift_db=found.mean_db), found.mean_db


@pytest.fixture
def driven(noise):
    def driven(n, back_off_db):
        return (noise(n) * 10 ** (-back_off_db / 20)).astype(np.complex64)

    return driven


def test_a_loop_through_a_device_is_exact(driven, rapp):
    samples = driven(1 << 17, 9.0)
    source, mean_db = loop(samples)
    output, _ = loop(rapp(samples))
    found = gain_points(source, output, mean_db=mean_db)
    # Levels are read between bins 0.0085 dB wide, on both sides.
    assert found.gain_db == pytest.approx(rapp_gain_db(found.input_db), abs=0.01)
    assert not found.error_db.any()
    small = small_signal(found, mean_db=mean_db)
    assert small.gain_db == pytest.approx(0, abs=0.01)
    assert small.error_db == 0
    point = compression(found, small, fall_db=1.0)
    assert point.input_db == pytest.approx(p1db(), abs=0.03)
    assert point.low_db == point.high_db == point.input_db
    assert point.output_db == pytest.approx(point.input_db - 1, abs=0.02)


def test_different_captures_have_intervals_that_hold(driven, on_scale, rapp):
    """Twenty pairs of 2^16 samples: 95 % intervals, so a mean share within 0.90 to 1.

    A P1dB interval that misses in three or more of twenty has a chance of 7.5 %; four, 1.6 %.
    """
    shares, missed = [], 0
    for _ in range(20):
        source = on_scale(driven(1 << 16, 6.0))
        output = on_scale(rapp(driven(1 << 16, 6.0)))
        found = gain_points(source, output, mean_db=source.shift_db)
        true = rapp_gain_db(found.input_db)
        shares.append(np.mean((found.low_db <= true) & (true <= found.high_db)))
        point = compression(found, small_signal(found, mean_db=source.shift_db), fall_db=1.0)
        missed += not point.low_db <= p1db() <= point.high_db
    assert np.mean(shares) > 0.9
    assert missed <= 4


def test_a_linear_device_has_one_gain_and_no_compression(driven, on_scale):
    source = on_scale(driven(1 << 17, 0.0))
    output = on_scale(driven(1 << 17, -20.0))
    found = gain_points(source, output, mean_db=source.shift_db)
    assert (np.abs(found.gain_db - 20) < 2 * found.error_db).all()  # four standard errors
    small = small_signal(found, mean_db=source.shift_db)
    assert small.gain_db == pytest.approx(20, abs=2 * small.error_db)
    assert compression(found, small, fall_db=1.0) is None
    assert fit_rapp(found, small) is None


def test_expansion_is_no_compression(driven):
    samples = driven(1 << 16, 10.0)
    source, mean_db = loop(samples)
    output, _ = loop((samples * (1 + np.abs(samples) ** 2)).astype(np.complex64))
    found = gain_points(source, output, mean_db=mean_db)
    assert found.gain_db[-1] > 2
    assert compression(found, small_signal(found, mean_db=mean_db), fall_db=1.0) is None


def test_a_rapp_curve_is_found_again(driven, rapp):
    samples = driven(1 << 17, 6.0)
    source, mean_db = loop(samples)
    output, _ = loop(3 * rapp(samples, smoothness=3.0))
    found = gain_points(source, output, mean_db=mean_db)
    fit = fit_rapp(found, small_signal(found, mean_db=mean_db))
    assert fit.smoothness == pytest.approx(3.0, rel=0.03)
    assert fit.saturation_db == pytest.approx(20 * np.log10(3), abs=0.03)
    assert fit.gain_db == pytest.approx(20 * np.log10(3), abs=0.02)
    assert fit.largest_db < 0.02
    assert fit.output_db(np.array([200.0])) == pytest.approx(fit.saturation_db, abs=0.01)


def test_walls_and_gates_leave_one_point_a_level(driven):
    samples = driven(1 << 14, 0.0)
    samples[: 1 << 13] = 0
    wall = samples / np.maximum(np.abs(samples), 1)
    source, _ = loop(wall.astype(np.complex64))
    found = points_at(source, source, np.array([0.9, 0.5, 0.3, 0.01, 0.001]))
    assert (np.diff(found.input_db) > 0).all()
    assert np.isfinite(found.input_db).all()
    assert found.gain_db == pytest.approx(np.zeros(found.input_db.size))


def test_a_fall_at_the_last_point_leaves_the_upper_end_open():
    level = np.arange(0.0, 10.0)
    gain = -np.maximum(level - 7.7, 0)
    found = GainPoints(
        probability=np.logspace(-0.5, -4, 10),
        input_db=level,
        output_db=level + gain,
        low_db=gain - 0.5,
        high_db=gain + 0.5,
    )
    small = small_signal(found, mean_db=-5.0)  # nothing so low: the lowest point counts
    assert (small.gain_db, small.error_db) == (0, 0.5)
    point = compression(found, small, fall_db=1.0)
    assert point.input_db == pytest.approx(8.7, abs=0.05)
    assert point.high_db == np.inf
    assert point.low_db < 8.2


def test_a_fall_below_the_first_point_leaves_the_lower_end_open():
    level = np.arange(0.0, 10.0)
    gain = -0.3 * level
    found = GainPoints(
        probability=np.logspace(-0.5, -4, 10),
        input_db=level,
        output_db=level + gain,
        low_db=gain - 0.1,
        high_db=gain + 0.1,
    )
    point = compression(found, SmallSignal(gain_db=2.0, error_db=0.0), fall_db=1.0)
    assert (point.low_db, point.input_db) == (-np.inf, 0)
