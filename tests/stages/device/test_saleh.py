import numpy as np
import pytest

from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import GaussianTerm
from wavegen.stages.device.saleh import Saleh


def test_curves_with_other_coefficients():
    settings = Saleh(am_am=(3.0, 0.5), am_pm=(2.0, 1.0), input_back_off_db=0.0)
    amplifier = settings.amplifier()
    r = np.array([0.0, 0.5, 1.0, 4.0])
    want = 3 / (1 + 0.5 * r**2) * np.exp(2j * r**2 / (1 + r**2))
    np.testing.assert_allclose(amplifier.gain(r), want, rtol=1e-14)
    assert amplifier.saturation == pytest.approx(np.sqrt(2))


def test_drive_and_law_use_the_same_back_off(bench):
    settings = Saleh(input_back_off_db=7.0)
    site = bench.site(4000)
    signal = settings.build(site, bench.given([1.0, -1.0j], n_samples=4000))
    rms = settings.amplifier().saturation * 10**-0.35
    assert signal.drive == pytest.approx(rms, rel=1e-6)
    curve = settings.law(site, GaussianLaw()).curve
    assert abs(curve(np.array([1.0]))[0]) == pytest.approx(settings.amplifier().output(rms))
    assert "Saleh" in settings.term(site, GaussianTerm(name="noise")).name
