import math

import numpy as np
import pytest

from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.hoyt import HoytLaw

PROBABILITIES = np.array([0.9, 0.5, 0.1, 1e-3, 1e-6, 1e-9])


@pytest.mark.parametrize("b", [0.0, 0.2, 0.7, 0.999])
def test_levels_and_probabilities_are_inverse(b):
    law = HoytLaw(impropriety=b)
    assert law.ccdf(law.level_db(PROBABILITIES)) == pytest.approx(PROBABILITIES, rel=1e-9)
    assert np.all(np.diff(law.ccdf(np.linspace(-40, 15, 200))) < 0)


def test_levels_rise_with_impropriety_where_power_is_rare():
    levels = [float(HoytLaw(impropriety=b).level_db(1e-4)) for b in (0.0, 0.1, 0.5, 0.9)]
    assert levels == sorted(levels)
    assert levels[0] == pytest.approx(float(GaussianLaw().level_db(1e-4)), abs=1e-9)


def test_the_mean_is_the_integral_of_the_curve():
    law = HoytLaw(impropriety=0.8)
    nodes, weights = np.polynomial.laguerre.laggauss(80)
    scaled = 2.0 * nodes  # the curve falls no slower than exp(-x / 1.8)
    curve = law.ccdf(10 * np.log10(scaled)) * np.exp(nodes)
    assert 2.0 * float(curve @ weights) == pytest.approx(1.0, rel=1e-3)
    assert law.moment(1) == pytest.approx(1.0, rel=1e-14)


def test_ends_and_shapes():
    law = HoytLaw(impropriety=0.4)
    assert law.level_db([0.0, 1.0]).tolist() == [math.inf, -math.inf]
    assert law.ccdf(np.zeros((2, 3))).shape == (2, 3)
    assert law.holds == "over seeds"
    assert law.peak_db == math.inf
