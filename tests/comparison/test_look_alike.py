import numpy as np
import pytest

from wavegen.comparison.curves import ExactCurve
from wavegen.comparison.familiar import CarrierPlusNoise, EqualTones, ShapedCarrier
from wavegen.comparison.look_alike import look_alikes, plateau_duty
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.mapped import GatedLaw, clip_law


class Tabled:
    """Levels of a family as a curve."""

    def __init__(self, family, value):
        self.share = np.logspace(np.log10(0.9999), -6, 400)
        self.level = family.levels(value, self.share)

    def level_db(self, probability):
        return np.interp(-np.log(probability), -np.log(self.share), self.level)

    def ccdf(self, level_db):
        return np.exp(np.interp(level_db, self.level, np.log(self.share), left=0.0, right=-np.inf))


def nearest(source, lowest=1e-4):
    return look_alikes(ExactCurve(source=source), lowest=lowest)[0]


def test_noise_is_gaussian_and_no_more_is_fitted():
    first = nearest(GaussianLaw())
    assert first.family.name == "complex Gaussian"
    assert first.duty == 1
    assert first.is_near
    assert abs(first.largest_deviation_db) < 1e-9


def test_a_number_that_gains_nothing_is_not_fitted():
    """A ceiling at 9.6 dB stands 0.04 dB below the level at 0.01 %: none is as good."""
    first = nearest(clip_law(GaussianLaw(), 9.6))
    assert first.family.name == "complex Gaussian"
    assert abs(first.largest_deviation_db) > 0.01


def test_a_ceiling_is_found():
    first = nearest(clip_law(GaussianLaw(), 7.3))
    assert first.family.parameter == "ceiling_db"
    assert first.value == pytest.approx(7.3, abs=0.02)


def test_a_carrier_in_noise_is_found():
    first = nearest(Tabled(CarrierPlusNoise(), 7.0))
    assert first.family.parameter == "carrier_to_noise_db"
    assert first.value == pytest.approx(7.0, abs=0.1)


@pytest.mark.parametrize(("constellation", "roll_off"), [("qpsk", 0.22), ("bpsk", 0.35)])
def test_a_roll_off_is_found(constellation, roll_off):
    first = nearest(Tabled(ShapedCarrier(constellation), roll_off))
    assert first.family.constellation == constellation
    assert first.value == pytest.approx(roll_off, abs=0.03)


def test_tones_are_counted():
    first = nearest(Tabled(EqualTones(), 4.0))
    assert (first.family.parameter, first.value) == ("n_tones", 4.0)


def test_a_duty_is_found_and_a_law_is_fitted_to_the_on_time():
    gated = GatedLaw(source=GaussianLaw(), duty_fully_on=0.3, ramp=np.zeros(0))
    assert plateau_duty(ExactCurve(source=gated)) == pytest.approx(0.3, rel=0.03)
    first = nearest(gated)
    assert first.family.name == "complex Gaussian"
    assert first.duty == pytest.approx(0.3, rel=0.03)
    assert first.is_near


@pytest.mark.parametrize("source", [GaussianLaw(), Tabled(CarrierPlusNoise(), 10.0)])
def test_what_is_never_off_has_no_duty(source):
    assert plateau_duty(ExactCurve(source=source)) is None


def test_too_short_a_curve_looks_like_nothing():
    assert look_alikes(ExactCurve(source=GaussianLaw()), lowest=0.2) == ()
