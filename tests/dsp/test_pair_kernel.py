"""Pairs of neighbours: the compiled loop against its twin, and runs against plain counting."""

import builtins
import dataclasses

import numpy as np
import pytest

from wavegen.dsp import pair_kernel
from wavegen.dsp.cell_sums import CELL, sum_cells
from wavegen.dsp.pair_kernel import (
    FINE_PER_COARSE,
    added,
    coarse_edges,
    coarsened,
    tally_pairs,
    tally_pairs_by_numpy,
)
from wavegen.dsp.power_bins import bin_edges
from wavegen.dsp.power_kernel import exact_powers, tally


def gaussian(rng, n, scale=1.0):
    return ((rng.standard_normal(n) + 1j * rng.standard_normal(n)) * scale).astype(np.complex64)


def cases():
    rng = np.random.default_rng(15)
    gated = gaussian(rng, 20000)
    gated[3000:12000] = 0
    smooth = np.convolve(gaussian(rng, 30000), np.ones(7) / 7, "same").astype(np.complex64)
    return {
        "gaussian": gaussian(rng, 70000),
        "smooth": smooth,
        "one cell": gaussian(rng, CELL),
        "cell and one": gaussian(rng, CELL + 1),
        "short": gaussian(rng, 777),
        "one sample": gaussian(rng, 1),
        "empty": gaussian(rng, 0),
        "zeros": np.zeros(3000, np.complex64),
        "gated": gated,
        "1e-25": gaussian(rng, 5000, 1e-25),
        "1e25": gaussian(rng, 5000, 1e25),
        "one speck": np.concatenate([gaussian(rng, 4096), [1e-30], gaussian(rng, 2000)]).astype(
            np.complex64
        ),
        "constant envelope": np.exp(1j * rng.uniform(0, 6, 9999)).astype(np.complex64),
    }


@pytest.mark.parametrize("name", cases())
def test_compiled_equals_numpy(name):
    samples = cases()[name]
    kept = samples.copy()
    assert pair_kernel.compiled_kernel() is not None
    one, other = tally_pairs(samples), tally_pairs_by_numpy(samples)
    for field in dataclasses.fields(one):
        np.testing.assert_array_equal(
            getattr(one, field.name), getattr(other, field.name), field.name
        )
    np.testing.assert_array_equal(samples, kept)


@pytest.mark.parametrize("count", [tally_pairs, tally_pairs_by_numpy])
@pytest.mark.parametrize("name", cases())
def test_samples_less_pairs_are_runs(name, count):
    samples = cases()[name]
    pairs = count(samples)
    powers = exact_powers(samples)
    fine = tally(samples)
    counts, first_bin = coarsened(fine.counts, fine.first_bin)
    assert counts.sum() == np.count_nonzero(powers)
    if not counts.size:
        assert not pairs.counts.size
        return
    together, low = added(counts * 0, first_bin, pairs.counts, pairs.first_bin)
    assert (low, together.size) == (first_bin, counts.size)  # no pair outside the samples' bins
    edges = coarse_edges(first_bin, counts.size)
    for k in range(0, counts.size, max(counts.size // 40, 1)):
        is_above = powers >= edges[k]
        runs = np.count_nonzero(is_above[1:] & ~is_above[:-1]) + is_above[0]
        assert counts[k:].sum() - together[k:].sum() == runs


@pytest.mark.parametrize("name", ["gaussian", "gated", "short", "1e25", "one speck"])
def test_sums_of_higher_powers(name):
    samples = cases()[name]
    powers = exact_powers(samples)
    found = tally_pairs(samples)
    np.testing.assert_array_equal(found.squares, sum_cells(powers * powers))
    np.testing.assert_array_equal(found.cubes, sum_cells(powers * powers * powers))


def test_coarse_bins_are_whole_fine_ones():
    rng = np.random.default_rng(2)
    counts = rng.integers(0, 9, 83)
    coarse, first = coarsened(counts, 1003)
    assert coarse.sum() == counts.sum()
    fine, wide = bin_edges(1003, 83), coarse_edges(first, coarse.size)
    for k in range(1, coarse.size):
        at = int(np.searchsorted(fine, wide[k]))
        assert fine[at] == wide[k]
        assert coarse[:k].sum() == counts[:at].sum()
    assert FINE_PER_COARSE == 8


def test_adding_counts_that_begin_elsewhere():
    one, other = np.array([1, 2, 3]), np.array([10, 20])
    total, first = added(one, 5, other, 2)
    assert first == 2
    assert total.tolist() == [10, 20, 0, 1, 2, 3]
    total, first = added(one, 5, other, 7)
    assert (first, total.tolist()) == (5, [1, 2, 13, 20])
    assert added(one, 5, other[:0], 0)[0] is one
    assert added(one[:0], 0, other, 4) == (other, 4)
    assert one.tolist() == [1, 2, 3]


def test_without_numba(monkeypatch):
    real = builtins.__import__

    def without(name, *rest, **more):
        if name == "numba":
            raise ImportError(name)
        return real(name, *rest, **more)

    samples = cases()["smooth"]
    expected = tally_pairs(samples)
    pair_kernel._compile.cache_clear()
    try:
        with monkeypatch.context() as patch:
            patch.setattr(builtins, "__import__", without)
            assert pair_kernel.compiled_kernel() is None
            found = tally_pairs(samples)
    finally:
        pair_kernel._compile.cache_clear()
    np.testing.assert_array_equal(found.counts, expected.counts)
    np.testing.assert_array_equal(found.cubes, expected.cubes)
