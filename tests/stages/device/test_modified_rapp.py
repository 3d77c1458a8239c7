import numpy as np
import pytest

from wavegen.core.units import QuantityError
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import GaussianTerm
from wavegen.stages.device.modified_rapp import ModifiedRapp


def test_curves_with_other_coefficients():
    settings = ModifiedRapp(
        small_signal=4.0,
        asymptote=2.0,
        smoothness=1.5,
        am_pm=(30.0, 0.2, 3.0, 2.5),
        input_back_off_db=0.0,
    )
    amplifier = settings.amplifier()
    r = np.array([0.0, 0.1, 0.5, 1.0])
    size = 4 / (1 + (2 * r) ** 3) ** (1 / 3)
    want = size * np.exp(1j * 30 * r**3 / (1 + (r / 0.2) ** 2.5))
    np.testing.assert_allclose(amplifier.gain(r), want, rtol=1e-13)
    assert (amplifier.saturation, amplifier.highest_output) == (0.5, 2.0)


@pytest.mark.parametrize("am_pm", [(1, 0, 4, 4), (1, 0.1, -1, 4), (1, 0.1, 4, 0)])
def test_a_phase_that_is_not_finite_is_refused(am_pm):
    with pytest.raises(QuantityError) as caught:
        ModifiedRapp(am_pm=am_pm, input_back_off_db=0.0)
    assert caught.value.key == "am_pm"


def test_drive_and_law_use_the_same_back_off(bench):
    settings = ModifiedRapp(input_back_off_db=7.0)
    site = bench.site(4000)
    signal = settings.build(site, bench.given([1.0, -1.0j], n_samples=4000))
    rms = 1.9 / 16 * 10**-0.35
    assert signal.drive == pytest.approx(rms, rel=1e-6)
    curve = settings.law(site, GaussianLaw()).curve
    assert abs(curve(np.array([1.0]))[0]) == pytest.approx(settings.amplifier().output(rms))
    assert "modified Rapp" in settings.term(site, GaussianTerm(name="noise")).name
