"""MAT files: what the library reads and writes, and files that are damaged or other things."""

import io
import pickle
import struct
import zlib
from fractions import Fraction

import numpy as np
import pytest
from scipy.io import loadmat, savemat

from wavegen.core.errors import FileError
from wavegen.files.datatypes import CF32_LE, RF32_LE
from wavegen.files.format import FileFacts, ReadHints
from wavegen.files.mat import MOST_SAMPLES, Mat
from wavegen.files.read import open_recording

RATE = Fraction(812_500, 3)


def saved(folder, *, name="x.mat", **variables):
    path = folder / name
    savemat(path, variables, do_compression=variables.pop("compressed", False))
    return path


def write(folder, *, n_channels=1, title="Träger"):
    path = folder / "x.mat"
    facts = FileFacts(
        sample_rate_hz=RATE, n_samples=9, datatype=CF32_LE, n_channels=n_channels, title=title
    )
    codes = np.arange(9 * facts.n_columns, dtype="<f4").reshape(9, -1)
    path.touch()
    writer = Mat().writer((path,), facts)
    writer.write(codes[:4])
    writer.write(codes[4:])
    writer.finish()
    writer.close()
    return path, codes


def test_real_samples_have_a_name_of_their_own(tmp_path):
    form, path = Mat(), tmp_path / "x.mat"
    facts = FileFacts(sample_rate_hz=RATE, n_samples=9, datatype=RF32_LE, title="real")
    codes = np.arange(9, dtype="<f4").reshape(9, 1)
    writer = form.writer((path,), facts)
    writer.write(codes)
    writer.finish()
    found = loadmat(path)
    assert "iq" not in found
    np.testing.assert_array_equal(found["samples"], codes)
    recording = open_recording(path)
    assert (recording.is_real, recording.sample_rate_hz) == (True, RATE)
    np.testing.assert_array_equal(recording.signal.compute(0, 9).real, codes[:, 0])


@pytest.mark.parametrize("n_channels", [1, 2])
def test_the_library_reads_what_is_written(tmp_path, n_channels):
    path, codes = write(tmp_path, n_channels=n_channels)
    found = loadmat(path)
    assert found["iq"].shape == (9, n_channels)
    assert found["iq"].dtype == np.complex64
    np.testing.assert_array_equal(found["iq"].reshape(-1), codes.view("c8").reshape(-1))
    assert found["sample_rate_hz"] == pytest.approx(float(RATE))
    assert found["title"] == ["Träger"]
    recording = open_recording(path, ReadHints(channel=0))
    assert recording.sample_rate_hz == RATE
    np.testing.assert_array_equal(recording.signal.codes(2, 7), codes[2:7, :2])


@pytest.mark.parametrize("compressed", [False, True])
@pytest.mark.parametrize("shape", [(-1, 1), (1, -1)])
@pytest.mark.parametrize("dtype", ["c8", "c16"])
def test_complex_vectors_by_others(tmp_path, compressed, shape, dtype):
    array = (np.arange(50) - 1j).astype(dtype)
    path = tmp_path / "x.mat"
    savemat(path, {"capture": array.reshape(shape), "fs": 5.0}, do_compression=compressed)
    recording = open_recording(path, ReadHints(sample_rate_hz=RATE))
    assert recording.n_samples == 50
    signal = pickle.loads(pickle.dumps(recording.signal))  # noqa: S301 (our own bytes)
    np.testing.assert_array_equal(signal.compute(3, 50), array[3:].astype("c8"))


@pytest.mark.parametrize(("dtype", "scale"), [("i1", 128), ("i2", 32768), ("f4", 1), ("f8", 1)])
def test_columns_and_real_vectors(tmp_path, dtype, scale):
    array = np.array([[1, -2], [64, 0], [-128, 127]], dtype)
    recording = open_recording(saved(tmp_path, iq=array, sample_rate_hz=1e6))
    wanted = (array[:, 0] + 1j * array[:, 1].astype(float)) / scale
    np.testing.assert_allclose(recording.signal.compute(0, 3), wanted, rtol=1e-7)
    real = open_recording(saved(tmp_path, iq=array[:, 0], sample_rate_hz=1e6))
    assert real.is_real
    np.testing.assert_allclose(real.signal.compute(0, 3).real, wanted.real, rtol=1e-7)


def test_the_vector_that_is_named(tmp_path):
    path = saved(tmp_path, before=np.ones(5), after=2 * np.ones(6) + 0j, name="y.mat")
    with pytest.raises(FileError) as caught:
        open_recording(path)
    assert "before, after" in caught.value.problem
    assert "--variable" in caught.value.remedy
    recording = open_recording(path, ReadHints(variable="after", sample_rate_hz=RATE))
    assert recording.n_samples == 6
    with pytest.raises(FileError) as caught:
        open_recording(path, ReadHints(variable="between"))
    assert "between" in caught.value.problem


def test_too_long_to_write():
    facts = FileFacts(sample_rate_hz=RATE, n_samples=MOST_SAMPLES + 1, datatype=CF32_LE)
    with pytest.raises(FileError) as caught:
        Mat().check(facts, "output.iq[0]")
    assert str(MOST_SAMPLES) in caught.value.allowed
    assert "sigmf" in caught.value.remedy


