import struct
import time
from fractions import Fraction

import numpy as np
import pytest
import soundfile

from wavegen.core.errors import FileError
from wavegen.files.datatypes import CF32_LE, CI16_LE, CI24_LE, RI16_LE
from wavegen.files.digest import sha512_of
from wavegen.files.format import FileFacts, ReadHints
from wavegen.files.riff import walk
from wavegen.files.wav import Wav

RATE = Fraction(48_000)


def write(path, codes, datatype, *, rate=RATE, form=None, title=""):
    facts = FileFacts(sample_rate_hz=rate, n_samples=len(codes), datatype=datatype, title=title)
    writer = (form or Wav()).writer((path,), facts)
    writer.write(codes)
    writer.finish()
    return writer


@pytest.mark.parametrize(
    ("datatype", "subtype", "held"),
    [(CI16_LE, "PCM_16", "int16"), (CI24_LE, "PCM_24", "int32"), (CF32_LE, "FLOAT", "float32")],
)
def test_another_reader_finds_i_left_and_q_right(tmp_path, datatype, subtype, held):
    path = tmp_path / "x.wav"
    codes = np.array([[1, -2], [30, -40], [100, 127]]).astype(datatype.dtype)
    write(path, codes, datatype)
    info = soundfile.info(path)
    assert (info.format, info.subtype, info.channels, info.samplerate) == (
        "WAV",
        subtype,
        2,
        48_000,
    )
    read, _ = soundfile.read(path, dtype=held)
    np.testing.assert_array_equal(read // 256 if datatype is CI24_LE else read, codes)


def test_packed_bytes_of_24_bits(tmp_path):
    path = tmp_path / "x.wav"
    write(path, np.array([[1, -1], [0x123456, -(2**23)]], np.int32), CI24_LE)
    data = walk(path).find("data")
    content = path.read_bytes()[data.offset : data.offset + data.size]
    assert content.hex(" ") == "01 00 00 ff ff ff 56 34 12 00 00 80"


def test_floats_above_full_scale_are_not_clipped(tmp_path):
    path = tmp_path / "x.wav"
    codes = np.array([[3.5, -4.25], [1e-30, 0]], np.float32)
    write(path, codes, CF32_LE)
    np.testing.assert_array_equal(Wav().read(path, ReadHints()).signal.codes(0, 2), codes)


@pytest.mark.parametrize("datatype", [CI16_LE, CI24_LE, CF32_LE], ids=lambda item: item.name)
def test_long_files_become_rf64(tmp_path, datatype):
    codes = np.arange(2000).reshape(-1, 2).astype(datatype.dtype)
    limit = 1000 * datatype.bytes_per_sample
    for above, kind in ((False, b"RIFF"), (True, b"RF64")):
        path = tmp_path / f"{kind.decode()}.wav"
        write(path, codes, datatype, form=Wav(riff_limit_bytes=limit - above))
        assert path.read_bytes()[:4] == kind
        recording = Wav().read(path, ReadHints())
        np.testing.assert_array_equal(recording.signal.codes(0, 1000), codes)


@pytest.mark.parametrize(
    ("n_samples", "kind"),
    [(2**30 - 2**14, b"RIFF"), (2**30 - 2**14 + 1, b"RF64"), (2**31, b"RF64")],
)
def test_the_switch_comes_before_32_bit_lengths_overflow(tmp_path, n_samples, kind):
    facts = FileFacts(sample_rate_hz=RATE, n_samples=n_samples, datatype=CI16_LE)
    writer = Wav().writer((tmp_path / "x.wav",), facts)  # 4 bytes a sample: 4 GiB is 2^30
    writer.close()
    assert (tmp_path / "x.wav").read_bytes()[:4] == kind


def test_same_samples_same_bytes_at_any_time(tmp_path):
    codes = np.ones((10, 2), np.float32)
    first = write(tmp_path / "a.wav", codes, CF32_LE)
    start = int(time.time())
    while int(time.time()) == start:  # the library writes whole seconds into the file
        time.sleep(0.02)
    second = write(tmp_path / "b.wav", codes, CF32_LE)
    assert first.sha512 == second.sha512 == sha512_of(tmp_path / "b.wav")


@pytest.mark.parametrize(
    ("rate", "datatype", "fits"),
    [
        (Fraction(812_500, 3), CI16_LE, False),
        (Fraction(1), CI16_LE, True),
        (Fraction(2**30 - 1), CI16_LE, True),
        (Fraction(2**30), CI16_LE, False),  # the header's bytes per second would overflow
        (Fraction(2**29 - 1), CF32_LE, True),
        (Fraction(2**29), CF32_LE, False),
        (Fraction(2**32), CI16_LE, False),
    ],
)
def test_rates_that_the_header_holds(tmp_path, rate, datatype, fits):
    path = tmp_path / "x.wav"
    codes = np.zeros((3, 2), datatype.dtype)
    if fits:
        write(path, codes, datatype, rate=rate)
        assert Wav().read(path, ReadHints()).sample_rate_hz == rate
        return
    with pytest.raises(FileError) as caught:
        write(path, codes, datatype, rate=rate)
    assert f"{rate} Hz" in caught.value.problem
    assert "whole Hz" in caught.value.allowed
    assert not path.exists()


def test_titles_are_kept_and_never_too_long(tmp_path):
    write(tmp_path / "a.wav", np.zeros((1, 2), "<i2"), CI16_LE, title="Träger")
    write(tmp_path / "b.wav", np.zeros((1, 2), "<i2"), CI16_LE, title="x" * 20_000)
    assert Wav().read(tmp_path / "a.wav", ReadHints()).title == "Träger"
    assert set(Wav().read(tmp_path / "b.wav", ReadHints()).title) == {"x"}


@pytest.mark.parametrize(
    ("subtype", "held", "value", "name"),
    [("PCM_32", "int32", 2**30, "ci32_le"), ("DOUBLE", "float64", 0.5, "cf64_le")],
)
def test_other_codings_are_read(tmp_path, subtype, held, value, name):
    path = tmp_path / "x.wav"
    soundfile.write(path, np.array([[value, -value]], held), 48_000, subtype=subtype)
    recording = Wav().read(path, ReadHints())
    assert recording.datatype.name == name
    assert recording.signal.compute(0, 1)[0] == 0.5 - 0.5j


def test_bytes_after_the_end_are_told(tmp_path):
    path = tmp_path / "x.wav"
    write(path, np.zeros((4, 2), "<i2"), CI16_LE)
    path.write_bytes(path.read_bytes() + bytes(10))
    recording = Wav().read(path, ReadHints())
    assert recording.n_samples == 4
    assert "10 bytes" in recording.warnings[0]


def test_a_file_that_shrinks_or_goes_while_in_use(tmp_path):
    path = tmp_path / "x.wav"
    write(path, np.zeros((100, 2), "<i2"), CI16_LE)
    signal = Wav().read(path, ReadHints()).signal
    write(path, np.zeros((50, 2), "<i2"), CI16_LE)
    with pytest.raises(FileError) as caught:
        signal.compute(10, 90)
    assert "50" in caught.value.problem
    path.write_bytes(b"RIFF" + struct.pack("<I", 4) + b"WAVE")
    with pytest.raises(FileError) as caught:
        signal.compute(0, 1)
    assert "decoded" in caught.value.problem
    path.unlink()
    with pytest.raises(FileError) as caught:
        signal.compute(0, 1)
    assert caught.value.where == str(path)


def test_another_full_scale(tmp_path):
    path = tmp_path / "x.wav"
    write(path, np.array([[2048, -1024]], "<i2"), CI16_LE)
    signal = Wav().read(path, ReadHints(full_scale=2048)).signal
    assert signal.compute(0, 1)[0] == 1 - 0.5j


def test_reading_beyond_4_gib(tmp_path):
    """A sparse RF64 file of 5 GiB: only its last samples take room on the disk."""
    path = tmp_path / "x.wav"
    n_samples = 5 * 2**28
    facts = FileFacts(sample_rate_hz=RATE, n_samples=n_samples, datatype=CI16_LE)
    writer = Wav().writer((path,), facts)
    writer.close()
    head = bytearray(path.read_bytes())  # complete but for the lengths in ds64
    struct.pack_into("<QQQ", head, 20, len(head) - 8 + 4 * n_samples, 4 * n_samples, n_samples)
    with path.open("wb") as file:
        file.write(head)
        file.seek(4 * (n_samples - 2), 1)
        file.write(struct.pack("<4h", 1, 2, 3, 4))
    recording = Wav().read(path, ReadHints())
    assert recording.n_samples == n_samples
    codes = recording.signal.codes(n_samples - 3, n_samples)
    np.testing.assert_array_equal(codes, [[0, 0], [1, 2], [3, 4]])


def test_one_channel_is_a_real_signal(tmp_path):
    path = tmp_path / "x.wav"
    tone = np.cos(2 * np.pi * 0.1 * np.arange(4000))
    soundfile.write(path, np.rint(tone * 16384).astype(np.int16), 48_000)
    recording = Wav().read(path, ReadHints())
    assert (recording.is_real, recording.datatype.name) == (True, "ri16_le")
    envelope = np.abs(recording.signal.compute(0, 4000)[400:-400])
    np.testing.assert_allclose(envelope, 0.5, atol=1 / 32768)  # half a code, and its quadrature


def test_another_reader_finds_a_real_file_and_two_channels(tmp_path):
    path = tmp_path / "x.wav"
    codes = np.array([[1], [-2], [300]], "<i2")
    write(path, codes, RI16_LE)
    read, _ = soundfile.read(path, dtype="int16", always_2d=True)
    np.testing.assert_array_equal(read, codes)
    both = np.arange(12, dtype="<i2").reshape(3, 4)
    facts = FileFacts(sample_rate_hz=RATE, n_samples=3, datatype=CI16_LE, n_channels=2)
    writer = Wav().writer((path,), facts)
    writer.write(both)
    writer.finish()
    read, _ = soundfile.read(path, dtype="int16")
    np.testing.assert_array_equal(read, both)
