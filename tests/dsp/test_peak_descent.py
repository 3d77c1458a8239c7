import numpy as np
import pytest

from wavegen.dsp import peak_descent
from wavegen.dsp.envelope_excess import excess_over
from wavegen.dsp.peak_descent import (
    Excess,
    advance,
    advance_by_numpy,
    descend,
    steps_by_numpy,
    steps_of,
)

N = 256
BINS = np.r_[-32:0, 1:33]


def rows_of(n_rows, seed=1):
    rng = np.random.default_rng(seed)
    lines = np.zeros((n_rows, N), np.complex128)
    lines[:, BINS] = rng.choice([1, 1j, -1, -1j], (n_rows, BINS.size))
    return (np.fft.ifft(lines, axis=1) * N / 8).astype(np.complex64)


def free_bins(n=12, seed=2):
    """Return lines inside the band, drawn at random."""
    return np.sort(np.random.default_rng(seed).permutation(BINS)[:n] % N).astype(np.uint32)


def energy(rows, amplitude):
    return np.sum(np.abs(excess_over(rows.reshape(-1), amplitude).reshape(rows.shape)) ** 2, axis=1)


@pytest.mark.parametrize("amplitude", [1.2, 1.7, 2.2])
def test_only_chosen_lines_change(amplitude):
    rows = rows_of(6)
    before, bins = rows.copy(), free_bins()
    change = descend(rows, bins=bins, amplitude=amplitude, n_rounds=8)
    lines = np.fft.fft((rows - before).astype(np.complex128), axis=1) / N
    assert np.max(np.abs(lines[:, bins] - change)) < 1e-6
    lines[:, bins] = 0
    assert np.max(np.abs(lines)) < 1e-6


def test_every_round_leaves_less_above():
    bins, amplitude = free_bins(), 1.5
    left = []
    for n_rounds in range(8):
        rows = rows_of(40)
        descend(rows, bins=bins, amplitude=amplitude, n_rounds=n_rounds)
        left.append(energy(rows, amplitude))
    falls = np.diff(np.array(left), axis=0)
    assert np.max(falls) < 1e-5
    assert np.median(left[-1]) < 0.1 * np.median(left[0])


def test_steps_that_would_raise_it_are_halved():
    """A step 30 times too long: what it would bring above is more than what it takes."""
    rows = rows_of(8)
    excess = Excess.of(rows, 1.5)
    moved = rows_of(8, seed=5)
    steps = np.full(8, 30, np.float32)
    before = energy(rows, 1.5)
    kept = rows.copy()
    advance(rows, moved, steps, 1.5, excess)
    assert np.all(energy(rows, 1.5) <= before)
    assert set(np.log2(30 / steps[steps > 0]).tolist()) <= set(range(1, peak_descent.MOST_HALVINGS))
    assert np.array_equal(rows[steps == 0], kept[steps == 0])


def test_the_step_is_the_best_to_first_order():
    """On two samples, one above: ``|4 - 2 s| = 2`` at ``s = 1``."""
    excess = Excess.of(np.array([[4, 0]], np.complex64), 2.0)
    assert spread(excess).tolist() == [[2, 0]]
    assert (excess.counts.tolist(), excess.places[0, 0], excess.energies.tolist()) == ([1], 0, [4])
    moved = np.array([[-2, 5]], np.complex64)
    assert steps_of(moved, excess).tolist() == [1.0]
    assert steps_of(-moved, excess).tolist() == [0.0]
    assert steps_of(moved, Excess.of(np.zeros((1, 2), np.complex64), 2.0)).tolist() == [0.0]


def spread(excess):
    rows = np.full(excess.places.shape, np.nan, np.complex64)
    excess.put(rows)
    return rows


def fields_of(excess):
    first = [
        field[k, :count]
        for field in (excess.places, excess.values)
        for k, count in enumerate(excess.counts)
    ]
    return [spread(excess), np.concatenate(first), excess.counts, excess.energies]


def test_the_excess_is_spread_without_a_compiler_too(monkeypatch):
    excess = Excess.of(rows_of(5), 1.5)
    want = spread(excess)
    monkeypatch.setattr(peak_descent, "_compile", lambda: None)
    assert spread(excess).tobytes() == want.tobytes()
    assert want.any()


@pytest.mark.parametrize("amplitude", [0.9, 1.6, 3.9])
def test_compiled_loops_and_numpy_give_the_same_bits(amplitude):
    moved = rows_of(7, seed=9)
    results = []
    for steps_in_use, advance_in_use in ((steps_of, advance), (steps_by_numpy, advance_by_numpy)):
        rows, excess = rows_of(7), Excess.of(rows_of(7), amplitude)
        steps = steps_in_use(moved, excess)
        found = steps.tobytes()
        steps[1:4] = [0.3, 40, 0]
        advance_in_use(rows, moved, steps, amplitude, excess)
        results.append([found, *(x.tobytes() for x in (rows, steps, *fields_of(excess)))])
    assert results[0] == results[1]


def test_what_stands_above_is_what_a_clip_takes():
    rows = rows_of(5)
    for amplitude in (0.5, 1.5, 9.0):
        want = excess_over(rows.reshape(-1), amplitude).reshape(rows.shape)
        excess = Excess.of(rows.copy(), amplitude)
        assert np.array_equal(spread(excess), want)
        assert excess.energies == pytest.approx(energy(rows, amplitude), rel=1e-6)
        assert np.array_equal(excess.counts, np.count_nonzero(want, axis=1))


def test_a_sample_that_loses_its_excess_in_rounding():
    amplitude = 1.0
    just = np.nextafter(np.float32(1), np.float32(2))
    rows = np.array([[just, 0.5, 2.0]], np.complex64)
    moved = np.array([[-1, 0, -1]], np.complex64)
    excess = Excess.of(rows, amplitude)
    assert steps_of(moved, excess).tobytes() == steps_by_numpy(moved, excess).tobytes()


def test_rows_do_not_know_each_other():
    bins = free_bins()
    together = rows_of(9)
    change = descend(together, bins=bins, amplitude=1.5, n_rounds=6)
    for row in range(9):
        alone = rows_of(9)[row : row + 1]
        one = descend(alone, bins=bins, amplitude=1.5, n_rounds=6)
        assert one.tobytes() == change[row : row + 1].tobytes()


def test_low_rows_are_left():
    rows = rows_of(3)
    high = float(np.abs(rows).max()) * 1.01
    before = rows.copy()
    assert not descend(rows, bins=free_bins(), amplitude=high, n_rounds=5).any()
    assert rows.tobytes() == before.tobytes()


def test_a_rule_is_kept():
    rows, bins = rows_of(5), free_bins()
    change = descend(
        rows,
        bins=bins,
        amplitude=1.5,
        n_rounds=6,
        rule=lambda moves: np.maximum(moves.real, 0).astype(np.complex64),
    )
    assert np.all(change.real >= 0)
    assert not change.imag.any()
    assert change.any()
