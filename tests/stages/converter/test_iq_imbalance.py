import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.stages.converter.iq_imbalance import IqImbalance, image_factors


def test_rails_are_mixed_as_written(bench):
    source = bench.gaussian(20_000)
    site = bench.site(20_000)
    signal = IqImbalance(gain_db=2.0, phase_deg=10.0).build(site, source)
    x = samples_of(source).astype(np.complex128)
    turn = np.exp(0.5j * np.deg2rad(10.0))
    y = 10**0.05 / turn * x.real + 1j * 10**-0.05 * turn * x.imag
    y *= np.sqrt(np.mean(np.abs(x) ** 2) / np.mean(np.abs(y) ** 2))
    np.testing.assert_allclose(samples_of(signal), y, atol=2e-6)
    assert signal.mean_power == source.mean_power
    assert "below the signal" in site.notes[0].text


def test_the_mean_stays_for_one_rail_alone(bench):
    """BPSK on I: the mean before the change is undone is that of one rail."""
    source = bench.given([1.0, -1.0, 1.0, 1.0])
    signal = IqImbalance(gain_db=6.0).build(bench.site(4), source)
    np.testing.assert_allclose(np.abs(samples_of(signal)), 1.0, rtol=1e-6)


def test_factors():
    for gain_db, phase_deg in ((0.0, 0.0), (3.0, -20.0), (-1.0, 45.0)):
        signal, image = image_factors(gain_db, phase_deg)
        assert abs(signal) ** 2 + abs(image) ** 2 == pytest.approx(1.0)
    assert image_factors(0.0, 0.0) == (1, 0)


def test_silence_is_refused(bench):
    with pytest.raises(RecipeError):
        IqImbalance(gain_db=1.0).build(bench.site(2), bench.given([0, 0]))
