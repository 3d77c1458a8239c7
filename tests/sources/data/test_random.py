from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.site import Site
from wavegen.sources.data.random import Random

SITE = Site(sample_rate_hz=Fraction(1), n_samples=1000, seed=4, label="one", path="signal")


def words(made, *, site=SITE, label="", n_bits=2, period=1000, first=0, count=1000):
    return made.bind(site, n_bits=n_bits, period=period, label=label).words(first, count)


@pytest.mark.parametrize(("n_bits", "dtype"), [(1, np.uint8), (8, np.uint8), (9, np.uint16)])
def test_words_hold_the_bits(n_bits, dtype):
    assert words(Random(), n_bits=n_bits).dtype == dtype


def test_any_range_is_that_of_the_loop():
    loop = words(Random())
    for first, count in ((-3, 10), (990, 30), (2500, 1), (-1000, 3000)):
        expected = loop[np.arange(first, first + count) % 1000]
        assert np.array_equal(words(Random(), first=first, count=count), expected)


def test_parts_draw_their_own_data_unless_they_share():
    other = SITE.at("signal.parts[1]", "two")
    own = words(Random())
    assert not np.array_equal(own, words(Random(), site=other))
    assert np.array_equal(own, words(Random(share="one"), site=other))
    assert not np.array_equal(own, words(Random(), label="second stream"))


def test_symbols_are_uniform():
    # chi-squared over 16 cells, 15 degrees of freedom: 99.99 % below 44.3
    counts = np.bincount(words(Random(), n_bits=4, period=160_000, count=160_000) & 15)
    assert np.sum((counts - 10_000) ** 2) / 10_000 < 44.3
