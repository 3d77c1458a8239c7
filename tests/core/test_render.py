import hashlib
import multiprocessing
import threading
from concurrent.futures import Future, ProcessPoolExecutor, ThreadPoolExecutor
from dataclasses import dataclass
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError, SignalError
from wavegen.core.evaluate import plan
from wavegen.core.render import (
    IN_FLIGHT_BYTES,
    IN_FLIGHT_STRIPS,
    LONGEST_STRIP_SAMPLES,
    SHORTEST_STRIP_SAMPLES,
    STRIP_QUANTUM,
    STRIP_SAMPLES,
    Tap,
    measure_strip,
    render,
    samples_of,
    strip_length,
)
from wavegen.core.signal import Signal
from wavegen.core.stored import Scratch
from wavegen.stages.channel.scale import Scaled
from wavegen.stages.combine.sum import Placement, Summed

PERIOD = 30_011


class Log:
    """A reading that keeps everything, and complains of a gap."""

    def __init__(self):
        self.first = self.next = None
        self.stretches = []

    def feed(self, start, samples):
        assert self.next in (None, start)
        self.first = start if self.first is None else self.first
        self.next = start + samples.size
        self.stretches.append(samples.copy())

    def merge(self, following):
        if following.first is None:
            return
        assert self.next in (None, following.first)
        self.first = following.first if self.first is None else self.first
        self.next = following.next
        self.stretches += following.stretches

    def result(self):
        joined = np.concatenate([np.empty(0, np.complex64), *self.stretches])
        return self.first, joined


class LogMeter:
    def begin(self, signal):
        return Log()


def run(signal, **options):
    digest = hashlib.sha256()
    render(signal, sink=digest.update, **options)
    return digest.hexdigest()


@pytest.fixture(scope="module")
def graph(lab):
    return lab.entangled(PERIOD)


@pytest.fixture(scope="module")
def expected(graph):
    return hashlib.sha256(samples_of(graph)).hexdigest()


class TestIdentity:
    @pytest.mark.parametrize("workers", [1, 2, 5])
    @pytest.mark.parametrize("strip_samples", [None, 1_000, 4_096, 7_919, PERIOD - 1, PERIOD])
    def test_same_bytes_for_any_workers_and_strips(self, graph, expected, workers, strip_samples):
        assert run(graph, workers=workers, strip_samples=strip_samples) == expected

    @pytest.mark.parametrize("threads", [1, 3])
    def test_same_bytes_from_threads_passed_in(self, graph, expected, threads):
        with ThreadPoolExecutor(threads) as pool:
            assert run(graph, executor=pool, workers=threads, strip_samples=5_000) == expected
            assert run(graph, executor=pool, workers=threads, strip_samples=9_000) == expected

    def test_same_bytes_from_processes(self, lab, tmp_path):
        # Only classes of the package: a fresh process must be able to import them.
        samples = lab.direct_white(PERIOD)
        with Scratch(folder=tmp_path, sample_rate_hz=lab.rate_hz, n_samples=PERIOD) as scratch:
            scratch.write(samples)
            stored = scratch.signal()
            about = {"sample_rate_hz": lab.rate_hz, "n_samples": PERIOD}
            scaled = Scaled(**about, inputs=(stored,), gain=0.5)
            placements = (Placement(-1_234, 1.0, 0.0), Placement(0, 0.5, 1.0))
            signal = Summed(**about, inputs=(scaled, stored), placements=placements, step=4_096)
            want = run(signal)
            context = multiprocessing.get_context("spawn")
            with ProcessPoolExecutor(2, mp_context=context) as pool:
                assert run(signal, executor=pool, workers=2, strip_samples=4_999) == want
                assert run(signal, executor=pool, workers=1, strip_samples=30_000) == want


