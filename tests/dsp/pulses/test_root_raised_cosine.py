from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.pulses.root_raised_cosine import RootRaisedCosine, root_raised_cosine


def test_roll_off_zero_is_the_sinc_and_tiny_ones_approach_it():
    t = np.linspace(-20, 20, 4001)
    assert root_raised_cosine(t, 0.0) == pytest.approx(np.sinc(t), abs=1e-15)
    assert root_raised_cosine(t, 1e-9) == pytest.approx(np.sinc(t), abs=1e-7)


def test_the_two_forms_meet():
    # on both sides of 4 a t = 1/2, where the form changes, and around the singular point
    for a in (0.05, 0.22, 1.0):
        for centre in (1 / (8 * a), 1 / (4 * a)):
            t = centre * (1 + np.array([-1e-9, 0.0, 1e-9]))
            values = root_raised_cosine(t, a)
            assert np.ptp(values) < 1e-6


def test_span_and_band_of_the_design():
    pulse = RootRaisedCosine(roll_off=0.22).design(Fraction(5, 2))
    assert (pulse.span_symbols, pulse.half_band, pulse.is_matched) == (64, 0.61, True)
    assert RootRaisedCosine(roll_off=0.22, span_symbols=9).design(Fraction(4)).span_symbols == 9


def test_the_design_is_even_smooth_ended_and_untouched_inside():
    pulse = RootRaisedCosine(roll_off=0.3).design(Fraction(4))
    t = np.linspace(0, pulse.span_symbols, 999)
    assert np.array_equal(pulse.values(t), pulse.values(-t))
    assert pulse.values(np.array([float(pulse.span_symbols)])) == [0.0]
    inside = t[t < pulse.span_symbols // 2]
    assert np.array_equal(pulse.values(inside), root_raised_cosine(inside, 0.3))
