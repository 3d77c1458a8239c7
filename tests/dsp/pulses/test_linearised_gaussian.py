from fractions import Fraction

import numpy as np
import pytest
from scipy import integrate, stats

from wavegen.dsp.pulses.linearised_gaussian import LinearisedGaussian, main_pulse


def by_quadrature(t):
    """c0 of TS 45.004 as it is written, its integral by quadrature."""
    spread = 2 * np.pi * 0.3 / np.sqrt(np.log(2))

    def g(u):
        return (stats.norm.sf(spread * (u - 2.5)) - stats.norm.sf(spread * (u - 1.5))) / 2

    def s(u):
        late = u > 4
        area = integrate.quad(g, 0, u - 4 if late else u)[0]
        return np.sin(np.pi / 2 - np.pi * area) if late else np.sin(np.pi * area)

    return s(t) * s(t + 1) * s(t + 2) * s(t + 3)


def test_the_formula_of_the_standard():
    t = np.array([0.01, 0.7, 1.0, 1.9, 2.5, 3.0, 3.3, 4.6, 4.99])
    assert main_pulse(t) == pytest.approx([by_quadrature(u) for u in t], abs=1e-12)


def test_five_symbols_long_and_centred():
    pulse = LinearisedGaussian().design(Fraction(4))
    assert pulse.values(np.array([-2.51, -2.5, 2.5, 2.6, 3.0])).tolist() == [0] * 5
    values = pulse.on_lattice(100)
    assert np.argmax(values) == 100 * pulse.span_symbols
    assert values[1:] == pytest.approx(values[:0:-1], abs=3e-4)  # g is cut at 0 and 4 symbols