class TestSink:
    def test_strips_come_in_order_and_join_to_the_period(self, graph):
        strips = []
        render(graph, sink=strips.append, workers=3, strip_samples=7_000)
        assert [strip.size for strip in strips] == [7_000] * 4 + [PERIOD - 28_000]
        assert np.concatenate(strips).tobytes() == samples_of(graph).tobytes()

    def test_without_a_sink_no_samples_come_back(self, graph):
        samples, readings = measure_strip(graph, (), 0, 100, keep=False)
        assert samples is None
        assert readings == []

    def test_a_slow_sink_is_not_flooded(self, lab):
        submitted, taken = [], []

        class Counting(ThreadPoolExecutor):
            def submit(self, *call, **options):
                submitted.append(call)
                return super().submit(*call, **options)

        def sink(samples):
            taken.append(samples.size)
            assert len(submitted) - len(taken) <= workers + 2

        workers = 2
        with Counting(workers) as pool:
            render(lab.white(PERIOD), sink=sink, workers=workers, executor=pool, strip_samples=500)
        assert len(taken) == len(submitted) == -(-PERIOD // 500)


class TestTaps:
    @pytest.mark.parametrize("strip_samples", [1_000, 7_919, 30_000])
    def test_other_signals_and_axes_are_covered_once(self, lab, strip_samples):
        source = lab.white(30_000)
        slow = lab.decimated(source, 8)
        slower = lab.decimated(slow, 1_250)  # three samples: most strips hold none
        top = lab.filtered(source)
        taps = tuple(
            Tap(name=name, signal=signal, meter=LogMeter())
            for name, signal in {"top": top, "slow": slow, "slower": slower}.items()
        )
        found = render(top, taps=taps, workers=2, strip_samples=strip_samples)
        assert list(found) == ["top", "slow", "slower"]
        for tap in taps:
            first, samples = found[tap.name]
            assert first == 0
            assert samples.tobytes() == samples_of(tap.signal).tobytes()

    def test_common_signals_are_computed_once(self, lab, monkeypatch):
        source = lab.white(10_000)
        computed = []
        compute = type(source).compute

        def counted(self, start, stop, *arrays):
            computed.append(stop - start)
            return compute(self, start, stop, *arrays)

        monkeypatch.setattr(type(source), "compute", counted)
        meter = LogMeter()
        taps = (
            Tap(name="first", signal=source, meter=meter),
            Tap(name="second", signal=source, meter=meter),
        )
        found = render(lab.multiplied(source, source), taps=taps, strip_samples=2_500)
        assert sum(computed) == 10_000
        assert found["first"][1].tobytes() == found["second"][1].tobytes()

    def test_no_taps_no_results(self, lab):
        assert render(lab.white(100)) == {}


@dataclass(frozen=True, eq=False, kw_only=True)
class Faulty(Signal):
    """Fails from one sample on."""

    bad: int

    def compute(self, start, stop, *arrays):
        if stop > self.bad:
            raise SignalError(
                where="signal", problem=f"bad at {self.bad}", allowed="good", remedy="Mend it."
            )
        return np.zeros(stop - start, np.complex64)


class TestFailure:
    @pytest.mark.parametrize("workers", [1, 3])
    def test_an_error_keeps_its_fields_and_stops_the_rest(self, lab, workers):
        futures, strips = [], []

        class Watched(ThreadPoolExecutor):
            def submit(self, *call, **options):
                futures.append(super().submit(*call, **options))
                return futures[-1]

        faulty = Faulty(sample_rate_hz=lab.rate_hz, n_samples=100_000, bad=5_500)
        with Watched(workers) as pool, pytest.raises(SignalError) as caught:
            render(faulty, sink=strips.append, executor=pool, workers=workers, strip_samples=1_000)
        assert (caught.value.where, caught.value.problem) == ("signal", "bad at 5500")
        assert (caught.value.allowed, caught.value.remedy) == ("good", "Mend it.")
        assert [strip.size for strip in strips] == [1_000] * 5
        assert len(futures) <= 5 + workers + 3
        assert all(future.done() for future in futures)

    def test_what_waits_is_cancelled(self, lab):
        class Slow:
            """An executor that only runs what is asked for first."""

            def __init__(self):
                self.futures = []

            def submit(self, task, *call, **options):
                future = Future()
                self.futures.append(future)
                if len(self.futures) == 1:
                    future.set_exception(KeyError("first"))
                return future

        pool = Slow()
        with pytest.raises(KeyError):
            render(lab.white(10_000), executor=pool, workers=2, strip_samples=1_000)
        assert len(pool.futures) == 4
        assert all(future.cancelled() for future in pool.futures[1:])

    def test_its_own_threads_are_gone_afterwards(self, lab):
        faulty = Faulty(sample_rate_hz=lab.rate_hz, n_samples=100_000, bad=0)
        with pytest.raises(SignalError):
            render(faulty, workers=3, strip_samples=1_000)
        assert not [item for item in threading.enumerate() if item.name.startswith("strip")]

    def test_an_interrupt_leaves_no_scratch_file(self, lab, tmp_path):
        strips = []

        def sink(samples):
            scratch.write(samples)
            strips.append(samples.size)
            if len(strips) == 3:
                raise KeyboardInterrupt

        signal = lab.white(PERIOD)
        loop = {"sample_rate_hz": lab.rate_hz, "n_samples": PERIOD}
        with Scratch(folder=tmp_path, **loop) as scratch:
            assert list(tmp_path.iterdir()) == [scratch.path]
            with pytest.raises(KeyboardInterrupt):
                render(signal, sink=sink, workers=2, strip_samples=1_000)
        assert len(strips) == 3
        assert list(tmp_path.iterdir()) == []

    def test_an_error_crosses_from_a_process(self, tmp_path, lab):
        with Scratch(folder=tmp_path, sample_rate_hz=lab.rate_hz, n_samples=5_000) as scratch:
            scratch.write(lab.direct_white(1_000))
            shorter = scratch.signal()
            context = multiprocessing.get_context("spawn")
            with (
                ProcessPoolExecutor(1, mp_context=context) as pool,
                pytest.raises(FileError) as got,
            ):
                render(shorter, executor=pool, strip_samples=1_000)
        assert got.value.where == str(scratch.path)
        assert got.value.problem == "ends after sample 1000"


class TestProgress:
    @pytest.mark.parametrize("workers", [1, 4])
    def test_rises_from_nothing_to_all(self, lab, workers):
        told = []

        def listen(task, done, total):
            told.append((task, done, total))

        render(
            lab.white(PERIOD), workers=workers, strip_samples=4_000, progress=listen, task="making"
        )
        assert told[0] == ("making", 0, PERIOD)
        assert told[-1] == ("making", PERIOD, PERIOD)
        done = [item[1] for item in told]
        assert done == sorted(set(done))
        assert len(done) == 1 + -(-PERIOD // 4_000)


class TestStripLength:
    def described(self, *, depth, step, n_samples=1 << 30):
        signal = Signal(sample_rate_hz=Fraction(1), n_samples=n_samples)
        for _ in range(depth):
            signal = Signal(
                sample_rate_hz=Fraction(1), n_samples=n_samples, step=step, inputs=(signal,)
            )
        return signal

    def test_a_shallow_graph_gets_the_plain_length(self):
        assert strip_length(self.described(depth=1, step=4_096)) == STRIP_SAMPLES == 1 << 19

    def test_a_deep_graph_gets_eight_times_its_steps(self):
        length = strip_length(self.described(depth=20, step=8_000))
        assert length == -(-8 * (20 * 8_000 + 1) // STRIP_QUANTUM) * STRIP_QUANTUM

    def test_raised_only_while_what_is_in_flight_stays_small(self):
        # Two arrays alive, eight bytes a sample, four strips: 250 MB hold 3.9 million samples.
        length = strip_length(self.described(depth=40, step=16_000))
        assert LONGEST_STRIP_SAMPLES * 0.9 < length < LONGEST_STRIP_SAMPLES
        assert length * 2 * 8 * IN_FLIGHT_STRIPS <= IN_FLIGHT_BYTES

    def test_the_deepest_chain_counts_not_the_sum_over_branches(self):
        deep = self.described(depth=10, step=4_000)
        both = Signal(sample_rate_hz=Fraction(1), n_samples=1 << 30, inputs=(deep, deep, deep))
        assert strip_length(both) == strip_length(deep) == STRIP_SAMPLES

    @pytest.mark.parametrize("width", [1, 2, 5, 20])
    def test_what_is_in_flight_stays_small(self, width):
        parts = tuple(self.described(depth=1, step=4_096) for _ in range(width))
        wide = Signal(sample_rate_hz=Fraction(1), n_samples=1 << 30, inputs=parts)
        length = strip_length(wide)
        assert plan({wide: (0, length)}).peak_bytes * IN_FLIGHT_STRIPS <= IN_FLIGHT_BYTES
        assert length % STRIP_QUANTUM == 0
        assert SHORTEST_STRIP_SAMPLES <= length <= STRIP_SAMPLES

    def test_never_under_the_shortest(self):
        parts = tuple(self.described(depth=1, step=1) for _ in range(1_000))
        wide = Signal(sample_rate_hz=Fraction(1), n_samples=1 << 30, inputs=parts)
        assert strip_length(wide) == SHORTEST_STRIP_SAMPLES

    def test_the_workers_do_not_enter(self):
        assert strip_length.__code__.co_varnames[: strip_length.__code__.co_argcount] == ("signal",)


class TestSamplesOf:
    def test_gives_an_array_of_its_own(self, lab):
        signal = lab.white(100)
        samples = samples_of(signal)
        samples[:] = 0
        around = np.roll(lab.direct_white(100), 10)[:20]
        assert samples_of(signal, 90, 110).tobytes() == around.tobytes()
