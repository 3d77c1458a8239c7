import math
import pickle
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavegen.core.errors import RecipeError
from wavegen.core.render import samples_of
from wavegen.stages.combine.sum import CELL_SAMPLES, Part, Sum

ONE = object()
"""Stands for a part's settings: `combine` is given the signals that were built from them."""


def combine(bench, n_samples, parts, signals):
    site = bench.site(n_samples, "signal")
    made = Sum(parts=tuple(Part(signal=ONE, **fields) for fields in parts))
    return made.combine(site, signals), site.notes


def carrier(bench, n_samples, **part):
    signal, notes = combine(bench, n_samples, [part], [bench.given([1], n_samples)])
    return signal, notes


def turning(n_cycles, start, stop, n_samples):
    """Return the exact phase by Python integers, rounded once."""
    index = [n_cycles * sample % n_samples / n_samples for sample in range(start, stop)]
    return np.exp(2j * np.pi * np.array(index))


# A factor is the product of a cell's phase and a ramp, both rounded to float32, and rounded
# again: three roundings of 2^-24 on each rail.
NEAR = 3 * 2**-24 * 1.5


class TestFrequency:
    @pytest.mark.parametrize("n_cycles", [1, -1, 7, 500, -500, 333])
    def test_whole_cycles_in_the_loop(self, bench, n_cycles):
        n = 1000
        signal, notes = carrier(bench, n, frequency_offset_hz=Fraction(n_cycles * 1000))
        assert notes == []
        assert np.abs(samples_of(signal) - turning(n_cycles, 0, n, n)).max() < NEAR

    @pytest.mark.parametrize("n_cycles", [1_999_999_999, -1_999_999_999, 123_456_789])
    @pytest.mark.parametrize("start", [0, 2**31 - 50, 3_999_999_900])
    def test_phase_is_exact_in_a_loop_of_four_thousand_million(self, bench, n_cycles, start):
        n = 4_000_000_000
        offset = n_cycles * bench.rate_hz / n
        signal, notes = carrier(bench, n, frequency_offset_hz=offset)
        assert notes == []
        stop = start + 100
        got = samples_of(signal, start, stop)
        assert np.abs(got - turning(n_cycles, start, stop, n)).max() < NEAR

    def test_rounded_to_the_grid_with_a_note(self, bench):
        signal, notes = carrier(bench, 1000, frequency_offset_hz=Fraction(12_345))
        assert np.abs(samples_of(signal) - turning(12, 0, 1000, 1000)).max() < NEAR
        (note,) = notes
        assert note.kind == "rounded"
        assert note.where == "signal.parts[0].frequency_offset"
        assert (note.asked, note.given) == ("12.345 kHz", "12 kHz")

    @pytest.mark.parametrize("side", [-1, 1])
    def test_beyond_half_the_rate_is_refused(self, bench, side):
        carrier(bench, 10, frequency_offset_hz=side * bench.rate_hz / 2)
        with pytest.raises(RecipeError) as caught:
            carrier(bench, 10, frequency_offset_hz=side * (bench.rate_hz / 2 + Fraction(1, 3)))
        assert caught.value.where == "signal.parts[0].frequency_offset"
        assert "500 kHz" in caught.value.allowed

    def test_the_loop_closes_and_nothing_else_sounds(self, bench):
        n = 3 * CELL_SAMPLES + 1
        signal, _ = carrier(bench, n, frequency_offset_hz=bench.rate_hz * 1000 / n)
        spectrum = np.abs(np.fft.fft(samples_of(signal, -5, n - 5).astype(np.complex128))) / n
        spectrum[1000] -= 1
        assert np.abs(spectrum).max() < 1e-7  # -140 dBc


