"""The compiled loop against plain NumPy, bit for bit."""

import numpy as np
import pytest

from wavegen.dsp.code_kernel import round_and_hold, round_and_hold_by_numpy

SIXTEEN = {"full_scale": 32768.0, "lowest": -32768, "highest": 32767}
TWELVE = {"full_scale": 2048.0, "lowest": -2048, "highest": 2047}


def both(rails, *, gain=1.0, shift=0, **word):
    codes = np.zeros((2, rails.size), np.int16)
    held = [rails.astype(np.float32), rails.astype(np.float32)]
    first = round_and_hold(held[0], codes[0], gain=np.float32(gain), shift=shift, **word)
    numbers = np.array([gain, *word.values()], np.float32)
    second = np.array([0, -1])
    round_and_hold_by_numpy(held[1], codes[1], numbers, 1 << shift, second)
    assert first == tuple(second)
    if first[1] < 0:
        assert np.array_equal(codes[0], codes[1])
        assert np.array_equal(held[0].view(np.int32), held[1].view(np.int32))
    return codes[0], held[0], first


@pytest.mark.parametrize("word", [SIXTEEN, TWELVE])
@pytest.mark.parametrize("size", [0, 1, 2047, 2048, 10_001])
def test_same_bits_as_numpy(word, size):
    rng = np.random.default_rng(3)
    for spread in (0.1, 0.9):  # without and with samples outside
        both(spread * rng.standard_normal(size), gain=0.7, shift=4 if word is TWELVE else 0, **word)


def test_half_a_code_rounds_to_even():
    codes, held, _ = both(np.array([0.5, 1.5, 2.5, -0.5, -1.5]) / 2048, **TWELVE)
    assert codes.tolist() == [0, 2, 2, 0, -2]
    assert (held * 2048).tolist() == codes.tolist()


def test_only_what_rounds_beyond_an_end_counts_as_saturated():
    codes, _, (n_saturated, _) = both(
        np.array([2047.4, 2047.6, -2048.4, -2048.6, 9e9]) / 2048, **TWELVE
    )
    assert codes.tolist() == [2047, 2047, -2048, -2048, 2047]
    assert n_saturated == 3


@pytest.mark.parametrize("value", [np.nan, np.inf, -np.inf])
def test_names_the_first_rail_that_is_not_finite(value):
    rails = np.zeros(5000)
    rails[[4001, 4500]] = value
    assert both(rails, **SIXTEEN)[2][1] == 4001


def test_a_word_at_the_left_is_its_code_times_sixteen():
    codes, held, _ = both(np.array([0.5, -1.0]), shift=4, **TWELVE)
    assert codes.tolist() == [16_384, -32_768]
    assert held.tolist() == [0.5, -1.0]
