import numpy as np
import pytest

from wavegen.dsp.symbol_rows import SymbolRows, half_turn

N = 64


def rows_of(indices, *, is_shifted, seed=1, n_rows=5):
    """Return symbols that hold random values on some subcarriers, and the values."""
    rng = np.random.default_rng(seed)
    values = rng.normal(size=(n_rows, indices.size)) + 1j * rng.normal(size=(n_rows, indices.size))
    place = indices + (0.5 if is_shifted else 0.0)
    basis = np.exp(2j * np.pi * np.outer(place, np.arange(N)) / N)
    return (values @ basis).astype(np.complex64), values


@pytest.mark.parametrize("is_shifted", [False, True])
@pytest.mark.parametrize("indices", [np.arange(-8, 8), np.array([-32, -3, 0, 5, 31])])
def test_lines_and_back(indices, is_shifted):
    rows, values = rows_of(indices, is_shifted=is_shifted)
    view = SymbolRows(n_fft=N, n_points=N, is_shifted=is_shifted)
    lines = view.lines(rows)
    assert np.max(np.abs(lines[:, indices % N] - values)) < 2e-6
    assert np.max(np.abs(view.samples(values.astype(np.complex64), indices) - rows)) < 2e-5
    assert np.max(np.abs(view.from_lines(lines) - rows)) < 2e-5


@pytest.mark.parametrize("is_shifted", [False, True])
@pytest.mark.parametrize("times", [1, 2, 3])
def test_the_finer_grid_has_the_envelope_between_the_samples(times, is_shifted):
    """Direct sums at the finer grid; roundings of single precision over 64 terms."""
    indices = np.arange(-20, 21)
    rows, values = rows_of(indices, is_shifted=is_shifted)
    view = SymbolRows(n_fft=N, n_points=times * N, is_shifted=is_shifted)
    place = indices + (0.5 if is_shifted else 0.0)
    want = values @ np.exp(2j * np.pi * np.outer(place, np.arange(times * N)) / (times * N))
    fine = view.finer(rows)
    assert fine.shape == (5, times * N)
    assert np.max(np.abs(np.abs(fine) - np.abs(want))) < 5e-5
    assert view.peaks(fine) == pytest.approx(np.max(np.abs(want) ** 2, axis=1), rel=1e-5)
    assert fine.flags.writeable
    assert not np.shares_memory(fine, rows)


@pytest.mark.parametrize(
    ("n_active", "per_band", "times"), [(16, 4, 1), (17, 4, 2), (16, 8, 2), (48, 4, 3), (64, 1, 1)]
)
def test_the_coarsest_grid_that_is_fine_enough(n_active, per_band, times):
    indices = np.arange(n_active) - n_active // 2
    view = SymbolRows.over_band(n_fft=N, indices=indices, per_band=per_band, is_shifted=False)
    assert view.n_points == times * N
    assert view.per_band(indices) == times * N / n_active


def test_a_centre_left_out_costs_no_finer_grid():
    indices = np.array([*range(-8, 0), *range(1, 9)])  # spans 17
    view = SymbolRows.over_band(n_fft=66, indices=indices, per_band=4, is_shifted=False)
    assert view.n_points == 132
    view = SymbolRows.over_band(n_fft=67, indices=indices, per_band=4, is_shifted=False)
    assert view.n_points == 67


def test_blocks_cover_all_rows():
    view = SymbolRows(n_fft=N, n_points=1 << 14)
    got = list(view.blocks(11))
    assert got == [(0, 4), (4, 8), (8, 11)]


def test_half_a_turn_over_a_symbol():
    assert np.allclose(half_turn(4), np.exp(1j * np.pi / 4) ** np.arange(4))
