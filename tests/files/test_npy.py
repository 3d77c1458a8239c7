"""NumPy arrays: what NumPy writes is read, and the other way round; headers from strangers."""

import io
import pickle
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.datatypes import CF32_LE, CI16_LE, RI16_LE
from wavegen.files.format import FileFacts, ReadHints
from wavegen.files.npy import Npy, header_bytes, read_header
from wavegen.files.read import open_recording

RATE = Fraction(1000)
HINTS = ReadHints(sample_rate_hz=RATE)


def saved(folder, array, version=None):
    path = folder / "x.npy"
    if version is None:
        np.save(path, array)
    else:
        with path.open("wb") as file:
            np.lib.format.write_array(file, array, version=version)
    return path


def header(text, *, version=(1, 0), data=bytes(80)):
    """Return a file with any header text."""
    content = text.encode()
    count = len(content).to_bytes(2 if version[0] == 1 else 4, "little")
    return b"\x93NUMPY" + bytes(version) + count + content + data


def written(folder, array, version=(1, 0), data=bytes(80)):
    path = folder / "x.npy"
    path.write_bytes(header(array, version=version, data=data))
    return path


@pytest.mark.parametrize(
    ("datatype", "n_channels", "dtype", "shape"),
    [
        (CF32_LE, 1, "complex64", (7,)),
        (CF32_LE, 2, "complex64", (7, 2)),
        (CI16_LE, 1, "int16", (7, 2)),
        (CI16_LE, 2, "int16", (7, 4)),
        (RI16_LE, 1, "int16", (7,)),
    ],
)
def test_numpy_reads_what_is_written(tmp_path, datatype, n_channels, dtype, shape):
    path = tmp_path / "x.npy"
    facts = FileFacts(sample_rate_hz=RATE, n_samples=7, datatype=datatype, n_channels=n_channels)
    rng = np.random.default_rng(1)
    codes = rng.integers(-99, 99, (7, facts.n_columns)).astype(datatype.dtype)
    writer = Npy().writer((path,), facts)
    writer.write(codes)
    writer.finish()
    array = np.load(path, allow_pickle=False)
    assert (array.dtype, array.shape) == (np.dtype(dtype), shape)
    wanted = codes.view(np.complex64) if datatype is CF32_LE else codes
    np.testing.assert_array_equal(array.reshape(wanted.shape), wanted)


@pytest.mark.parametrize("dtype", ["c8", "c16"])
@pytest.mark.parametrize("version", [(1, 0), (2, 0), (3, 0)])
def test_complex_arrays_of_every_version(tmp_path, dtype, version):
    array = (np.arange(9) + 1j).astype(dtype)
    recording = open_recording(saved(tmp_path, array, version), HINTS)
    np.testing.assert_array_equal(recording.signal.compute(0, 9), array.astype("c8"))


@pytest.mark.parametrize(
    ("dtype", "scale"),
    [("i1", 128), ("<i2", 2**15), (">i2", 2**15), ("<i4", 2**31), ("<f4", 1), ("<f8", 1)],
)
def test_columns_of_i_and_q(tmp_path, dtype, scale):
    array = np.array([[1, -2], [64, 0], [-128, 127]], dtype)
    recording = open_recording(saved(tmp_path, array), HINTS)
    wanted = (array[:, 0] + 1j * array[:, 1].astype(float)) / scale
    np.testing.assert_allclose(recording.signal.compute(0, 3), wanted, rtol=1e-7)
    assert not recording.is_real
    real = open_recording(saved(tmp_path, array[:, :1]), HINTS)
    assert real.is_real
    np.testing.assert_allclose(real.signal.compute(0, 3).real, wanted.real, rtol=1e-7)


def test_unsigned_bytes_are_pairs_only(tmp_path):
    array = np.array([[0, 255]], np.uint8)
    sample = open_recording(saved(tmp_path, array), HINTS).signal.compute(0, 1)
    np.testing.assert_allclose(sample, [-1 + 1j])
    with pytest.raises(FileError) as caught:
        open_recording(saved(tmp_path, array[0]), HINTS)
    assert "int16" in caught.value.remedy


