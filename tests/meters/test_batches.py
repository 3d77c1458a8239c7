import dataclasses
import pickle

import numpy as np
import pytest

from wavegen.core.errors import SignalError
from wavegen.core.render import Tap, render
from wavegen.dsp.bursts import Bursts
from wavegen.meters import METERS
from wavegen.meters.batches import (
    FEWEST_BATCHES,
    BatchedPowerMeter,
    batch_length,
    gated_batch_length,
    in_pairs,
    measure_batches,
    pooled,
)
from wavegen.meters.gated import GatedPowerMeter
from wavegen.meters.power import measure_samples


def assert_same(one, other):
    for part in ("statistics", "batches"):
        for field in dataclasses.fields(getattr(one, part)):
            mine, its = (getattr(getattr(item, part), field.name) for item in (one, other))
            np.testing.assert_array_equal(mine, its, field.name)


def rendered(signal, meter, strip, workers=1):
    tap = Tap(name="b", signal=signal, meter=meter)
    return render(signal, taps=(tap,), strip_samples=strip, workers=workers)["b"]


def test_is_in_the_table():
    assert METERS.load("batched_power") is BatchedPowerMeter


@pytest.mark.parametrize("n", [64, 127, 128, 2044, 65535, 65536, 10**6, 2**40 + 1])
def test_from_64_to_127_batches_fit_at_any_length(n):
    assert 64 <= n // batch_length(n) <= 127


@pytest.mark.parametrize("n", [70_000, 200_003, 3001, 40])
@pytest.mark.parametrize("loops", [False, True])
def test_no_bit_depends_on_strips_or_workers(band_noise, held, n, loops):
    signal = held(band_noise(1, n, 0.3))
    meter = BatchedPowerMeter(loops=loops)
    whole = rendered(signal, meter, n)
    for strip, workers in ((16384, 2), (10007, 1), (1500, 2), (611, 1)):
        if n // strip < 200:
            assert_same(whole, rendered(signal, meter, strip, workers))
    assert_same(whole, measure_batches(signal.samples, loops=loops))


@pytest.mark.parametrize("n", [150_000, 5000])
def test_figures_against_plain_arithmetic(band_noise, n):
    samples = band_noise(2, n, 0.25)
    found = measure_batches(samples, loops=True)
    batches, size = found.batches, found.batches.batch_samples
    power = (samples.real * samples.real + samples.imag * samples.imag).astype(np.float64)
    plain = measure_samples(samples)
    for field in dataclasses.fields(plain):
        np.testing.assert_array_equal(
            getattr(found.statistics, field.name), getattr(plain, field.name), field.name
        )
    parts = np.split(power, np.arange(size, n, size))
    assert batches.n_batches == len(parts)
    assert batches.n_measured.tolist() == [part.size for part in parts]
    expected = [[np.sum(part**k) for k in (1, 2, 3)] for part in parts]
    np.testing.assert_allclose(batches.sums, expected, rtol=1e-12)
    for edge in batches.edges[[1, -200, -40, -3]]:
        above = [np.count_nonzero(part >= edge) for part in parts]
        np.testing.assert_allclose(batches.above(edge)[0], above)
        is_above = power >= edge
        runs = np.count_nonzero(is_above & ~np.roll(is_above, 1))
        assert batches.runs(edge)[0] == pytest.approx(runs)
    assert batches.above([0.0, 1e9])[:, 0].tolist() == [size, 0]


def test_a_run_over_the_seam_of_a_loop_counts_once(held):
    samples = np.full(4000, 0.1, np.complex64)
    samples[:5] = samples[-7:] = samples[2000:2003] = 1.0
    record, loop = (measure_batches(samples, loops=loops).batches for loops in (False, True))
    assert record.runs([0.5])[0] == pytest.approx(3)
    assert loop.runs([0.5])[0] == pytest.approx(2)
    # In whichever strips they come:
    strips = rendered(held(samples), BatchedPowerMeter(loops=True), 2001)
    assert strips.batches.runs([0.5])[0] == pytest.approx(2)


