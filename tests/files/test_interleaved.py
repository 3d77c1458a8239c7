import hashlib
import pickle
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.datatypes import CF32_LE, CI16_BE, CI16_LE
from wavegen.files.interleaved import InterleavedWriter, open_interleaved

RATE = Fraction(1000)


def open_it(path, datatype=CI16_LE, full_scale=None):
    return open_interleaved(path, datatype=datatype, sample_rate_hz=RATE, full_scale=full_scale)


def test_ranges_of_a_file(tmp_path):
    codes = np.arange(2000, dtype="<i2").reshape(-1, 2)
    codes.tofile(tmp_path / "x")
    signal = open_it(tmp_path / "x")
    assert (signal.n_samples, signal.sample_rate_hz, signal.mean_power) == (1000, RATE, None)
    whole = signal.compute(0, 1000)
    for start, stop in ((0, 1), (999, 1000), (13, 700)):
        np.testing.assert_array_equal(signal.compute(start, stop), whole[start:stop])
        np.testing.assert_array_equal(signal.codes(start, stop), codes[start:stop])


def test_another_full_scale(tmp_path):
    np.array([[2048, -1024]], "<i2").tofile(tmp_path / "x")
    assert open_it(tmp_path / "x", full_scale=2048).compute(0, 1)[0] == 1 - 0.5j
    np.array([[32768, -16384]], "<f4").tofile(tmp_path / "y")
    assert open_it(tmp_path / "y", CF32_LE, full_scale=32768).compute(0, 1)[0] == 1 - 0.5j


def test_signal_travels_to_a_worker_small(tmp_path):
    np.zeros((100_000, 2), "<i2").tofile(tmp_path / "x")
    packed = pickle.dumps(open_it(tmp_path / "x"))
    assert len(packed) < 2000
    assert pickle.loads(packed).compute(5, 7).tolist() == [0, 0]  # noqa: S301 (our own bytes)


def test_a_file_that_shrinks_or_goes_while_in_use(tmp_path):
    path = tmp_path / "x"
    np.zeros((100, 2), "<i2").tofile(path)
    signal = open_it(path)
    path.write_bytes(bytes(200))
    with pytest.raises(FileError) as caught:
        signal.compute(10, 90)
    assert "50" in caught.value.problem
    assert "100" in caught.value.allowed
    path.unlink()
    with pytest.raises(FileError) as caught:
        signal.compute(0, 1)
    assert caught.value.where == str(path)


def test_writer_hashes_what_it_writes(tmp_path):
    path = tmp_path / "x"
    codes = np.arange(40, dtype="<i2").reshape(-1, 2)
    writer = InterleavedWriter(path, datatype=CI16_BE, n_samples=20)
    writer.write(codes[:7])
    writer.write(codes[7:7])
    writer.write(np.asfortranarray(codes[7:]))  # any order, any byte order
    assert writer.complete() == hashlib.sha512(path.read_bytes()).hexdigest()
    assert path.read_bytes() == codes.astype(">i2").tobytes()


@pytest.mark.parametrize(("announced", "word"), [(19, "19"), (21, "21")])
def test_writer_holds_the_caller_to_the_number_announced(tmp_path, announced, word):
    writer = InterleavedWriter(tmp_path / "x", datatype=CI16_LE, n_samples=announced)
    with pytest.raises(FileError) as caught:  # noqa: PT012 (more is seen at write, less at the end)
        writer.write(np.zeros((20, 2), "<i2"))
        writer.complete()
    writer.close()
    assert "20" in caught.value.problem
    assert word in caught.value.allowed


def test_writer_refuses_another_shape(tmp_path):
    writer = InterleavedWriter(tmp_path / "x", datatype=CI16_LE, n_samples=4)
    with pytest.raises(FileError) as caught:
        writer.write(np.zeros(8, "<i2"))
    writer.close()
    assert "(8,)" in caught.value.problem


def test_reading_beyond_4_gib(tmp_path):
    """A sparse file of 5 GiB: only its last samples take room on the disk."""
    with (tmp_path / "x").open("wb") as file:
        file.seek(5 * 2**30 - 8)
        file.write(np.array([1, 2, 3, 4], "<i2").tobytes())
    signal = open_it(tmp_path / "x")
    assert signal.n_samples == 5 * 2**28
    codes = signal.codes(signal.n_samples - 3, signal.n_samples)
    np.testing.assert_array_equal(codes, [[0, 0], [1, 2], [3, 4]])
