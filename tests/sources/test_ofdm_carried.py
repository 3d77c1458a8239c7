import numpy as np
import pytest

from wavegen.sources.ofdm_carried import Carried
from wavegen.sources.ofdm_schedule import Presence

TABLE = np.array([1, 1j, -1, -1j], np.complex64)


class Counting:
    """Word ``k`` is ``k``: shows which words were asked for."""

    def words(self, first: int, count: int):
        return (np.arange(first, first + count) % 251).astype(np.uint8)


def carried(**more) -> Carried:
    kept = {"presence": Presence(on=np.array([True, False, True]))} | more
    return Carried(data=Counting(), table=TABLE, bins=np.array([5, 6, 7, 1], np.uint32), **kept)


def test_words_are_drawn_for_symbols_that_are_on_only() -> None:
    part = carried()
    assert part.rows(0, 4).tolist() == [[0, 1, 2, 3], [4, 5, 6, 7], [8, 9, 10, 11]]
    assert part.rows(1, 1).shape == (0, 4)
    words = part.rows(2, 10)
    for skip, count in ((0, 10), (3, 4), (2, 1), (9, 1)):
        again = part.rows(2 + skip, count)
        assert part.between(words, 2, skip, count).tolist() == again.tolist()


def test_symbols_that_are_off_are_left_alone() -> None:
    part = carried()
    rows = np.full((4, 8), 9, np.complex64)
    part.write(rows, part.rows(3, 4), 3)
    words = part.rows(3, 4)
    assert np.all(rows[1] == 9)
    for place, numbers in zip((0, 2, 3), words, strict=True):
        assert rows[place, [5, 6, 7, 1]].tolist() == TABLE[numbers % 4].tolist()
        assert np.all(rows[place, [0, 2, 3, 4]] == 9)
    part.write(rows[1:2], part.rows(4, 1), 4)
    assert np.all(rows[1] == 9)


def test_rotation_turns_each_point_of_a_symbol() -> None:
    rotation = np.array([1, 1j, -1, -1j], np.complex64)
    part = carried(rotation=rotation)
    words = part.rows(0, 3)
    assert part.points(words).tolist() == (TABLE[words % 4] * rotation).tolist()
    rows = np.zeros((3, 8), np.complex64)
    part.write(rows, words, 0)
    assert rows[2, [5, 6, 7, 1]].tolist() == part.points(words)[1].tolist()


@pytest.mark.parametrize("n", [1, 4, 7, 12, 31])
def test_spreading_is_a_unitary_transform_of_each_symbol(n) -> None:
    part = Carried(
        data=Counting(),
        table=TABLE,
        bins=np.arange(n, dtype=np.uint32),
        presence=Presence(on=np.array([True])),
        is_spread=True,
    )
    words = part.rows(0, 6)
    rows = np.zeros((6, n), np.complex64)
    part.write(rows, words, 0)
    k = np.arange(n)
    transform = np.exp(-2j * np.pi * np.outer(k, k) / n) / np.sqrt(n)
    assert np.allclose(rows, TABLE[words % 4] @ transform, atol=1e-5)
    assert np.allclose(np.sum(np.abs(rows) ** 2, axis=1), n, rtol=1e-5)
