import cmath
import math
from fractions import Fraction

import numpy as np

from wavegen.core.evaluate import evaluate
from wavegen.core.site import Site
from wavegen.sources.carrier import Carrier

SITE = Site(sample_rate_hz=Fraction(1000), n_samples=17, seed=1, label="a", path="signal")


def test_carrier_is_one_value_at_the_phase_asked():
    signal = Carrier(phase_deg=30.0).build(SITE)
    got = evaluate({signal: (-5, 40)})[signal]
    np.testing.assert_allclose(got, cmath.exp(1j * math.pi / 6), atol=1e-7)
    assert got.dtype == np.complex64
    assert signal.mean_power == 1.0


def test_any_loop_will_do_and_the_law_is_a_constant_envelope():
    assert Carrier().cycle(Fraction(1000), "signal").n_samples == 1
    assert Carrier().law(SITE).peak_db == 0.0
