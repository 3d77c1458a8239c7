from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.units import QuantityError
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


@pytest.mark.parametrize(
    "settings", [{}, {"taps": (1.0,), "file": "taps.txt"}], ids=["neither", "both"]
)
def test_taps_or_a_file(settings):
    with pytest.raises(QuantityError) as caught:
        Taps(**settings)
    assert caught.value.key == "taps"


def test_a_file_is_read_by_whoever_knows_the_folder():
    with pytest.raises(ValueError, match="read before"):
        Taps(file="taps.txt").design(Fraction(4))
