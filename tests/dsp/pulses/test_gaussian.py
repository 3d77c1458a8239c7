from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.pulses.gaussian import Gaussian


@pytest.mark.parametrize("bt", [0.1, 0.3, 0.5, 1.0])
@pytest.mark.parametrize("symbols", ["held", "impulses"])
def test_the_spectrum_is_that_of_its_definition(bt, symbols):
    # 64 points a symbol: the spectrum is below 1e-12 beyond 32 symbol rates times a held
    # symbol's sinc; 1e-8 leaves room for the tail that is cut, 3e-10 of the peak a point
    pulse = Gaussian(bt=bt, symbols=symbols).design(Fraction(4))
    values = pulse.on_lattice(64)
    t = np.arange(values.size) / 64 - pulse.span_symbols
    f = np.array([0.0, 0.25, 0.5, bt, 0.9])
    lines = values @ np.cos(2 * np.pi * np.outer(t, f)) / 64
    shape = 2.0 ** (-((f / bt) ** 2) / 2)  # -3 dB at BT
    expected = shape * (np.sinc(f) if symbols == "held" else 1)
    assert lines / lines[0] == pytest.approx(expected, abs=1e-8)


@pytest.mark.parametrize("symbols", ["held", "impulses"])
def test_symmetrical_and_gone_at_its_ends(symbols):
    pulse = Gaussian(bt=0.3, symbols=symbols).design(Fraction(4))
    t = np.linspace(0, pulse.span_symbols, 50)
    assert pulse.values(t) == pytest.approx(pulse.values(-t), abs=1e-15)
    assert pulse.values(np.array([pulse.span_symbols - 1e-9]))[0] < 1e-8
    assert pulse.values(np.array([float(pulse.span_symbols)]))[0] == 0


def test_held_symbols_add_up_to_one():
    # a constant through a low-pass of unit gain: the pulses of all symbols sum to 1 at any time
    pulse = Gaussian(bt=0.3).design(Fraction(4))
    total = pulse.on_lattice(16).reshape(-1, 16).sum(axis=0)
    assert total == pytest.approx(np.ones(16), abs=1e-8)
