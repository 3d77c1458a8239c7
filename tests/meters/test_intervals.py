"""Intervals about the process; their coverage at full size: tests/speed/study_coverage.py."""

import importlib.util
from pathlib import Path

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.meters.batches import measure_batches
from wavegen.meters.intervals import MANY_RUNS, SampledStatistics

STUDIES = Path(__file__).parents[1] / "speed"


@pytest.fixture(scope="module")
def study():
    spec = importlib.util.spec_from_file_location(
        "small_study_coverage", STUDIES / "study_coverage.py"
    )
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def sampled(samples, **more):
    return SampledStatistics.of(measure_batches(samples, **more))


@pytest.fixture(scope="module")
def noise(study):
    return sampled(study.Noise().record(np.random.default_rng(3), 1 << 18))


@pytest.mark.parametrize("kind", ["Noise", "Qpsk", "Ofdm"])
def test_coverage_small_study(study, kind):
    """80 records of 2^15: with 95 % there are 10 misses at most but once in 400 times."""
    process = getattr(study, kind)()
    held, runs = study.coverage(process, 80, 1 << 15)
    assert np.all(held >= 70 / 80)
    assert runs[0] > MANY_RUNS > runs[2]  # both ways are tried


def test_truth_of_the_study(study):
    """The processes' levels: Rice; the exact second moments 1.23618 and 2 - 1/300."""
    assert study.level_db(study.Noise(), 1e-3) == pytest.approx(8.393, abs=1e-3)
    for process, second in ((study.Qpsk(), 1.23618), (study.Ofdm(), 2 - 1 / 300)):
        step, weight = np.polynomial.legendre.leggauss(60)
        x, weight = 8 * (step + 1), 8 * weight  # to 16 times the mean
        moment = np.sum(weight * 2 * x * process.ccdf(x))
        assert moment == pytest.approx(second, abs=2e-3)


def test_naive_binomial_intervals_are_too_narrow(study):
    """Mistake: oversampled samples counted as independent; 2.2 times too sure at L = 4, 0.1 %.

    The variance inflation of a flat band at fourfold oversampling is 1.985 at 0.1 % and 2.98 at
    10 % for a fixed level (bivariate Rayleigh, computed); the own mean takes from the second.
    """
    record = sampled(study.Noise().record(np.random.default_rng(8), 1 << 20))
    low, high = record.ccdf_interval(record.statistics.level_db([1e-3]))
    naive = 2 * 1.96 * (1e-3 / (1 << 20)) ** 0.5
    # The variance over 64 batches is good to 18 %: 3 sigma of its root are 27 %.
    assert (high - low)[0] / naive == pytest.approx(1.985**0.5, rel=0.27)


def test_half_width_at_a_level(study):
    """0.055 dB at 0.1 % from 10^6 samples at L = 4 (exact bivariate variance, computed)."""
    record = sampled(study.Noise().record(np.random.default_rng(9), 1_000_000))
    row = record.levels([1e-3])[0]
    assert (row.high_db - row.low_db) / 2 == pytest.approx(0.0549, rel=0.27)
    assert row.low_db < row.level_db < row.high_db


def test_own_mean_narrows_the_body(study):
    """Plain batch means at 10 % covered 100 %: without the influence of the mean, too wide."""
    samples = study.Noise().record(np.random.default_rng(4), 1 << 20)
    record = sampled(samples)
    level = record.statistics.mean * np.log(10)
    share = record.batches.above([level])[0] / record.batches.n_measured
    plain = np.std(share, ddof=1) / share.size**0.5
    low, high = record.ccdf_interval(10 * np.log10(np.log(10)))
    assert (high - low)[0] / (2 * 1.96) < 0.8 * plain


def test_levels_and_probabilities_are_inverse(noise):
    for q in (0.3, 1e-2, 1e-3, 3e-4):
        (low,), (high,) = noise.level_interval([q])
        assert noise.ccdf_interval(low)[0][0] == pytest.approx(q, rel=0.02)
        assert noise.ccdf_interval(high)[1][0] == pytest.approx(q, rel=0.02)


def test_higher_confidence_is_wider(noise):
    last = (0.0, 0.0)
    for confidence in (0.5, 0.9, 0.95, 0.999, 1 - 1e-5):
        low, high = noise.level_interval([1e-3], confidence=confidence)
        own = float(noise.statistics.level_db(1e-3))
        assert own - low[0] > last[0]
        assert high[0] - own > last[1]
        last = (own - low[0], high[0] - own)
    with pytest.raises(ArgumentsError, match="confidence"):
        noise.ccdf_interval(3.0, confidence=1.0)


def test_no_jump_where_runs_take_over(noise):
    level = np.arange(5, noise.statistics.papr_db, 0.02)
    low, high = noise.ccdf_interval(level)
    own = noise.statistics.ccdf(level)
    assert np.all(low <= own)
    assert np.all(own <= high)
    relative = np.log(high / np.maximum(own, 1e-9))[noise.n_runs(level) > 20]
    # Between batches and the next of them, the worth of a run moves by some of its 18 %.
    assert np.all(np.abs(np.diff(relative)) < 0.25 * relative[1:] + 0.01)


def test_beyond_the_peak(noise):
    """No exceedance in n: p < 3.7 runs (97.5 %, Poisson), each of some samples."""
    low, high = noise.ccdf_interval(noise.statistics.papr_db + 1)
    assert low[0] == 0
    size = noise.statistics.n_samples
    assert 3.6 / size < high[0] < 3.7 * 4 / size
    row = noise.levels([1e-9])[0]
    assert row.high_db == np.inf
    assert not row.resolved
    assert row.low_db == pytest.approx(noise.statistics.papr_db)  # one was seen there


