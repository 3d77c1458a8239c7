import numpy as np
import pytest

from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import GaussianTerm
from wavegen.stages.device.rapp import Rapp


@pytest.mark.parametrize("p", [0.2, 1.1, 3.0, 100.0])
def test_curve_at_all_amplitudes(p):
    gain = Rapp(smoothness=p, input_back_off_db=0.0).amplifier().gain
    r = np.array([0.0, 1e-3, 0.3, 0.9, 1.0, 1.1, 2.0])
    np.testing.assert_allclose(gain(r), (1 + r ** (2 * p)) ** (-0.5 / p), rtol=1e-13)
    far = gain(np.array([1e8]))
    assert np.abs(far[0]) * 1e8 == pytest.approx((1 + 1e8 ** (-2 * p)) ** (-0.5 / p), rel=1e-12)


def test_drive_and_law_use_the_same_back_off(bench):
    settings = Rapp(input_back_off_db=7.0, back_off_from="compression")
    site = bench.site(4000)
    signal = settings.build(site, bench.given([1.0, -1.0j], n_samples=4000))
    rms = settings.amplifier().compression * 10**-0.35
    assert signal.drive == pytest.approx(rms, rel=1e-6)
    law = settings.law(site, GaussianLaw())
    assert law.curve(np.array([1.0])) == pytest.approx(rms * (1 + rms**4) ** -0.25)
    assert "Rapp, p = 2" in settings.term(site, GaussianTerm(name="noise")).name
