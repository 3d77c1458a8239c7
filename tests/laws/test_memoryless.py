import math

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.laws.memoryless import MemorylessStep, band_shares, polar_clip


def test_a_straight_curve_does_nothing():
    step = MemorylessStep.of(lambda r: 2j * r)
    assert step.gain == pytest.approx(2j, abs=1e-12)
    assert step.distortion_power == pytest.approx(0, abs=1e-12)
    assert step.mean_shift_db == pytest.approx(20 * math.log10(2), abs=1e-12)
    assert step.aclr_db() > 110


def test_terms_add_up_to_the_output_power():
    curve, kinks = polar_clip(3.0)
    step = MemorylessStep.of(curve, kinks=kinks)
    left = step.output_power - np.sum(np.abs(step.terms) ** 2)
    # A kink leaves n^-3/2: 400 terms leave 5e-5 of the distortion.
    assert 0 < left < 1e-4 * step.distortion_power


def test_shares_are_those_of_sums_of_uniform_variables():
    # Irwin-Hall: 3 uniforms lie within 1/2 of their middle with 2/3, in 1/2 ... 3/2 with 1/6.
    assert band_shares(-0.5, 0.5, 3) == pytest.approx([1, 2 / 3, 0.55], abs=1e-15)
    assert band_shares(0.5, 1.5, 2) == pytest.approx([0, 1 / 6], abs=1e-15)
    assert band_shares(-0.25, 0.25, 1) == pytest.approx([0.5])


@pytest.mark.parametrize(("low", "high"), [(-0.5, 0.5), (0.3, 1.1), (1.5, 2.5)])
def test_shares_of_high_orders_are_nearly_gaussian(low, high):
    from scipy.stats import norm

    n = np.arange(401)
    sigma = np.sqrt((2 * n + 1) / 12)
    want = norm.cdf(high / sigma) - norm.cdf(low / sigma)
    # First term of Edgeworth's series: excess -1.2 / (2 n + 1).
    assert band_shares(low, high, 401)[100:] == pytest.approx(want[100:], rel=0.005)
    assert np.all(band_shares(-300.0, 300.0, 200) == pytest.approx(1.0, abs=1e-13))


def test_all_of_the_distortion_lies_somewhere():
    curve, kinks = polar_clip(5.0)
    step = MemorylessStep.of(curve, kinks=kinks, n_terms=60)
    total = sum(step.distortion_share(k - 0.5, k + 0.5) for k in range(-40, 41))
    # What is left out counts with 3/4 of the last term in each channel, so not quite as 1.
    assert total == pytest.approx(1, abs=1e-3)


@pytest.mark.parametrize("curve", [lambda r: 0 * r, lambda r: r / (r < 5), lambda r: r * np.nan])
def test_a_curve_that_is_none(curve):
    with np.errstate(divide="ignore"), pytest.raises(SignalError) as caught:
        MemorylessStep.of(curve)
    assert caught.value.where == "curve"
