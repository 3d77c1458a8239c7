from fractions import Fraction

import numpy as np
import pytest

from wavegen.dsp.pulses.taps import Taps


@pytest.mark.parametrize(
    ("taps", "per_symbol", "first"),
    [((1.0, 2.0, 3.0), 4, -1), ((1.0, 2.0, 3.0, 4.0), 2, -1), ((5.0,), 3, 0)],
)
def test_the_middle_tap_falls_on_the_symbol(taps, per_symbol, first):
    pulse = Taps(taps=taps).design(Fraction(per_symbol))
    lattice = pulse.on_lattice(per_symbol)
    start = pulse.span_symbols * per_symbol + first
    assert lattice[start : start + len(taps)].tolist() == list(taps)
    assert np.count_nonzero(lattice) == len(taps)
    assert pulse.is_sampled


@pytest.mark.parametrize("n_taps", range(1, 12))
@pytest.mark.parametrize("per_symbol", [1, 2, 3])
def test_the_support_holds_every_tap(n_taps, per_symbol):
    pulse = Taps(taps=tuple(range(1, n_taps + 1))).design(Fraction(per_symbol))
    assert np.sum(pulse.on_lattice(per_symbol)) == n_taps * (n_taps + 1) / 2
