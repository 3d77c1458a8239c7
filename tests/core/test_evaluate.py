import itertools
import weakref
from dataclasses import dataclass

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from wavegen.core.evaluate import MERGE_GAP, evaluate, fold, order, plan, repeat
from wavegen.core.signal import Signal


def one(signal, start, stop):
    return evaluate({signal: (start, stop)})[signal]


def wrapped(whole, start, stop):
    return whole.take(np.arange(start, stop), mode="wrap")


def same_bits(first, second):
    return first.dtype == second.dtype and first.tobytes() == second.tobytes()


class TestFold:
    @pytest.mark.parametrize(
        ("start", "stop", "folded"),
        [
            (0, 10, [(0, 10)]),
            (3, 7, [(3, 7)]),
            (-2, 3, [(8, 10), (0, 3)]),
            (8, 13, [(8, 10), (0, 3)]),
            (28, 30, [(8, 10)]),
            (-20, -15, [(0, 5)]),
            (4, 4, []),
            (5, 3, []),
            (-7, 3, [(0, 10)]),
            (-7, 900, [(0, 10)]),
        ],
    )
    def test_cuts_at_the_seam(self, start, stop, folded):
        assert fold(start, stop, 10) == folded

    @given(st.integers(-50, 50), st.integers(0, 9), st.integers(1, 10))
    def test_covers_each_index_once_and_in_order(self, start, count, period):
        if count < period:
            indices = [
                i for low, high in fold(start, start + count, period) for i in range(low, high)
            ]
            assert indices == [i % period for i in range(start, start + count)]


class TestOrder:
    def test_inputs_come_before_readers_and_each_once(self, lab):
        source = lab.white(100)
        first = lab.filtered(source)
        last = lab.multiplied(lab.multiplied(first, source), lab.multiplied(source, first))
        ordered = order([last, first])
        assert len(ordered) == len(set(ordered)) == 5
        for signal in ordered:
            for item in signal.inputs:
                assert ordered.index(item) < ordered.index(signal)

    def test_deep_graphs_do_not_recurse(self, lab):
        assert len(order([lab.chain(lab.white(100), 3000)])) == 3001


class TestRepeat:
    @given(st.integers(1, 9), st.integers(-50, 50), st.integers(0, 60))
    def test_by_index(self, size, start, count):
        got = repeat(np.arange(size), start, start + count)
        assert got.tolist() == [index % size for index in range(start, start + count)]

    def test_far_along_a_short_period(self):
        assert repeat(np.arange(3), 10**15, 10**15 + 4).tolist() == [1, 2, 0, 1]


class TestAgainstDirectReferences:
    """Each signal against arithmetic over the whole period at once."""

    def test_white_words(self, lab):
        assert same_bits(one(lab.white(5000), 0, 5000), lab.direct_white(5000))

    def test_a_chain_of_filters(self, lab):
        # Three float32 FFT pairs of 128 points; one pair is good to 2e-7 of the rms.
        want = lab.direct_white(5000)
        for _ in range(3):
            want = lab.direct_filter(want)
        got = one(lab.chain(lab.white(5000), 3), -700, 4300)
        assert np.abs(got - wrapped(want, -700, 4300)).max() < 2e-6

    def test_an_echo_from_beyond_the_seam(self, lab):
        source = lab.direct_white(5000)
        want = source + np.float32(0.25) * np.roll(source, 3210)
        assert same_bits(one(lab.echoed(lab.white(5000), 3210), 0, 5000), want)

    def test_an_echo_longer_than_the_period(self, lab):
        source = lab.direct_white(500)
        want = source + np.float32(0.25) * np.roll(source, 1234)
        assert same_bits(one(lab.echoed(lab.white(500), 1234), 0, 500), want)

    def test_another_axis(self, lab):
        slow = lab.decimated(lab.white(6000), 6)
        assert slow.sample_rate_hz * 6 == lab.rate_hz
        got = one(slow, -5, 1002)
        assert same_bits(got, wrapped(lab.direct_white(6000)[::6].copy(), -5, 1002))
        assert got.flags.c_contiguous

    def test_a_short_period_repeated_many_times(self, lab):
        long, short = lab.white(5000), lab.white(3, "short")
        want = lab.direct_white(5000) * wrapped(lab.direct_white(3, "short"), 0, 5000)
        made = {}
        got = evaluate({lab.multiplied(long, short): (0, 5000)}, made=made)
        assert same_bits(next(iter(got.values())), want)
        assert made[short] == 3

    def test_a_short_period_far_along_a_long_one(self, lab):
        long, short = lab.white(10**15), lab.white(3, "short")
        got = one(lab.multiplied(long, short), 10**14, 10**14 + 1000)
        repeated = lab.direct_white(3, "short")[(10**14 + np.arange(1000)) % 3]
        assert same_bits(got, one(long, 10**14, 10**14 + 1000) * repeated)

    def test_a_period_of_one_cell_under_twelve_rounds(self, lab):
        want = lab.direct_white(98)
        for _ in range(12):
            want = lab.direct_filter(want)
        got = one(lab.chain(lab.white(98), 12), -200, 300)
        assert np.abs(got - wrapped(want, -200, 300)).max() < 5e-6

    def test_a_period_of_one_sample(self, lab):
        got = one(lab.chain(lab.white(1), 2), -3, 4)
        assert np.unique(got).size == 1
        # Taps sum to 1, so a constant passes a filter unchanged.
        assert np.abs(got - lab.direct_white(1)).max() < 1e-6


