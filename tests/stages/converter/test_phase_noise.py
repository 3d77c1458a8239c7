from fractions import Fraction

import numpy as np
import pytest
import scipy.integrate

from wavegen.core.render import samples_of
from wavegen.core.units import QuantityError
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.term import GaussianTerm, NoLaw
from wavegen.stages.converter.phase_noise import PhaseMask, PhaseNoise

MASK = PhaseMask.parse(
    [["1 kHz", "-60 dBc/Hz"], ["10 kHz", "-90 dBc/Hz"], ["100 kHz", "-95 dBc/Hz"]]
)


def test_levels_lie_straight_in_db_over_octaves_and_are_held():
    got = 10 * np.log10(MASK.density(np.array([1.0, 1e3, 10**3.5, 1e4, 1e5, 1e9])))
    np.testing.assert_allclose(got, [-60, -60, -75, -90, -95, -95], atol=1e-9)


def test_the_integral_is_closed():
    want, _ = scipy.integrate.quad(
        lambda u: float(MASK.density(np.exp([u]))[0]) * np.exp(u),
        np.log(100.0),
        np.log(3e5),
        points=np.log([1e3, 1e4, 1e5]),
        limit=200,
    )
    assert MASK.phase_rad(100.0, 3e5) == pytest.approx(np.sqrt(2 * want), rel=1e-7)
    inverse = PhaseMask.parse([["1 Hz", "-60 dBc/Hz"], ["1 MHz", "-120 dBc/Hz"]])
    assert inverse.phase_rad(10, 1e5) == pytest.approx(np.sqrt(2e-6 * np.log(1e4)))


def test_only_the_phase_moves(bench):
    source = bench.gaussian(50_000)
    site = bench.site(50_000)
    signal = PhaseNoise(mask=MASK).build(site, source)
    ratio = samples_of(signal).astype(np.complex128) / samples_of(source)
    np.testing.assert_allclose(np.abs(ratio), 1.0, atol=1e-5)
    phase = np.angle(ratio)
    asked = float(site.notes[0].text.split("RMS phase ")[1].split()[0])
    # Lines near the carrier hold most of it: 100 of them or so, 4 sigma.
    assert np.rad2deg(np.std(phase)) == pytest.approx(asked, rel=0.3)
    assert signal.mean_power == source.mean_power
    assert signal.acts_on is source


def test_what_is_slower_than_the_loop_is_told(bench):
    site = bench.site(500)  # lines from 2 kHz on
    PhaseNoise(mask=MASK).build(site, bench.gaussian(500))
    assert "slower than the loop" in site.notes[0].text


def test_notation():
    again = PhaseMask.parse(MASK.text())
    assert again == MASK
    assert MASK.points[0] == (Fraction(1000), Fraction(-60))


@pytest.mark.parametrize(
    "value",
    [
        [],
        "1 kHz",
        [["1 kHz"]],
        [["1 kHz", "-60 dB"]],
        [["1 kHz", -60]],
        [["1 kHz", "3 dBc/Hz"]],
        [["1 kHz", "-301 dBc/Hz"]],
        [["0 Hz", "-60 dBc/Hz"]],
        [["1 kHz", "-60 dBc/Hz"], ["1 kHz", "-70 dBc/Hz"]],
        [["1 m", "-60 dBc/Hz"]],
        [["1 kHz", "-60 dBc/Hz"]] * 65,
    ],
)
def test_other_notation_is_refused(value):
    with pytest.raises(QuantityError):
        PhaseMask.parse(value)


def test_laws(bench):
    settings = PhaseNoise(mask=MASK)
    law = ConstantLaw()
    assert settings.law(bench.site(10), law) is law
    term = GaussianTerm(name="noise")
    assert settings.term(bench.site(10), term) is term
    square = GaussianTerm(name="square", symmetry=4)
    assert isinstance(settings.term(bench.site(10), square), NoLaw)
