"""Arrays in MAT files, against the library that wrote them."""

import struct

import numpy as np
import pytest
from scipy.io import loadmat, savemat

from wavegen.core.errors import FileError
from wavegen.files.mat_elements import arrays_of

MADE = {
    "a": np.arange(12.0).reshape(4, 3),
    "b": np.arange(4, dtype="i2"),
    "c": (np.arange(600) + 2j).astype("c8"),
    "d": np.array([[1 + 2j, 3 - 4j]]),
    "e": np.array([[7]], "u1"),
    "f": np.arange(2000.0) + 1j,
    "text": "only words",
    "cell": np.array([1, "x"], object),
    "struct": {"x": 1},
    "cube": np.zeros((2, 3, 4)),
    "none": np.zeros((0, 3)),
}


@pytest.mark.parametrize("compressed", [False, True])
def test_every_element_of_every_array(tmp_path, compressed):
    path = tmp_path / "x.mat"
    savemat(path, MADE, do_compression=compressed)
    theirs = loadmat(path)
    found = arrays_of(path)
    assert set(found) == {"a", "b", "c", "d", "e", "f", "none"}
    for name, array in found.items():
        wanted = theirs[name]
        assert array.shape == wanted.shape
        assert array.is_complex == (wanted.dtype.kind == "c")
        flat = wanted.reshape(-1, 1) if 1 in wanted.shape else wanted
        for column in range(flat.shape[1]):
            for start, stop in ((0, flat.shape[0]), (flat.shape[0] // 2, flat.shape[0])):
                got = array.column(array.real, column, start, stop)
                np.testing.assert_array_equal(got, flat[start:stop, column].real)
                if array.imaginary is not None:
                    got = array.column(array.imaginary, column, start, stop)
                    np.testing.assert_array_equal(got, flat[start:stop, column].imag)


def matrix(order, values):
    """A matrix of doubles stored as bytes, as some programs do, in either byte order."""
    flags = struct.pack(order + "IIII", 6, 8, 6, 0)
    sizes = struct.pack(order + "IIii", 5, 8, len(values), 1)
    name = struct.pack(order + "I", 1 << 16 | 1) + b"x\0\0\0"
    body = bytes(values)
    part = struct.pack(order + "II", 2, len(body)) + body + bytes(-len(body) % 8)
    content = flags + sizes + name + part
    mark = b"IM" if order == "<" else b"MI"
    version = struct.pack(order + "H", 0x0100)
    head = b"MATLAB 5.0 MAT-file".ljust(124) + version + mark
    return head + struct.pack(order + "II", 14, len(content)) + content


@pytest.mark.parametrize("order", ["<", ">"])
def test_doubles_stored_as_bytes_in_either_order(tmp_path, order):
    path = tmp_path / "x.mat"
    path.write_bytes(matrix(order, [3, 1, 4, 1, 5]))
    np.testing.assert_array_equal(loadmat(path)["x"].reshape(-1), [3, 1, 4, 1, 5])
    array = arrays_of(path)["x"]
    assert (array.kind, array.real.rail) == ("double", f"{order}u1")
    np.testing.assert_array_equal(array.column(array.real, 0, 1, 4), [1, 4, 1])


def test_a_file_that_shrinks_while_in_use(tmp_path):
    path = tmp_path / "x.mat"
    savemat(path, {"iq": np.ones(500)})
    array = arrays_of(path)["iq"]
    path.write_bytes(path.read_bytes()[:1000])
    with pytest.raises(FileError) as caught:
        array.column(array.real, 0, 0, 500)
    assert "ends" in caught.value.problem


def test_too_many_variables(tmp_path):
    whole = matrix("<", [1])
    path = tmp_path / "x.mat"
    cells = whole[128:].replace(struct.pack("<II", 6, 0), struct.pack("<II", 1, 0))
    path.write_bytes(whole[:128] + cells * 1001)
    with pytest.raises(FileError) as caught:
        arrays_of(path)
    assert "too many" in caught.value.problem


def test_a_part_that_reaches_into_the_next_matrix(tmp_path):
    whole = matrix("<", list(range(100)))
    path = tmp_path / "x.mat"
    shorter = struct.pack("<II", 14, len(whole) - 136 - 64)
    path.write_bytes(whole[:128] + shorter + whole[136:])
    with pytest.raises(FileError) as caught:
        arrays_of(path)
    assert "a part of 100 bytes" in caught.value.problem
