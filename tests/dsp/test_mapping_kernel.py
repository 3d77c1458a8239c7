import numpy as np
import pytest

from wavegen.dsp.mapping_kernel import (
    slices_of,
    write_points,
    write_points_by_numpy,
    write_values,
)


@pytest.mark.parametrize("arrangement", ["scattered", "halves", "comb"])
@pytest.mark.parametrize(("order", "word"), [(4, np.uint8), (256, np.uint8), (1024, np.uint16)])
def test_compiled_and_plain_write_the_same(order, word, arrangement) -> None:
    rng = np.random.default_rng(3)
    n_fft, n = 196, 82
    table = (rng.normal(size=order) + 1j * rng.normal(size=order)).astype(np.complex64)
    bins = {
        "scattered": rng.permutation(n_fft)[:n],
        "halves": np.r_[n_fft - 41 : n_fft, 1:42],
        "comb": np.arange(3, 3 + 2 * n, 2),
    }[arrangement].astype(np.uint32)
    words = rng.integers(0, np.iinfo(word).max, (7, n), dtype=word, endpoint=True)
    expected = np.full((7, n_fft), -1, np.complex64)
    expected[:, bins] = table[words.astype(int) % order]
    for write in (write_points, write_points_by_numpy):
        rows = np.full((7, n_fft), -1, np.complex64)
        write(rows, words, table=table, bins=bins)
        assert rows.tobytes() == expected.tobytes()


@pytest.mark.parametrize("bins", [[5, 1, 8], [3, 4, 5], [*range(0, 200, 2), 7, 3]])
def test_chosen_rows_are_written_and_no_others(bins) -> None:
    rng = np.random.default_rng(3)
    columns = np.array(bins, np.uint32)
    places = np.array([6, 0, 3])
    table = np.array([1, 1j, -1, -1j], np.complex64)
    words = rng.integers(0, 256, (3, columns.size), dtype=np.uint8)
    expected = np.full((7, 200), 9, np.complex64)
    for row, place in enumerate(places):
        expected[place, columns] = table[words[row] % 4]
    for write in (write_points, write_points_by_numpy):
        rows = np.full((7, 200), 9, np.complex64)
        write(rows, words, table=table, bins=columns, places=places)
        assert rows.tobytes() == expected.tobytes()
    rows = np.full((7, 200), 9, np.complex64)
    write_values(rows, table[words % 4], bins=columns, places=places)
    assert rows.tobytes() == expected.tobytes()


def test_many_stretches_in_chosen_rows() -> None:
    columns = np.random.default_rng(4).permutation(400)[:150].astype(np.uint32)
    values = (np.arange(300) + 1j).reshape(2, 150).astype(np.complex64)
    for places, where in ((None, [0, 1]), (np.array([3, 1]), [3, 1])):
        rows = np.zeros((2 if places is None else 5, 400), np.complex64)
        write_values(rows, values, bins=columns, places=places)
        assert np.array_equal(rows[np.ix_(where, columns)], values)
        assert np.count_nonzero(rows) == 300


def test_largest_table() -> None:
    table = np.arange(1 << 16).astype(np.complex64)
    words = np.array([[0, 65535, 256]], np.uint16)
    for write in (write_points, write_points_by_numpy):
        rows = np.zeros((1, 4), np.complex64)
        write(rows, words, table=table, bins=np.array([3, 0, 1], np.uint32))
        assert rows.tolist() == [[65535, 256, 0, 0]]


def test_stretches_of_columns() -> None:
    assert slices_of([5]) == ((slice(0, 1), slice(5, 6, 1)),)
    found = slices_of([9, 8, 0, 3, 6])
    columns = [k for _, stretch in found for k in range(10)[stretch]]
    assert columns == [9, 8, 0, 3, 6]