def test_resolved_from_ten_runs(noise):
    rows = noise.levels([1e-1, 1e-3, 1e-4, 1e-5, 1e-6])
    assert [row.resolved for row in rows] == [True, True, True, False, False]
    for row in rows:
        assert row.resolved == (row.n_runs >= 10)
    # Runs above the 0.1 % level last 1 / (B sqrt(pi u / 3)) = 4 / sqrt(7.23) samples (Rice);
    # counted in whole samples, a run has one at least.
    assert rows[1].n_runs == pytest.approx(1e-3 * (1 << 18) / 1.65, rel=0.15)


def test_next_decade_needs_ten_times_as_much(noise):
    more = noise.next_decade()
    assert more.probability == pytest.approx(1e-5)
    assert more.times == pytest.approx(more.n_samples / (1 << 18))
    # Ten runs of 1.2 to 2 samples at 1e-5: 4 / sqrt(pi u / 3) = 1.2 by Rice's rate, those that
    # pass between two samples not counted.
    assert 1.2e6 < more.n_samples < 2.0e6
    short = sampled(np.exp(1j * np.arange(200)).astype(np.complex64))
    assert short.next_decade() is None


def test_moments_and_their_intervals(study):
    """E p^2 = 2, E p^3 = 6 (Gaussian); 40 records, each interval of 95 %: 33 or more hold both."""
    held = 0
    for seed in range(40):
        samples = study.Noise().record(np.random.default_rng([9, seed]), 1 << 15)
        record = sampled(samples)
        power = np.abs(samples.astype(np.complex128)) ** 2
        power /= power.mean()
        second, third = record.moments()
        assert second.value == pytest.approx(np.mean(power**2), rel=1e-6)
        assert third.value == pytest.approx(np.mean(power**3), rel=1e-6)
        held += second.low <= 2 <= second.high and third.low <= 6 <= third.high
    assert held >= 33


def test_error_of_the_second_moment(study):
    """sqrt(32/3 / n) at L = 4, the mean's part taken off.

    ``p^2 - 4 p + 2`` is twice the Laguerre polynomial of degree 2, whose covariance is the fourth
    power of the correlation ``sinc(k/4)``; these add up to 2/3 of 4 (derivation). With the part
    of the mean left in it would be 2.6 times as much.
    """
    record = sampled(study.Noise().record(np.random.default_rng(5), 1 << 18))
    expected = (32 / 3 / (1 << 18)) ** 0.5
    assert record.moment(2).standard_error == pytest.approx(expected, rel=0.27)


def test_mean_interval(study):
    """The mean of a flat band of a quarter of the rate has n / 4 independent samples."""
    record = sampled(study.Noise().record(np.random.default_rng(5), 1 << 18))
    low, high = record.mean_interval_db()
    expected = 2 * 1.96 * (4 / (1 << 18)) ** 0.5 * 10 / np.log(10)
    assert high - low == pytest.approx(expected, rel=0.27)


def test_a_level_that_drifts_is_told_and_widens(study):
    samples = study.Noise().record(np.random.default_rng(6), 1 << 18)
    steady = sampled(samples)
    assert steady.drift == 0
    slope = np.linspace(0.8, 1.2, samples.size).astype(np.float32)
    drifting = sampled(samples * slope)
    assert drifting.drift > 0.5
    wide, narrow = (
        np.subtract(*np.flip(record.mean_interval_db())) for record in (drifting, steady)
    )
    assert narrow < 0.1
    # Power from 0.64 to 1.44 scatters by 0.23, so that 64 batches seem to give the mean to
    # 0.5 dB from end to end; batches that follow one another are worth but a few of 64.
    assert wide > 1.5


def test_constant_envelope_and_clipped_wall(study):
    phase = np.cumsum(np.random.default_rng(1).uniform(-1, 1, 1 << 16))
    constant = sampled(np.exp(1j * phase).astype(np.complex64))
    row = constant.levels([1e-2])[0]
    assert abs(row.level_db) < 1e-3
    assert row.low_db <= row.level_db <= row.high_db
    samples = study.Noise().record(np.random.default_rng(1), 1 << 18)
    size = np.abs(samples)
    wall = np.float32(np.sqrt(2 * np.mean(size**2)))
    clipped = sampled((samples * np.minimum(1, wall / size)).astype(np.complex64))
    row = clipped.levels([1e-2])[0]
    # The wall itself moves against the mean only as the mean does: 0.02 dB.
    assert row.level_db == pytest.approx(clipped.statistics.papr_db, abs=1e-4)
    assert row.level_db - row.low_db < 0.1


@pytest.mark.parametrize("n", [1, 10, 63])
def test_too_short_says_nothing(n):
    rng = np.random.default_rng(n)
    record = sampled(rng.standard_normal(2 * n).astype(np.float32).view(np.complex64))
    low, high = record.ccdf_interval([0.0, 3.0])
    assert low.tolist() == [0, 0]
    assert high.tolist() == [1, 1]
    row = record.levels([0.1])[0]
    assert (row.low_db, row.high_db) == (-np.inf, np.inf)
    assert record.moments()[0].high == np.inf
    assert record.mean_interval_db() == (-np.inf, np.inf)


def test_does_not_depend_on_scale(study):
    samples = study.Noise().record(np.random.default_rng(2), 1 << 15)
    one, other = sampled(samples), sampled(samples * np.float32(2.0**-20))
    np.testing.assert_allclose(one.ccdf_interval([0, 5, 9]), other.ccdf_interval([0, 5, 9]))
    assert one.moments()[1].low == pytest.approx(other.moments()[1].low)
