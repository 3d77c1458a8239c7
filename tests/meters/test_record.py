import numpy as np
import pytest

from wavegen.core.render import Tap, render
from wavegen.meters.record import N_HEAD, RecordMeter, cell_length

N = 30_000


def look(held, samples, *, strip=None, workers=1, **settings):
    signal = held(samples)
    tap = Tap(name="record", signal=signal, meter=RecordMeter(**settings))
    return render(signal, taps=(tap,), strip_samples=strip, workers=workers)["record"]


@pytest.fixture
def codes():
    rng = np.random.default_rng(2)
    rails = np.rint(rng.standard_normal((N, 2)) * 900).astype(np.int64)
    rails[5000:5040] = rails[5000]
    rails[20_000] = -32768
    return rails


@pytest.fixture
def samples(codes):
    return ((codes[:, 0] + 1j * codes[:, 1]) / 32768).astype(np.complex64)


def test_sums_codes_and_runs(held, samples, codes):
    offset = 0.001 - 0.002j
    got = look(held, samples, offset=offset, code_scale=32768.0)
    body = samples[N_HEAD:].astype(np.complex128) - offset
    real, imag = body.real, body.imag
    want = [
        body.size,
        samples[N_HEAD:].real.sum(dtype=float),
        samples[N_HEAD:].imag.sum(dtype=float),
    ]
    assert got.cells.sum(axis=0)[:3] == pytest.approx(want, rel=1e-9)
    # Powers are taken in float32, which is good to 6e-8 each.
    assert got.cells[:, 3].sum() == pytest.approx((real**2 + imag**2).sum(), rel=1e-7)
    power = np.abs(samples.astype(np.complex128)) ** 2
    assert got.total_power == pytest.approx(power.sum(), rel=1e-7)
    assert got.peak == pytest.approx(power.max(), rel=2e-7)
    assert (got.nearest, got.furthest) == pytest.approx(
        ((np.abs(body) ** 2).min(), (np.abs(body) ** 2).max()), rel=1e-6
    )
    for rail, (values, counts) in enumerate(got.rails):
        found = np.unique(codes[:, rail], return_counts=True)
        assert values.tolist() == found[0].tolist()
        assert counts.tolist() == found[1].tolist()
    assert (got.n_fill, got.first_fill) == (1, 20_000)
    assert (got.first_run, got.last_run, got.longest_run) == (1, 1, 40)
    assert got.head.tolist() == samples[:N_HEAD].tolist()
    assert got.n_bad == 0


@pytest.mark.parametrize(("strip", "workers"), [(33, 1), (64, 2), (1000, 1), (7001, 3)])
def test_strips_and_workers_change_no_bit(held, samples, strip, workers):
    samples[:70] = samples[0]
    samples[-100:] = 0
    samples[9000] = np.nan
    one = look(held, samples, code_scale=32768.0)
    got = look(held, samples, strip=strip, workers=workers, code_scale=32768.0)
    assert got.cells.tolist() == one.cells.tolist()
    assert got.head.tolist() == one.head.tolist()
    for name in ("n_samples", "n_bad", "first_bad", "peak", "nearest", "furthest", "n_fill"):
        assert getattr(got, name) == getattr(one, name)
    assert (got.first_run, got.last_run, got.longest_run) == (70, 100, 40)
    assert (one.first_run, one.last_run, one.longest_run) == (70, 100, 40)
    assert (got.n_bad, got.first_bad) == (1, 9000)
    for mine, its in zip(one.rails, got.rails, strict=True):
        assert mine[1].tolist() == its[1].tolist()


def test_floats_are_counted_by_octaves(held, samples):
    ((values, counts), _) = look(held, samples).rails
    assert counts.sum() == N
    assert np.all(np.diff(values) >= 0)
    beyond = np.count_nonzero(samples.real >= 900 / 32768)
    # Bins are 1/512 of an octave wide: 0.2 % of the value, 0.1 % of the samples.
    assert counts[values >= 900 / 32768].sum() == pytest.approx(beyond, abs=0.002 * N)


def test_real_samples_have_one_rail(held, samples):
    assert len(look(held, samples, n_rails=1).rails) == 1


def test_all_alike(held):
    got = look(held, np.full(1000, 2.0), strip=100)
    assert (got.first_run, got.last_run, got.longest_run) == (1000, 1000, 0)


def test_cells_follow_the_length():
    assert [cell_length(n) for n in (1, 100, 10_000, 10**6, 10**9)] == [16, 16, 32, 2048, 8192]


@pytest.mark.parametrize("n", [1, 4095, 4096, 1 << 20, (1 << 29) - 1, 1 << 29, 10**10])
def test_cells_are_neither_too_many_nor_too_long(n):
    length = cell_length(n)
    assert length & (length - 1) == 0
    assert -(-n // length) <= 1 << 17
    assert length <= 4096 or -(-n // length) > 1 << 15