class TestWork:
    """How often things are computed."""

    def test_each_signal_once_at_any_depth(self, lab):
        # Recursive pulling doubles the work per round at the seam: 2^12 here.
        top = lab.chain(lab.white(200_000), 12)
        made = {}
        evaluate({top: (-30_000, 30_000)}, made=made)
        assert len(made) == 13
        halo = 12 * (30 + 2 * 98)  # taps, and the grid on both sides, a round
        assert max(made.values()) <= 60_000 + 2 * halo
        assert min(made.values()) >= 60_000

    def test_a_diamond_reads_its_source_once(self, lab):
        source = lab.white(50_000)
        branches = [lab.filtered(source) for _ in range(2)]
        for _ in range(10):
            branches = [lab.multiplied(*branches), lab.multiplied(*branches)]
        made = {}
        evaluate({branches[0]: (0, 20_000)}, made=made)
        assert made[source] < 20_000 + 400
        assert len(made) == 1 + 2 + 2 * 9 + 1

    def test_a_long_delay_keeps_disjoint_ranges(self, lab):
        source = lab.white(1_000_000)
        far = lab.echoed(source, 500_000)
        made = {}
        evaluate({far: (600_000, 601_000)}, made=made)
        assert made[source] == 2000
        segments = {work.signal: work.segments for work in plan({far: (600_000, 601_000)}).work}
        assert segments[source] == ((100_000, 101_000), (600_000, 601_000))

    def test_near_ranges_are_joined(self, lab):
        near = lab.echoed(lab.white(1_000_000), MERGE_GAP)
        work = plan({near: (600_000, 601_000)}).work[0]
        assert work.segments == ((600_000 - MERGE_GAP, 601_000),)

    def test_ranges_are_widened_to_the_grid_and_cut_at_the_end(self, lab):
        source = lab.white(1_005, step=100)
        assert plan({source: (250, 260)}).work[0].segments == ((200, 300),)
        assert plan({source: (1_002, 1_004)}).work[0].segments == ((1_000, 1_005),)

    def test_two_outputs_share_what_they_have_in_common(self, lab):
        source = lab.white(50_000)
        first, second = lab.filtered(source), lab.echoed(source, 7)
        made = {}
        got = evaluate({first: (0, 10_000), second: (5_000, 15_000), source: (3, 9)}, made=made)
        assert made[source] < 15_000 + 400
        assert same_bits(got[source], one(source, 3, 9))
        assert same_bits(got[second], one(second, 5_000, 15_000))

    def test_what_is_read_no_more_is_freed(self, lab):
        n = 100_000
        deep = plan({lab.chain(lab.white(n), 10): (0, n)})
        assert deep.cost_samples == 11 * n
        assert deep.peak_bytes == 2 * n * 8

    def test_freed_means_gone(self, lab):
        made, alive = [], []

        @dataclass(frozen=True, eq=False, kw_only=True)
        class Watched(Signal):
            def compute(self, start, stop, *arrays):
                alive.append(sum(array() is not None for array in made))
                samples = np.zeros(stop - start, np.complex64)
                made.append(weakref.ref(samples))
                return samples

        top = Watched(sample_rate_hz=lab.rate_hz, n_samples=100)
        for _ in range(5):
            top = Watched(sample_rate_hz=lab.rate_hz, n_samples=100, inputs=(top,))
        evaluate({top: (0, 100)})
        assert alive == [0, 1, 1, 1, 1, 1]

    def test_peak_counts_all_inputs_of_a_wide_signal(self, lab):
        n = 10_000
        wide = lab.multiplied(lab.filtered(lab.white(n)), lab.filtered(lab.white(n)))
        assert plan({wide: (0, n)}).peak_bytes == 3 * n * 8

    def test_nothing_wanted_nothing_computed(self, lab):
        made = {}
        top = lab.chain(lab.white(1000), 2)
        assert evaluate({top: (5, 5)}, made=made)[top].size == 0
        assert set(made.values()) == {0}

    def test_planning_asks_each_signal_once_a_segment(self, lab, monkeypatch):
        asked = []
        needs = Signal.needs
        monkeypatch.setattr(Signal, "needs", lambda *call: asked.append(call) or needs(*call))
        top = lab.white(10_000_000)
        for _ in range(49):
            top = lab.multiplied(top, top)
        work = plan({top: (-100, 100)}).work
        assert len(asked) == sum(len(item.segments) for item in work) == 100

    def test_a_wrong_length_is_named(self, lab):
        @dataclass(frozen=True, eq=False, kw_only=True)
        class Short(Signal):
            def compute(self, start, stop, *arrays):
                return np.zeros(stop - start - 1, np.complex64)

        with pytest.raises(ValueError, match=r"Short.compute gave"):
            one(Short(sample_rate_hz=lab.rate_hz, n_samples=10), 0, 5)


