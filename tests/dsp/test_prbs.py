"""Bits at any position against the register that O.150 draws."""

from dataclasses import replace

import numpy as np
import pytest

from wavegen.dsp.prbs import PRBS


def register(order, tap, count):
    """Run a register filled with ones; the output is its last stage."""
    stages = [1] * order
    out = np.empty(count, np.uint8)
    for i in range(count):
        out[i] = stages[-1]
        stages = [stages[order - 1] ^ stages[tap - 1], *stages[:-1]]
    return out


def suppress(bits, count):
    """O.150 cl. 5.5, word for word: a one wherever the next 14 bits are all zero."""
    return np.array([bits[i] or not bits[i + 1 : i + 15].any() for i in range(count)], np.uint8)


@pytest.mark.parametrize("name", PRBS)
def test_bits_are_those_of_the_register(name):
    made = PRBS[name]
    count = 3000
    plain = register(made.order, made.tap, count + 14)
    expected = suppress(plain, count) if made.suppresses_zeros else plain[:count]
    assert np.array_equal(made.bits(0, count), expected ^ np.uint8(made.is_inverted))


@pytest.mark.parametrize("name", PRBS)
@pytest.mark.parametrize("is_inverted", [False, True])
def test_any_position_and_any_cut(name, is_inverted):
    made = replace(PRBS[name], is_inverted=is_inverted)
    first = made.period - 700 if made.order > 11 else 0
    whole = made.bits(first, 2000)
    rng = np.random.default_rng(3)
    for low, count in rng.integers(0, 1000, (30, 2)).tolist():
        assert np.array_equal(made.bits(first + low, count), whole[low : low + count])
        again = made.bits(first + low + 5 * made.period, count)
        assert np.array_equal(again, whole[low : low + count])


def test_the_period_joins_end_and_beginning():
    for made in PRBS.values():
        assert np.array_equal(made.bits(made.period - 40, 80)[40:], made.bits(0, 40))
        assert np.array_equal(made.bits(made.period - 40, 40), made.bits(2 * made.period - 40, 40))


def test_no_bits():
    assert PRBS["pn20_zs"].bits(7, 0).size == PRBS["pn9"].bits(7, 0).size == 0


def test_bits_are_the_callers_own():
    first = PRBS["pn11"].bits(0, 100)
    kept = first.copy()
    first[:] = 7
    assert np.array_equal(PRBS["pn11"].bits(0, 100), kept)
