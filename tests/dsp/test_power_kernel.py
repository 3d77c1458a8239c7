"""The compiled count against its NumPy twin, bit for bit, at every scale."""

import builtins
import dataclasses
import pickle
import threading

import numpy as np
import pytest

from wavegen.dsp import power_kernel
from wavegen.dsp.cell_sums import CELL
from wavegen.dsp.power_bins import bin_edges
from wavegen.dsp.power_kernel import exact_powers, tally, tally_by_numpy


def gaussian(rng, n, scale=1.0):
    noise = rng.standard_normal(n) + 1j * rng.standard_normal(n)
    return (noise * scale).astype(np.complex64)


def cases():
    rng = np.random.default_rng(5)
    gated = gaussian(rng, 20000)
    gated[3000:12000] = 0
    mixed = gaussian(rng, 9000) * np.exp(rng.uniform(-95, 85, 9000)).astype(np.float32)
    phase = rng.uniform(0, 2 * np.pi, 9999)
    clipped = gaussian(rng, 30000)
    clipped /= np.maximum(np.abs(clipped), 1)
    return {
        "gaussian": gaussian(rng, 70000),
        "empty": gaussian(rng, 0),
        "one sample": gaussian(rng, 1),
        "short": gaussian(rng, 777),
        "one cell": gaussian(rng, CELL),
        "zeros": np.zeros(3000, np.complex64),
        "gated": gated,
        "1e-25": gaussian(rng, 5000, 1e-25),
        "1e25": gaussian(rng, 5000, 1e25),
        "every scale": mixed,
        "constant envelope": np.exp(1j * phase).astype(np.complex64),
        "clipped": clipped,
        "least float": np.full(5, np.complex64(1.4e-45)),
        "greatest float": np.full(5, np.complex64(3.4e38 + 3.4e38j)),
        "edge of the plain range": (2.0 ** rng.integers(-43, 43, 4096)).astype(np.complex64),
    }


@pytest.mark.parametrize("name", cases())
def test_compiled_equals_numpy(name):
    samples = cases()[name]
    kept = samples.copy()
    assert power_kernel.compiled_kernel() is not None
    one, other = tally(samples), tally_by_numpy(samples)
    for field in dataclasses.fields(one):
        np.testing.assert_array_equal(
            getattr(one, field.name), getattr(other, field.name), field.name
        )
    np.testing.assert_array_equal(samples, kept)


@pytest.mark.parametrize("count", [tally, tally_by_numpy])
@pytest.mark.parametrize("name", cases())
def test_every_sample_is_in_its_bin(name, count):
    samples = cases()[name]
    found = count(samples)
    power = np.abs(samples.astype(np.complex128)) ** 2
    nonzero = power[power > 0]
    assert found.counts.sum() + found.n_zeros == samples.size
    assert found.n_zeros == np.count_nonzero(power == 0)
    assert found.bad_index == -1
    if nonzero.size:
        edges = bin_edges(found.first_bin, found.counts.size)
        # The power is rounded to float32 by three operations: 2^-23 of it at most.
        slack = 2.0**-22
        assert edges[0] <= nonzero.min() * (1 + slack)
        assert edges[-1] > nonzero.max() * (1 - slack)
        below = np.cumsum(found.counts)
        for bin_number in np.linspace(0, found.counts.size - 1, 17).astype(int):
            edge = edges[bin_number + 1]
            low = np.count_nonzero(nonzero < edge * (1 - slack))
            high = np.count_nonzero(nonzero < edge * (1 + slack))
            assert low <= below[bin_number] <= high
        assert found.peak == pytest.approx(nonzero.max(), rel=slack)
        assert found.least == pytest.approx(nonzero.min(), rel=slack)
        exact = exact_powers(samples)
        assert found.peak_index == np.argmax(exact)
        in_top = exact[exact >= edges[-2]]
        powers, counts = np.unique(in_top, return_counts=True)
        np.testing.assert_array_equal(found.top_powers, powers)
        np.testing.assert_array_equal(found.top_counts, counts)
        assert found.top_powers[-1] == found.peak
    np.testing.assert_allclose(
        found.sums, np.add.reduceat(power, np.arange(0, power.size, CELL)), rtol=1e-6
    )


@pytest.mark.parametrize("count", [tally, tally_by_numpy])
@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf, 1j * np.inf, complex(np.nan, np.nan)])
@pytest.mark.parametrize("index", [0, 1023, 70001, 99999])
def test_names_the_first_sample_that_is_not_finite(bad, index, count):
    samples = gaussian(np.random.default_rng(1), 100000)
    samples[index:] = bad
    assert count(samples).bad_index == index
    # The next count is not spoiled by what the first had begun.
    assert count(samples[:index]).counts.sum() == index


def test_read_only_samples_need_no_second_version():
    samples = gaussian(np.random.default_rng(2), 4096)
    writable = tally(samples)
    samples.setflags(write=False)
    np.testing.assert_array_equal(tally(samples).counts, writable.counts)
    assert len(power_kernel.compiled_kernel().signatures) == 1


def test_strided_samples():
    samples = gaussian(np.random.default_rng(2), 8192)
    np.testing.assert_array_equal(tally(samples[::2]).sums, tally(samples[::2].copy()).sums)


def test_threads_do_not_share_their_counts():
    rng = np.random.default_rng(3)
    parts = [gaussian(rng, 200000) for _ in range(6)]
    found = [None] * 6

    def work(number):
        found[number] = tally(parts[number])

    threads = [threading.Thread(target=work, args=(number,)) for number in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    for part, result in zip(parts, found, strict=True):
        np.testing.assert_array_equal(result.counts, tally_by_numpy(part).counts)


def test_without_numba(monkeypatch):
    real = builtins.__import__

    def refuse(name, *args, **kwargs):
        if name == "numba":
            raise ImportError(name)
        return real(name, *args, **kwargs)

    samples = gaussian(np.random.default_rng(4), 5000)
    expected = tally(samples)
    power_kernel._compile.cache_clear()
    monkeypatch.setattr(builtins, "__import__", refuse)
    try:
        assert power_kernel.compiled_kernel() is None
        np.testing.assert_array_equal(tally(samples).counts, expected.counts)
    finally:
        power_kernel._compile.cache_clear()


def test_folder_that_cannot_be_written(monkeypatch):
    import numba

    real = numba.njit

    def refuse(*args, cache=False, **kwargs):
        if cache:
            raise RuntimeError
        return real(*args, **kwargs)

    power_kernel._compile.cache_clear()
    monkeypatch.setattr(numba, "njit", refuse)
    try:
        assert power_kernel.compiled_kernel() is not None
    finally:
        power_kernel._compile.cache_clear()


def test_tally_crosses_process_borders():
    found = tally(gaussian(np.random.default_rng(6), 2000))
    np.testing.assert_array_equal(pickle.loads(pickle.dumps(found)).counts, found.counts)  # noqa: S301