PERIOD = 4_999


@pytest.fixture(scope="module")
def graph(lab):
    signal = lab.entangled(PERIOD)
    return signal, one(signal, 0, PERIOD)


class TestRandomCuts:
    """The answer does not depend on how a range is cut, bit for bit."""

    @settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])
    @given(
        start=st.integers(-3 * PERIOD, 3 * PERIOD),
        count=st.one_of(st.just(1), st.integers(0, 300), st.integers(0, 3 * PERIOD)),
    )
    def test_any_range(self, graph, start, count):
        signal, whole = graph
        assert same_bits(one(signal, start, start + count), wrapped(whole, start, start + count))

    @settings(max_examples=25, deadline=None)
    @given(cuts=st.lists(st.integers(0, PERIOD), max_size=8))
    def test_pieces_join_to_the_whole(self, graph, cuts):
        signal, whole = graph
        edges = [0, *sorted(cuts), PERIOD]
        pieces = [one(signal, low, high) for low, high in itertools.pairwise(edges)]
        assert same_bits(np.concatenate(pieces), whole)

    @pytest.mark.parametrize("period", [1, 2, 97, 98, 99, 196, 500])
    def test_periods_around_one_cell(self, lab, period):
        signal = lab.entangled(period)
        whole = one(signal, 0, period)
        for start, stop in (
            (-1, 1),
            (0, 5 * period),
            (-3 * period + 1, period),
            (period, period + 1),
        ):
            assert same_bits(one(signal, start, stop), wrapped(whole, start, stop))

    def test_inputs_are_left_alone(self, lab):
        source = lab.white(5000)
        signal = lab.chain(lab.echoed(source, 99), 2)
        got = evaluate({source: (0, 5000), signal: (0, 5000)})
        assert same_bits(got[source], lab.direct_white(5000))
