from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.site import Site
from wavegen.dsp.prbs import PRBS
from wavegen.sources.bit_symbols import BitSymbols, RepeatedBits, bind_bits

BITS = np.random.default_rng(2).integers(0, 2, 1037, dtype=np.uint8)


def site():
    return Site(sample_rate_hz=Fraction(1), n_samples=10, seed=1, label="a", path="signal")


@pytest.mark.parametrize("size", [1, 3, 8, 13, 1037])
def test_bits_over_and_over(size):
    made = RepeatedBits.of(BITS[:size])
    for first, count in ((0, size), (5, 2000), (size - 1, 1), (10**9 + 7, 100), (3, 0)):
        expected = BITS[:size][np.arange(first, first + count) % size]
        assert np.array_equal(made.bits(first, count), expected)


@pytest.mark.parametrize("n_bits", [1, 2, 3, 5, 8, 9, 12, 16])
def test_symbols_take_their_bits_first_bit_highest(n_bits):
    made = BitSymbols(sequence=PRBS["pn11"], n_bits=n_bits, period=500, start=9)
    words = made.words(0, 500)
    assert words.dtype == (np.uint8 if n_bits <= 8 else np.uint16)
    text = "".join(map(str, PRBS["pn11"].bits(9, 500 * n_bits)))
    assert words.tolist() == [int(text[i * n_bits : (i + 1) * n_bits], 2) for i in range(500)]


@pytest.mark.parametrize("sequence", [PRBS["pn15"], RepeatedBits.of(BITS)])
def test_any_range_is_that_of_the_loop(sequence):
    made = BitSymbols(sequence=sequence, n_bits=3, period=1000)
    loop = made.words(0, 1000)
    for first, count in ((-3, 10), (990, 30), (2500, 1), (-1000, 3000), (7, 0), (400, 1000)):
        expected = loop[np.arange(first, first + count) % 1000]
        assert np.array_equal(made.words(first, count), expected)


@pytest.mark.parametrize(
    ("period", "words"),
    [(511, None), (1022, None), (100, "holds 200 bits of pn9"), (400, "1 period and 289 bits")],
)
def test_a_cut_is_noted(period, words):
    here = site()
    bind_bits(here, PRBS["pn9"], n_bits=2, period=period, label=".groups[1]", called="pn9")
    if words is None:
        assert here.notes == []
        return
    assert [(note.kind, note.where) for note in here.notes] == [
        ("warning", "signal.groups[1].data")
    ]
    assert words in here.notes[0].text
    assert "multiples of 511 symbols" in here.notes[0].text
