import itertools

import numpy as np
import pytest

from wavegen.dsp.grid_sums import CellReading, GridSums


class Energy(CellReading):
    def __init__(self):
        super().__init__(8)

    def reduce(self, first, samples):
        rows = samples.reshape(-1, 8)
        numbers = first + np.arange(rows.shape[0])
        return np.stack([np.sum(np.abs(rows.astype(complex)) ** 2, axis=1), numbers * 1.0], axis=1)


def cut_at_random(rng, n, pieces):
    return [0, *np.sort(rng.integers(0, n + 1, pieces)).tolist(), n]


@pytest.mark.parametrize("n", [1, 7, 64, 1001])
def test_sums_of_cells_do_not_depend_on_the_cut(n) -> None:
    rng = np.random.default_rng(n)
    values = rng.standard_normal((n, 3)) * 10.0 ** rng.integers(-8, 8, (n, 1))
    whole = GridSums()
    whole.add(0, values)
    for _ in range(20):
        parts = []
        edges = cut_at_random(rng, n, 6)
        for low, high in itertools.pairwise(edges):
            parts.append(GridSums())
            parts[-1].add(low, values[low:high])
        while len(parts) > 1:
            place = int(rng.integers(0, len(parts) - 1))
            parts[place].append(parts.pop(place + 1))
        assert np.array_equal(parts[0].total(), whole.total())
    assert whole.total() == pytest.approx(values.sum(axis=0))


def test_memory_stays_flat() -> None:
    sums = GridSums()
    for number in range(1000):
        sums.add(number, np.ones((1, 2)))
    assert len(sums._nodes) <= 10
    assert sums.total().tolist() == [1000, 1000]


def test_nothing_has_no_sum() -> None:
    assert GridSums().total() is None
    assert Energy().total() is None


@pytest.mark.parametrize("n", [3, 8, 100])
def test_cells_cut_by_strips_are_put_together(n) -> None:
    rng = np.random.default_rng(n)
    samples = (rng.standard_normal(n) + 1j * rng.standard_normal(n)).astype(np.complex64)
    whole = Energy()
    whole.feed(0, samples)
    for _ in range(40):
        parts = []
        edges = cut_at_random(rng, n, 5)
        for low, high in itertools.pairwise(edges):
            reading = Energy()
            middle = (low + high) // 2
            reading.feed(low, samples[low:middle])
            reading.feed(middle, samples[middle:high])
            parts.append(reading)
        while len(parts) > 1:
            place = int(rng.integers(0, len(parts) - 1))
            parts[place].merge(parts.pop(place + 1))
        assert parts[0].n_samples == n
        assert np.array_equal(parts[0].total(), whole.total())
    assert whole.total()[0] == pytest.approx(np.sum(np.abs(samples) ** 2), rel=1e-6)


def test_a_stretch_from_the_middle_starts_in_its_own_cell() -> None:
    reading = Energy()
    reading.feed(11, np.ones(10, np.complex64))
    assert reading.total().tolist() == [10, 1 + 2]
