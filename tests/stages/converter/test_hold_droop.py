from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.laws.constant import ConstantLaw
from wavegen.laws.gaussian import GaussianLaw
from wavegen.laws.term import NoLaw
from wavegen.stages.converter.hold_droop import HoldDroop

N = 4000


def tones(bench, lines):
    place = np.arange(N) / N
    return bench.given(sum(np.exp(2j * np.pi * line * place) for line in lines).tolist())


def gains(bench, lines, **fields):
    source = tones(bench, lines)
    site = bench.site(N)
    signal = HoldDroop(**fields).build(site, source)
    spectrum = np.fft.fft(samples_of(signal).astype(np.complex128)) / N
    return spectrum[lines], site.notes


@pytest.mark.parametrize("inverse", [False, True])
@pytest.mark.parametrize("factor", [1, 4])
def test_each_tone_gets_its_weight(bench, inverse, factor):
    lines = np.array([-1700, -500, 0, 3, 1000, 1799])
    got, _ = gains(bench, lines, inverse=inverse, converter_rate_hz=Fraction(1_000_000) * factor)
    weight = np.sinc(lines / N / factor)
    np.testing.assert_allclose(got, 1 / weight if inverse else weight, atol=3e-6)


def test_what_is_told(bench):
    _, notes = gains(bench, np.array([100]), band_hz=Fraction(800_000))
    assert "a droop of 2.420 dB at 400 kHz" in notes[0].text
    assert [note.kind for note in notes] == ["info", "info"]
    _, notes = gains(bench, np.array([100, 1900]), band_hz=Fraction(800_000))
    assert notes[1].kind == "warning"


def test_what_cannot_be_is_refused(bench):
    for fields, key in (
        ({"converter_rate_hz": Fraction(999_999)}, "converter_rate"),
        ({"band_hz": Fraction(990_000)}, "band"),
    ):
        with pytest.raises(RecipeError) as caught:
            gains(bench, np.array([1]), **fields)
        assert caught.value.where == f"stages[0].{key}"


def test_laws(bench):
    assert isinstance(HoldDroop().law(bench.site(1), GaussianLaw()), GaussianLaw)
    assert isinstance(HoldDroop().law(bench.site(1), ConstantLaw()), NoLaw)
