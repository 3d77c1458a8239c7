"""Symbols of continuous phase modulation: encodings, exact sums, closing."""

import numpy as np
import pytest

from wavegen.sources import phase_symbols
from wavegen.sources.phase_symbols import (
    BLOCK_SYMBOLS,
    closing_tail,
    encode,
    scan,
    start_eighths,
)

PLAIN = np.array([0, 1], np.uint8)


class Listed:
    """Data from an array, repeated."""

    def __init__(self, values):
        self.values = np.asarray(values, np.uint8)

    def words(self, first, count):
        return self.values[np.arange(first, first + count) % self.values.size]


def drawn(n, high=256, seed=2):
    return Listed(np.random.default_rng(seed).integers(0, high, n))


def loop(words, encoding="plain", numbers=PLAIN, alphabet=(-1, 1)):
    period = words.values.size
    return scan(words, encoding=encoding, numbers=numbers, alphabet=alphabet, period=period)


def test_plain_uses_the_low_bits():
    words = Listed([0, 1, 254, 255, 7])
    assert encode(words, "plain", PLAIN, 0, 5).tolist() == [0, 1, 0, 1, 1]
    four = np.array([2, 3, 1, 0], np.uint8)
    assert encode(words, "plain", four, -1, 4).tolist() == [0, 2, 3, 1]


def test_differential():
    # +1 (number 1) where a bit equals the one before it; the seam counts too
    words = Listed([1, 1, 0, 0, 0, 1])
    assert encode(words, "differential", PLAIN, 0, 6).tolist() == [1, 1, 0, 1, 1, 0]


@pytest.mark.parametrize("first", [0, 1, -3, 7])
def test_shaped_offset_by_its_formula(first):
    words = drawn(40)
    a = (words.values & 1).astype(int)
    want = []
    for i in range(first, first + 30):
        last, now, before = a[(i - 1) % 40], a[i % 40], a[(i - 2) % 40]
        want.append((-1) ** (i + 1) * (2 * last - 1) * (now - before) + 1)
    assert encode(words, "shaped_offset", PLAIN, first, 30).tolist() == want


@pytest.mark.parametrize("first", [0, 1, -3, 7])
def test_half_sine_offset_by_its_formula(first):
    words = drawn(40)
    c = 2 * (words.values & 1).astype(int) - 1
    want = [
        ((-1) ** (i + 1) * c[i % 40] * c[(i - 1) % 40] + 1) // 2 for i in range(first, first + 30)
    ]
    assert encode(words, "half_sine_offset", PLAIN, first, 30).tolist() == want


@pytest.mark.parametrize("encoding", ["differential", "shaped_offset", "half_sine_offset"])
@pytest.mark.parametrize("period", [4, 8, 100, 1000])
def test_encodings_with_memory_close_by_themselves(encoding, period):
    alphabet = (-1, 0, 1) if encoding == "shaped_offset" else (-1, 1)
    for seed in range(20):
        assert loop(drawn(period, seed=seed), encoding, PLAIN, alphabet)[1] % 4 == 0


def test_start_stands_on_the_rails():
    assert start_eighths(drawn(8), "plain") == 0
    assert [start_eighths(Listed([0, 0, 0, q]), "half_sine_offset") for q in (1, 0)] == [2, 6]
    for i, q, angle in ((1, 1, 1), (0, 1, 3), (0, 0, 5), (1, 0, 7)):
        assert start_eighths(Listed([0, 0, i, q]), "shaped_offset") == angle


@pytest.mark.parametrize("at_once", [1, 64])
def test_sums_are_those_of_the_levels(monkeypatch, at_once):
    monkeypatch.setattr(phase_symbols, "_BLOCKS_AT_ONCE", at_once)
    numbers = np.array([2, 3, 1, 0], np.uint8)
    words = drawn(3 * BLOCK_SYMBOLS + 77)
    symbols, total = loop(words, "plain", numbers, (-3, -1, 1, 3))
    levels = 2 * numbers[words.values & 3].astype(int) - 3
    running = np.concatenate([[0], np.cumsum(levels)])
    assert total == running[-1]
    assert symbols.sums.tolist() == running[::BLOCK_SYMBOLS][:4].tolist()
    for index in (0, 1, BLOCK_SYMBOLS - 1, BLOCK_SYMBOLS, 2 * BLOCK_SYMBOLS + 5, levels.size - 1):
        assert symbols.sum_before(index) == running[index]
        assert symbols.sum_before(index + levels.size) == running[index]
        assert symbols.sum_before(index - levels.size) == running[index]


@pytest.mark.parametrize("size", [0, 1, 60, 90])
def test_a_tail_stands_in_at_every_seam(size):
    # the last block holds 77 symbols: the tail of 90 crosses its border
    words = drawn(2 * BLOCK_SYMBOLS + 77)
    symbols, _ = loop(words)
    tail = np.random.default_rng(1).integers(0, 2, size).astype(np.uint8)
    made = symbols.with_tail(tail)
    whole = words.values & 1
    whole[whole.size - size :] = tail
    n = whole.size
    for first, count in ((0, n), (-100, 200), (n - 80, 20), (n - 30, 3 * n), (-5, 1), (7, 0)):
        assert np.array_equal(made.range(first, count), whole[np.arange(first, first + count) % n])
    running = np.concatenate([[0], np.cumsum(2 * whole.astype(int) - 1)])
    for index in (0, BLOCK_SYMBOLS, 2 * BLOCK_SYMBOLS - 3, 2 * BLOCK_SYMBOLS, n - 20, n - 1):
        assert made.sum_before(index) == running[index]


def test_a_tail_longer_than_a_short_loop_is_read_round_and_round():
    symbols, _ = loop(Listed([0, 1]))
    made = symbols.with_tail(np.array([1, 1], np.uint8))
    assert made.range(-3, 9).tolist() == [1] * 9


@pytest.mark.parametrize(("order", "n_states"), [(2, 4), (2, 25), (4, 400), (8, 3), (4, 8)])
def test_closing_changes_the_fewest_last_symbols(order, n_states):
    # by exhaustion over what n symbols can add up to: every even step between the extremes
    rng = np.random.default_rng(3)
    for _ in range(50):
        numbers = rng.integers(0, order, 2 * n_states + 2).astype(np.uint8)
        levels = 2 * numbers.astype(int) - order + 1
        total = int(levels.sum())
        tail = closing_tail(numbers, total=total, n_states=n_states, order=order)
        changed = numbers.copy()
        changed[numbers.size - tail.size :] = tail
        assert (2 * changed.astype(int) - order + 1).sum() % n_states == 0
        for n in range(tail.size):
            rest = int(levels[: levels.size - n].sum())
            reach = range(-n * (order - 1), n * (order - 1) + 1, 2)
            assert all((rest + value) % n_states for value in reach)


def test_too_few_symbols_to_close():
    assert closing_tail(np.array([1], np.uint8), total=1, n_states=25, order=2) is None