@pytest.mark.parametrize("n", [96_000, 6000])
def test_only_the_on_time_counts(band_noise, held, n):
    samples = band_noise(3, n, 0.25)
    bursts = Bursts.of_slots((True, False, True, True, False, False), n // 12, 20)
    signal = held(bursts.apply(samples, 0))
    found = rendered(signal, BatchedPowerMeter(bursts=bursts, loops=True), 3000)
    gated = rendered(signal, GatedPowerMeter(bursts=bursts), n)
    for field in dataclasses.fields(gated):
        np.testing.assert_array_equal(
            getattr(found.statistics, field.name), getattr(gated, field.name), field.name
        )
    is_on = bursts.is_on(0, n)
    size = found.batches.batch_samples
    expected = np.add.reduceat(is_on.astype(int), np.arange(0, n, size))
    assert found.batches.n_measured.tolist() == expected[expected > 0].tolist()
    assert found.batches.sums[:, 0].sum() == pytest.approx(found.statistics.mean * is_on.sum())


@pytest.mark.parametrize(
    ("n", "runs", "size"),
    [
        (1 << 20, ((0, 1 << 20),), 1 << 14),
        (1 << 20, ((1 << 10, 1 << 18),), 1 << 12),  # a quarter of the time
        (1 << 20, ((500, 66_036),), 1 << 10),  # 65536 samples: 64 or 65 cells
        (1 << 20, ((0, 5000),), 1 << 10),  # a cell at least, or the record would be held
        (6400, ((0, 640), (3000, 3640)), 16),
        (1 << 19, ((0, 5000),), 64),  # short enough to be held
        (122_880, tuple((k * 15_360, k * 15_360 + 3840) for k in range(8)), 512),
        (1 << 20, ((0, 10), (100_000, 100_010)), 1 << 10),
    ],
)
def test_batches_of_gated_records_are_64_that_are_on(n, runs, size):
    assert gated_batch_length(n, Bursts(period_samples=n, runs=runs)) == size


def test_a_gate_of_short_periods_leaves_batches_as_they_are():
    bursts = Bursts(period_samples=100, runs=((0, 3),))
    assert gated_batch_length(1 << 20, bursts) == 1 << 14


def test_a_long_burst_in_a_longer_record_has_its_own_batches(band_noise, held):
    samples = band_noise(3, 200_000, 0.25)
    bursts = Bursts(period_samples=200_000, runs=((50_000, 120_000),))
    found = rendered(held(samples), BatchedPowerMeter(bursts=bursts), 30_000).batches
    assert FEWEST_BATCHES <= found.n_batches < 2 * FEWEST_BATCHES
    assert found.n_measured.sum() == 70_000
    alone = measure_batches(samples[50_000:120_000]).batches
    assert found.above([1.0]).sum() == pytest.approx(alone.above([1.0]).sum())


def test_batches_in_pairs_are_those_of_twice_the_length(band_noise):
    samples = band_noise(4, 130_000, 0.3)
    one = measure_batches(samples).batches
    two = in_pairs(one)
    assert two.batch_samples == 2 * one.batch_samples
    assert two.n_batches == -(-one.n_batches // 2)
    assert two.n_measured.sum() == one.n_measured.sum()
    np.testing.assert_array_equal(two.counts[0], one.counts[0] + one.counts[1])
    np.testing.assert_array_equal(two.sums[3], one.sums[6] + one.sums[7])
    np.testing.assert_array_equal(two.runs([1.0, 4.0]), one.runs([1.0, 4.0]))


def test_several_records_as_one(band_noise):
    members = [
        measure_batches(band_noise(seed, n, 0.3) * np.float32(scale)).batches
        for seed, n, scale in ((1, 70_000, 1), (2, 200_000, 2), (3, 5000, 0.01))
    ]
    both = pooled(members)
    assert 64 <= both.n_batches < 128
    assert both.n_measured.sum() == 275_000
    power = both.edges[[3, 500, -30]]
    for read in ("above", "runs"):
        total = sum(getattr(part, read)(power).reshape(3, -1).sum(axis=1) for part in members)
        np.testing.assert_allclose(getattr(both, read)(power).reshape(3, -1).sum(axis=1), total)
    np.testing.assert_allclose(
        both.sums.sum(axis=0), sum(part.sums.sum(axis=0) for part in members)
    )
    same = pooled(members[:1])
    np.testing.assert_array_equal(same.counts, members[0].counts)


def test_travels_between_processes(band_noise, held):
    samples = band_noise(5, 70_000, 0.3)
    reading = BatchedPowerMeter(loops=True).begin(held(samples))
    reading.feed(0, samples[:30_001])
    copy = pickle.loads(pickle.dumps(reading))  # noqa: S301 - our own
    rest = BatchedPowerMeter(loops=True).begin(held(samples))
    rest.feed(30_001, samples[30_001:])
    copy.merge(rest)
    assert_same(copy.result(), measure_batches(samples, loops=True))


def test_faults_are_named(held):
    samples = np.ones(5000, np.complex64)
    samples[4321] = np.inf
    with pytest.raises(SignalError) as caught:
        rendered(held(samples), BatchedPowerMeter(where="field.iq"), 2000)
    assert caught.value.where == "field.iq"
    assert "sample 4321 " in caught.value.problem
    with pytest.raises(SignalError, match="exactly zero"):
        measure_batches(np.zeros(2000, np.complex64))