def test_objects_are_never_unpacked(tmp_path):
    class Trap:
        def __reduce__(self):
            return (pytest.fail, ("a pickle was opened",))

    path = tmp_path / "x.npy"
    with path.open("wb") as file:
        np.save(file, np.array([Trap(), 1], object), allow_pickle=True)
    assert pickle.PROTO in path.read_bytes()
    with pytest.raises(FileError) as caught:
        open_recording(path, HINTS)
    assert "never unpacked" in caught.value.problem


@pytest.mark.parametrize(
    ("array", "word"),
    [
        (np.zeros(0, "c8"), "(0,)"),
        (np.zeros((), "c8"), "()"),
        (np.zeros((2, 3, 4), "c8"), "(2, 3, 4)"),
        (np.zeros((9, 3), "i2"), "(9, 3)"),
        (np.zeros((2, 900), "i2"), "(2, 900)"),
        (np.asfortranarray(np.zeros((9, 2), "i2")), "Fortran"),
        (np.zeros(9, ">c8"), ">c8"),
        (np.zeros(9, "u2"), "<u2"),
        (np.zeros(9, "?"), "|b1"),
        (np.zeros(9, "U3"), "<U3"),
        (np.zeros(9, [("i", "i2"), ("q", "i2")]), "records"),
    ],
)
def test_arrays_that_are_no_samples(tmp_path, array, word):
    with pytest.raises(FileError) as caught:
        open_recording(saved(tmp_path, array), HINTS)
    assert word in caught.value.problem
    assert caught.value.remedy


@pytest.mark.parametrize(
    ("text", "version"),
    [
        ("", (1, 0)),
        ("{}", (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False}", (1, 0)),
        ("{'descr': '<c8', 'fortran_order': 0, 'shape': (10,)}", (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (-10,)}", (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (1e9,)}", (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': ('a',)}", (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (10**9,)}", (1, 0)),
        ("{'descr': '<c8', 'shape': (1,), 'shape': (10,), 'fortran_order': False}", (1, 0)),
        ("__import__('os').system('true')", (1, 0)),
        ("{'descr': __import__('os'), 'fortran_order': False, 'shape': (10,)}", (1, 0)),
        ("(" * 3000, (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (10,)}", (4, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (10,)}", (1, 7)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (%s,)}" % ("9" * 25), (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (%s,)}" % ("9" * 18), (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (11,)}", (1, 0)),
        ("{'descr': '<c8', 'fortran_order': False, 'shape': (10,)}" + " " * 5000, (2, 0)),
    ],
)
def test_headers_from_strangers(tmp_path, text, version):
    path = written(tmp_path, text, version)
    with pytest.raises(FileError) as caught:
        open_recording(path, HINTS)
    assert caught.value.where == str(path)
    assert len(str(caught.value)) < 600


def test_a_header_cut_anywhere(tmp_path):
    path = saved(tmp_path, np.zeros(4, "c8"))
    whole = path.read_bytes()
    for end in range(6, len(whole)):
        path.write_bytes(whole[:end])
        with pytest.raises(FileError):
            open_recording(path, HINTS)


def test_bytes_after_the_end_are_told(tmp_path):
    path = saved(tmp_path, np.zeros(4, "c8"))
    path.write_bytes(path.read_bytes() + bytes(5))
    recording = open_recording(path, HINTS)
    assert recording.n_samples == 4
    assert "5 bytes" in recording.warnings[0]


def test_the_rate_must_be_told(tmp_path):
    with pytest.raises(FileError) as caught:
        open_recording(saved(tmp_path, np.zeros(4, "c8")))
    assert "--sample-rate" in caught.value.remedy


def test_the_header_says_what_numpy_says(tmp_path):
    facts = FileFacts(sample_rate_hz=RATE, n_samples=10**12, datatype=CF32_LE)
    content = header_bytes(facts)
    assert len(content) % 64 == 0
    path = tmp_path / "x.npy"
    path.write_bytes(content)
    theirs = np.lib.format
    stream = io.BytesIO(content)
    theirs.read_magic(stream)
    shape, order, dtype = theirs.read_array_header_1_0(stream)
    ours = read_header(path)
    assert (ours.shape, ours.fortran_order, ours.data_start) == (shape, order, stream.tell())
    assert np.dtype(ours.descr) == dtype
