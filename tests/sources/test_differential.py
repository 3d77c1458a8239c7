import numpy as np
import pytest

from wavegen.sources.differential import CELL, integrate, phase_steps


class Fixed:
    """Given numbers on a loop, with random bits above those that count."""

    def __init__(self, numbers):
        self.numbers = numbers

    def words(self, first, count):
        return self.numbers[np.arange(first, first + count) % self.numbers.size]


def states_for(order, period, seed=4):
    numbers = np.random.default_rng(seed).integers(0, 256, period, dtype=np.uint8)
    steps = np.random.default_rng(7).permutation(order).astype(np.uint16)
    return numbers, steps, integrate(Fixed(numbers), steps, period)


@pytest.mark.parametrize("order", [2, 4, 8, 256])
@pytest.mark.parametrize("period", [1, 5, CELL, 3 * CELL + 11])
def test_differences_are_the_steps_and_the_loop_closes(order, period):
    numbers, steps, states = states_for(order, period)
    phases = states.words(0, period).astype(int)
    assert phases.max() < order
    assert phases[-1] == 0
    turned = np.diff(phases, prepend=0) % order  # 0 before the first: the loop's own end
    expected = steps[numbers.astype(int) % order].astype(int)
    assert np.array_equal(turned[:-1], expected[:-1])
    assert (expected[-1] + states.residue) % order == turned[-1]
    assert states.residue == -expected.sum() % order


def test_any_range_is_that_of_the_loop():
    period = 2 * CELL + 100
    _, _, states = states_for(8, period)
    loop = states.words(0, period)
    rng = np.random.default_rng(1)
    ranges = [(-3, 10), (CELL - 1, 2), (period - 5, 10), (-period, 3 * period), (9, 0)]
    for first, count in [*ranges, *rng.integers(-period, period, (10, 2)).tolist()]:
        size = abs(count)
        expected = loop[np.arange(first, first + size) % period]
        assert np.array_equal(states.words(first, size), expected)


def test_one_number_a_cell_is_kept():
    _, _, states = states_for(4, 5 * CELL)
    assert states.sums.size == 5


@pytest.mark.parametrize(
    ("points", "steps"),
    [
        (np.exp(1j * np.array([0.3, 0.3 + np.pi])), [0, 1]),
        (np.array([1 + 1j, 1 - 1j, -1 + 1j, -1 - 1j]) / np.sqrt(2), [0, 3, 1, 2]),
        (np.array([1, 1j, -1, 0.9j]), None),
        (np.array([1, 1j, -1, -1]), None),
        (np.array([1.2, 0.8j, -1.2, -0.8j]), None),
        (np.array([0, 1, 1j, -1]), None),
    ],
)
def test_steps_of_points(points, steps):
    found = phase_steps(points)
    assert (None if found is None else found.tolist()) == steps
