from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.site import Site
from wavegen.dsp.prbs import PRBS
from wavegen.sources.data.prbs import PseudoRandom


def words(made, *, n_bits=1, period=511, count=511):
    site = Site(sample_rate_hz=Fraction(1), n_samples=10, seed=1, label="a", path="signal")
    return made.bind(site, n_bits=n_bits, period=period).words(0, count), site.notes


@pytest.mark.parametrize("name", PRBS)
def test_the_sequence_named_with_its_inversion(name):
    got, notes = words(PseudoRandom(sequence=name))
    assert np.array_equal(got, PRBS[name].bits(0, 511))
    assert len(notes) == (name != "pn9")
    assert PseudoRandom(sequence=name).period_bits() == PRBS[name].period


def test_inversion_can_be_chosen():
    plain = words(PseudoRandom(sequence="pn15"))[0]
    assert np.array_equal(words(PseudoRandom(sequence="pn15", inverted=False))[0], 1 - plain)
    assert np.array_equal(words(PseudoRandom(sequence="pn15", inverted=True))[0], plain)


def test_start():
    got, _ = words(PseudoRandom(sequence="pn9", start=500))
    assert np.array_equal(got, PRBS["pn9"].bits(500, 511))