class TestPhaseAndLevel:
    @pytest.mark.parametrize("phase_deg", [90.0, -45.0, 720.0, 359.0])
    @pytest.mark.parametrize("offset", [0, 3000])
    def test_phase_holds_at_the_start_of_the_loop(self, bench, phase_deg, offset):
        fields = {"phase_deg": phase_deg, "frequency_offset_hz": Fraction(offset)}
        signal, _ = carrier(bench, 1000, **fields)
        first = samples_of(signal, 0, 1)[0]
        assert abs(first - np.exp(1j * math.radians(phase_deg))) < NEAR

    def test_levels_are_powers_relative_to_each_other(self, bench):
        n = 1000
        parts = [
            {"frequency_offset_hz": Fraction(10_000)},
            {"frequency_offset_hz": Fraction(-20_000), "level_db": -3.0},
            {"frequency_offset_hz": Fraction(30_000), "level_db": 10.0},
        ]
        signal, notes = combine(bench, n, parts, [bench.given([1], n)] * 3)
        power = np.abs(np.fft.fft(samples_of(signal)) / n) ** 2
        total = 1 + 10**-0.3 + 10
        want = [1 / total, 10**-0.3 / total, 10 / total]
        np.testing.assert_allclose(power[[10, -20, 30]], want, rtol=1e-5)
        (note,) = notes
        assert note.kind == "info"
        assert note.where == "signal"
        assert f"{-10 * math.log10(total):+.3f} dB" in note.text
        assert signal.mean_power == 1.0

    def test_one_part_at_nominal_level_is_left_as_it_is(self, bench):
        source = bench.gaussian(5000)
        signal, notes = combine(bench, 5000, [{}], [source])
        assert notes == []
        assert samples_of(signal).tobytes() == samples_of(source).tobytes()

    def test_the_parts_own_mean_powers_count(self, bench):
        n = 1000
        quiet = bench.given([0.5], n, mean_power=0.25)
        loud = bench.given([2], n, mean_power=4.0)
        parts = [{"frequency_offset_hz": Fraction(5000)}, {}]
        signal, notes = combine(bench, n, parts, [quiet, loud])
        assert np.mean(np.abs(samples_of(signal)) ** 2) == pytest.approx(1, rel=1e-6)
        assert "-6.284 dB" in notes[0].text  # 10 log10(4.25)
        assert signal.mean_power == 1.0

    def test_a_part_without_a_nominal_power_leaves_the_sum_to_be_measured(self, bench):
        sources = [bench.given([1], 10), bench.given([1], 10, mean_power=None)]
        signal, _ = combine(bench, 10, [{}, {}], sources)
        assert signal.mean_power is None


class TestAddition:
    @pytest.mark.parametrize("n", [1, 5, CELL_SAMPLES, CELL_SAMPLES + 1, 3 * CELL_SAMPLES - 1])
    def test_every_kind_of_part_at_once(self, bench, n):
        sources = [bench.gaussian(n, label) for label in "abcd"]
        step_hz = bench.rate_hz / n
        parts = [
            {},
            {"phase_deg": 30.0},
            {"frequency_offset_hz": step_hz * (n // 3), "level_db": 2.0},
            {"frequency_offset_hz": -step_hz * (n // 5), "phase_deg": -70.0},
        ]
        signal, _ = combine(bench, n, parts, sources)
        a, b, c, d = (samples_of(source).astype(np.complex128) for source in sources)
        want = a + b * np.exp(1j * np.pi / 6)
        want += 10**0.1 * c * turning(n // 3, 0, n, n)
        want += d * turning(-(n // 5), 0, n, n) * np.exp(-1j * np.pi * 70 / 180)
        want /= math.sqrt(3 + 10**0.2)
        # Four terms of up to 5 each, each with the roundings above.
        assert np.abs(samples_of(signal) - want).max() < 20 * NEAR

    def test_parts_are_left_alone(self, bench):
        sources = [bench.given([1, 2, 3j], 3), bench.given([1j], 3)]  # read-only arrays
        parts = [{"phase_deg": 10.0}, {"frequency_offset_hz": bench.rate_hz / 3}]
        signal, _ = combine(bench, 3, parts, sources)
        assert samples_of(signal).size == 3


PERIOD = 2 * CELL_SAMPLES + 777


@pytest.fixture(scope="module")
def graph(bench):
    parts = [
        {"frequency_offset_hz": Fraction(110_000)},
        {"phase_deg": 20.0, "level_db": -2.0},
        {"level_db": 1.0},
    ]
    sources = [bench.gaussian(PERIOD, label) for label in "abc"]
    signal, _ = combine(bench, PERIOD, parts, sources)
    return signal, samples_of(signal)


@given(start=st.integers(-2 * PERIOD, 2 * PERIOD), count=st.integers(1, PERIOD))
def test_same_bits_for_any_cut(graph, start, count):
    signal, whole = graph
    want = whole.take(np.arange(start, start + count), mode="wrap")
    assert samples_of(signal, start, start + count).tobytes() == want.tobytes()


def test_pickles_to_less_than_a_page_also_after_use(bench):
    signal, _ = carrier(bench, 10**9, frequency_offset_hz=Fraction(1000))
    before = samples_of(signal, 0, 10)
    packed = pickle.dumps(signal)
    assert len(packed) < 4096
    again = pickle.loads(packed)  # noqa: S301 - our own bytes
    assert samples_of(again, 0, 10).tobytes() == before.tobytes()
