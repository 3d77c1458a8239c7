import math

import numpy as np
import pytest

from wavegen.core.units import QuantityError
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import GaussianTerm
from wavegen.stages.device.ghorbani import Ghorbani


def test_curves_with_other_coefficients():
    settings = Ghorbani(
        am_am=(2.0, 1.5, 0.5, 0.1), am_pm=(1.0, 2.0, 3.0, 0.2), input_back_off_db=0.0
    )
    amplifier = settings.amplifier()
    r = np.array([0.1, 0.5, 1.0, 4.0])
    size = 2 * r**1.5 / (1 + 0.5 * r**1.5) + 0.1 * r
    want = size / r * np.exp(1j * (r**2 / (1 + 3 * r**2) + 0.2 * r))
    np.testing.assert_allclose(amplifier.gain(r), want, rtol=1e-13)
    assert amplifier.gain(np.zeros(1))[0] == pytest.approx(0.1)
    assert amplifier.saturation == math.inf  # rises without end


def test_highest_output():
    amplifier = Ghorbani(input_back_off_db=0.0).amplifier()
    r = np.linspace(0.5, 4.0, 20_001)
    output = r * np.abs(amplifier.gain(r))
    assert amplifier.saturation == pytest.approx(r[np.argmax(output)], abs=2e-4)
    assert amplifier.highest_output == pytest.approx(output.max(), rel=1e-8)


@pytest.mark.parametrize("am_am", [(1.0, 0.9, 1.0, 0.0), (1.0, 1.5, -1.0, 0.0)])
def test_curves_that_are_not_finite_are_refused(am_am):
    with pytest.raises(QuantityError) as caught:
        Ghorbani(am_am=am_am, input_back_off_db=0.0)
    assert caught.value.key == "am_am"


def test_drive_and_law_use_the_same_back_off(bench):
    settings = Ghorbani(input_back_off_db=7.0)
    site = bench.site(4000)
    signal = settings.build(site, bench.given([1.0, -1.0j], n_samples=4000))
    rms = settings.amplifier().saturation * 10**-0.35
    assert signal.drive == pytest.approx(rms, rel=1e-6)
    curve = settings.law(site, GaussianLaw()).curve
    assert abs(curve(np.array([1.0]))[0]) == pytest.approx(settings.amplifier().output(rms))
    assert "Ghorbani" in settings.term(site, GaussianTerm(name="noise")).name