def header(version=b"MATLAB 5.0 MAT-file"):
    return version.ljust(124) + struct.pack("<H2s", 0x0100, b"IM")


def bomb():
    """A compressed element that says that it unpacks to 3 GB, in a few bytes."""
    packed = zlib.compress(struct.pack("<II", 14, 3_000_000_000) + bytes(1000))
    return header() + struct.pack("<II", 15, len(packed)) + packed


def lying():
    return header() + struct.pack("<II", 14, 1 << 31) + bytes(64)


def big():
    """Dimensions of 10^12 numbers over none."""
    flags = struct.pack("<IIII", 6, 8, 7, 0)
    sizes = struct.pack("<IIii", 5, 8, 1_000_000, 1_000_000)
    name = struct.pack("<HH4s", 1, 2, b"iq")
    body = flags + sizes + name + struct.pack("<II", 7, 0)
    return header() + struct.pack("<II", 14, len(body)) + body


HOSTILE = {
    "HDF5": (b"\x89HDF\r\n\x1a\n" + bytes(600), "7.3", "-v7"),
    "HDF5 behind text": (
        b"MATLAB 7.3 MAT-file".ljust(512) + b"\x89HDF\r\n\x1a\n" + bytes(100),
        "7.3",
        "-v7",
    ),
    "version 4": (struct.pack("<5i", 0, 3, 1, 0, 2) + b"x\0" + bytes(24), "version 5", "saved"),
    "a header alone": (header(), "holds none", "saved"),
    "half a header": (header()[:100], "version 5", "saved"),
    "a length that lies": (lying, "2147483648 bytes", "saved"),
    "a bomb": (bomb, "3000 MB", "SigMF"),
    "dimensions that lie": (big, "1000000 by 1000000", "saved"),
    "an element of another type": (header() + struct.pack("<II", 9, 8) + bytes(8), "type 9", ""),
    "no zlib": (header() + struct.pack("<II", 15, 64) + bytes(64), "unpacked", "saved"),
    "an empty zlib": (
        header() + struct.pack("<II", 15, 8) + zlib.compress(b""),
        "type 0",
        "saved",
    ),
    "bytes after the end": (None, "ends inside", "saved"),
}


@pytest.mark.parametrize("case", HOSTILE)
def test_files_that_are_refused(tmp_path, case):
    content, word, remedy = HOSTILE[case]
    if content is None:
        stream = io.BytesIO()
        savemat(stream, {"iq": np.ones(5) + 0j, "sample_rate_hz": 1.0})
        content = stream.getvalue() + bytes(5)
    elif callable(content):
        content = content()
    path = tmp_path / "x.mat"
    path.write_bytes(content)
    with pytest.raises(FileError) as caught:
        open_recording(path, ReadHints(sample_rate_hz=RATE))
    assert word in caught.value.problem
    assert remedy in caught.value.remedy
    assert caught.value.where == str(path)


@pytest.mark.parametrize(
    ("variables", "word"),
    [
        ({"text": "only words"}, "0 arrays"),
        ({"iq": np.array([[{"a": 1}]], object)}, "0 arrays"),
        ({"iq": np.ones((5, 3)), "sample_rate_hz": 1.0}, "5 by 3"),
        ({"iq": np.ones((5, 6)), "sample_rate_hz": 1.0}, "5 by 6"),
        ({"iq": np.ones(5, "u2"), "sample_rate_hz": 1.0}, "uint16"),
        ({"iq": np.ones(5) + 0j, "sample_rate_hz": -1.0}, "sample_rate_hz"),
        ({"iq": np.ones(5) + 0j, "sample_rate_hz": np.nan}, "sample_rate_hz"),
        ({"iq": np.ones(5) + 0j}, "sample rate"),
        ({"iq": np.zeros((0, 0))}, "0 arrays"),
        ({"iq": {"real": np.ones(5)}}, "0 arrays"),
    ],
)
def test_variables_that_are_no_samples(tmp_path, variables, word):
    with pytest.raises(FileError) as caught:
        open_recording(saved(tmp_path, **variables))
    assert word in caught.value.problem


@pytest.mark.parametrize("compressed", [False, True])
def test_files_changed_or_cut_anywhere_never_end_in_another_error(tmp_path, compressed):
    path = tmp_path / "x.mat"
    variables = {"iq": np.arange(5) + 1j, "sample_rate_hz": 1e6}
    savemat(path, variables, do_compression=compressed)
    whole = path.read_bytes()
    n_refused = 0
    changes = [whole[:end] for end in range(0, len(whole), 3)]
    changes += [
        whole[:place] + bytes([value]) + whole[place + 1 :]
        for place in range(116, len(whole))
        for value in (0, 14, 255)
    ]
    for content in changes:
        path.write_bytes(content)
        try:
            recording = open_recording(path)
            recording.signal.compute(0, recording.n_samples)
        except FileError:
            n_refused += 1
    assert n_refused > len(changes) // 3


def test_one_name_twice(tmp_path):
    stream = io.BytesIO()
    savemat(stream, {"iq": np.ones(5) + 0j})
    path = tmp_path / "x.mat"
    path.write_bytes(stream.getvalue() + stream.getvalue()[128:])
    with pytest.raises(FileError) as caught:
        open_recording(path, ReadHints(sample_rate_hz=RATE))
    assert "twice" in caught.value.problem
