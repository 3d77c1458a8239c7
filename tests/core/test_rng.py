import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.core.rng import random_bytes, random_words, stream_key

KEY = stream_key(3, "signal.parts[0].signal")


class TestKeys:
    def test_seed_and_label_both_count(self):
        keys = {
            stream_key(seed, label).tobytes()
            for seed in (0, 1, 2**64 - 1)
            for label in ("a", "b", "ab", "")
        }
        assert len(keys) == 12

    def test_same_everywhere(self):
        assert stream_key(3, "a").tolist() == stream_key(3, "a").tolist()
        assert stream_key(3, "a").dtype == np.uint64

    def test_an_adjacent_seed_is_another_stream(self):
        first = random_bytes(stream_key(1, "a"), 0, 4096)
        second = random_bytes(stream_key(2, "a"), 0, 4096)
        # Equal bytes by chance: 16 of 4096 expected, standard deviation 4.
        assert np.count_nonzero(first == second) < 16 + 6 * 4


class TestPublishedAnswers:
    """Philox 4x64-10 known-answer vectors of Salmon et al., 2011 (from memory)."""

    def test_zero_counter_and_key(self):
        # The generator steps its counter before it uses it, so byte 0 belongs to counter 1;
        # counter 0 is reached from the largest counter.
        zero = np.random.Philox(key=np.zeros(2, np.uint64), counter=[2**64 - 1] * 4)
        words = [f"{word:016x}" for word in zero.random_raw(4)]
        assert words == [
            "16554d9eca36314c",
            "db20fe9d672d0fdc",
            "d7e772cee186176b",
            "7e68b68aec7ba23b",
        ]


class TestBytes:
    @given(st.integers(0, 10_000), st.integers(0, 500))
    def test_any_range_is_a_slice_of_the_stream(self, first, count):
        whole = random_bytes(KEY, 0, 10_500)
        assert random_bytes(KEY, first, count).tobytes() == whole[first : first + count].tobytes()

    def test_far_addresses_cost_nothing_before_them(self):
        far = random_bytes(KEY, 2**40 + 5, 100)
        assert far.tobytes() == random_bytes(KEY, 2**40, 200)[5:105].tobytes()

    def test_bits_are_fair(self):
        data = random_bytes(KEY, 0, 1 << 17)
        ones = np.unpackbits(data.reshape(-1, 1), axis=1).mean(axis=0)
        # Standard deviation of the mean of 2^17 fair bits: 0.5 / 2^8.5 = 0.00138; 5 of them.
        assert np.abs(ones - 0.5).max() < 0.0069
        counts = np.bincount(data, minlength=256)
        chi_square = float(((counts - 512.0) ** 2 / 512).sum())
        # 255 degrees of freedom: mean 255, standard deviation 22.6; 5 of them.
        assert abs(chi_square - 255) < 113

    def test_neighbours_do_not_correlate(self):
        data = random_bytes(KEY, 0, 1 << 17).astype(np.float64) - 127.5
        spread = data.var() * np.sqrt(data.size)
        for lag in (1, 2, 8, 32):
            assert abs(float(np.dot(data[:-lag], data[lag:]))) < 5 * spread


class TestWords:
    @pytest.mark.parametrize("width", [1, 2, 4, 8])
    @given(first=st.integers(-300, 300), count=st.integers(0, 400))
    def test_cyclic_by_index(self, width, first, count):
        period = 101
        whole = random_words(KEY, 0, period, period=period, width_bytes=width)
        got = random_words(KEY, first, count, period=period, width_bytes=width)
        want = whole.take(np.arange(first, first + count), mode="wrap")
        assert got.dtype == want.dtype == np.dtype(f"u{width}")
        assert got.tobytes() == want.tobytes()

    def test_a_longer_period_begins_with_the_same_words(self):
        short = random_words(KEY, 0, 50, period=50)
        assert short.tolist() == random_words(KEY, 0, 50, period=80).tolist()

    def test_the_whole_range_of_a_word_is_used(self):
        words = random_words(KEY, 0, 1 << 16, period=1 << 16, width_bytes=8)
        # The largest of n uniform words misses the top by 1/n on the average.
        assert words.max() > 2**64 * (1 - 20 / (1 << 16))
        assert words.min() < 2**64 * 20 / (1 << 16)
