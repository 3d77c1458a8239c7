from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.pulse import mean_energy, residual_evm_percent
from wavegen.dsp.pulses.half_sine import HalfSine


def test_half_a_period_from_its_instant_on():
    pulse = HalfSine().design(Fraction(4))
    t = np.array([-0.1, 0.0, 0.25, 0.5, 0.75, 1.0, 1.1])
    root = np.sqrt(0.5)
    assert pulse.values(t) == pytest.approx([0, 0, root, 1, root, 0, 0], abs=1e-15)
    assert not pulse.is_smooth


def test_energy_is_one_half():
    pulse = HalfSine().design(Fraction(4))
    assert mean_energy(pulse, per_symbol=64, period_symbols=8) == pytest.approx(0.5)


def test_symbols_do_not_overlap():
    assert residual_evm_percent(HalfSine().design(Fraction(4))) == pytest.approx(0, abs=1e-6)
