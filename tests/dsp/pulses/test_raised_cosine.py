from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.pulses.raised_cosine import RaisedCosine, raised_cosine


@pytest.mark.parametrize("roll_off", [0.0, 0.1, 0.25, 0.5, 1.0])
def test_zero_at_every_other_symbol_tapered_or_not(roll_off):
    t = np.arange(-40.0, 41.0)
    wanted = (t == 0).astype(float)
    assert raised_cosine(t, roll_off) == pytest.approx(wanted, abs=1e-15)
    pulse = RaisedCosine(roll_off=roll_off).design(Fraction(3))
    assert pulse.values(t) == pytest.approx(wanted, abs=1e-15)


def test_roll_off_zero_is_the_sinc():
    t = np.linspace(-9, 9, 1000)
    assert raised_cosine(t, 0.0) == pytest.approx(np.sinc(t), abs=1e-15)


def test_span_is_taken():
    pulse = RaisedCosine(roll_off=0.5, span_symbols=6).design(Fraction(3))
    assert pulse.span_symbols == 6
    assert pulse.values(np.array([6.0, 7.5, -6.0])).tolist() == [0, 0, 0]
    assert not pulse.is_matched
