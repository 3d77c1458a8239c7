from itertools import pairwise

import numpy as np
import pytest

from wavegen.dsp.cell_sums import CELL, CellSums, sum_cells, sum_tree


def test_sums_are_those_of_whole_numbers():
    powers = np.arange(1, 2501, dtype=np.float64)
    expected = [powers[:1024].sum(), powers[1024:2048].sum(), powers[2048:].sum()]
    np.testing.assert_array_equal(sum_cells(powers), expected)
    for n in (0, 1, 2, 3, 7, 1000):
        assert sum_tree(powers[:n]) == n * (n + 1) / 2


def stretch(powers, start, stop):
    """Read as a meter does: part of a cell, whole cells, part of a cell."""
    cells = CellSums(start)
    first, last = min(-(-start // CELL) * CELL, stop), max(stop // CELL * CELL, start)
    cells.add_powers(powers[start:first])
    if last > first:
        rows = powers[first:last].reshape(-1, CELL)
        cells.add_cells(sum_cells(powers[first:last]), rows.max(axis=1))
    cells.add_powers(powers[max(first, last) : stop])
    return cells


@pytest.mark.parametrize("start", [0, 5, 1024, 1500])
@pytest.mark.parametrize("cuts", [(), (1600,), (1601, 1602, 2048, 2050), (3000, 3500, 3600, 4999)])
def test_cuts_do_not_matter(start, cuts):
    powers = np.random.default_rng(1).exponential(size=5000)
    whole = stretch(powers, start, 5000)
    edges = [start, *cuts, 5000]
    parts = [stretch(powers, low, high) for low, high in pairwise(edges)]
    total = parts[0]
    for part in parts[1:]:
        total.append(part)
    assert total.total() == whole.total() == pytest.approx(powers[start:].sum(), rel=1e-12)
    np.testing.assert_array_equal(total.maxima(), whole.maxima())
    assert (total.start, total.stop) == (start, 5000)
    assert whole.maxima().size == 5 - start // CELL


def test_nothing():
    total, maxima = CellSums(7).total(), CellSums(7).maxima()
    assert total == 0.0
    assert maxima.size == 0


def test_whole_cells_can_be_taken_away():
    rng = np.random.default_rng(4)
    sums, maxima = rng.random(11), rng.random(11)
    cells = CellSums(0)
    cells.add_cells(sums[:6], maxima[:6])
    cells.add_cells(sums[6:], maxima[6:])
    cells.add_powers(np.full(100, 2.0))
    taken = cells.take(4)
    assert taken.tolist() == sums[:8].tolist()
    left = cells.cells()
    assert left[0].tolist() == [*sums[8:], 200.0]
    assert left[1].tolist() == [*maxima[8:], 2.0]
    assert (cells.start, cells.stop) == (8 * 1024, 11 * 1024 + 100)
    assert cells.take(4).size == 0
    assert CellSums(5).take(1).size == 0
