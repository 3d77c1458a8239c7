import numpy as np
import pytest
import scipy.stats

from wavegen.comparison.familiar import FAMILIES, CarrierPlusNoise, EqualTones, ShapedCarrier
from wavegen.laws.gaussian import GaussianLaw

ASKED = np.array([0.5, 0.1, 0.01, 1e-3, 1e-4])


@pytest.mark.parametrize("family", FAMILIES, ids=lambda item: item.name)
def test_levels_fall_with_the_probability_rising(family):
    for value in (family.values[0], family.values[-1]):
        levels = family.levels(value, ASKED)
        assert np.isfinite(levels).all()
        assert (np.diff(levels) >= 0).all()


def test_carrier_plus_noise_goes_from_noise_to_a_carrier():
    law = CarrierPlusNoise()
    assert law.levels(-60.0, ASKED) == pytest.approx(GaussianLaw().level_db(ASKED), abs=1e-3)
    assert law.levels(60.0, ASKED) == pytest.approx(np.zeros(5), abs=0.04)


def test_carrier_plus_noise_is_rices_law():
    """Against scipy.stats.rice: amplitude over the noise's sigma per rail, b = sqrt(2 K)."""
    ratio = 4.0
    amplitude = scipy.stats.rice(np.sqrt(2 * ratio)).isf(ASKED)
    expected = 10 * np.log10(amplitude**2 / (2 * (1 + ratio)))
    assert CarrierPlusNoise().levels(10 * np.log10(ratio), ASKED) == pytest.approx(
        expected, abs=1e-6
    )


def test_roll_off_lowers_the_peaks_of_qpsk():
    law = ShapedCarrier("qpsk")
    assert law.levels(0.22, ASKED)[-1] == pytest.approx(4.92, abs=0.06)  # own simulation
    assert law.levels(0.1, ASKED)[-1] > law.levels(0.5, ASKED)[-1] + 2


def test_tones():
    assert EqualTones().levels(1.0, ASKED).tolist() == [0.0] * 5
    assert EqualTones().levels(2.0, ASKED)[0] == pytest.approx(0.0, abs=1e-6)  # 1 + cos
