import struct

import pytest

from wavegen.core.errors import FileError
from wavegen.files.riff import is_wave, walk


def chunk(name, content, *, length=None):
    stated = len(content) if length is None else length
    return name + struct.pack("<I", stated) + content + b"\0" * (len(content) % 2)


FMT = chunk(b"fmt ", struct.pack("<HHIIHH", 1, 2, 48_000, 192_000, 4, 16))


def wave(*chunks, length=None, kind=b"RIFF"):
    body = b"WAVE" + b"".join(chunks)
    return kind + struct.pack("<I", len(body) if length is None else length) + body


def test_chunks_with_padding(tmp_path):
    path = tmp_path / "x.wav"
    path.write_bytes(wave(FMT, chunk(b"note", b"odd"), chunk(b"data", bytes(8))) + b"tail")
    found = walk(path)
    assert [(item.name, item.size) for item in found.chunks] == [
        ("fmt ", 16),
        ("note", 3),
        ("data", 8),
    ]
    assert found.find("data").offset == 12 + 24 + 12 + 8
    assert found.find("PEAK") is None
    assert found.n_trailing == 4
    assert not found.is_rf64


def test_long_lengths(tmp_path):
    data = chunk(b"data", bytes(8), length=0xFFFFFFFF)
    total = 4 + 36 + len(FMT) + len(data)
    sizes = chunk(b"ds64", struct.pack("<QQQI", total, 8, 2, 0))
    path = tmp_path / "x.wav"
    path.write_bytes(wave(sizes, FMT, data, length=0xFFFFFFFF, kind=b"RF64"))
    found = walk(path)
    assert found.is_rf64
    assert found.find("data").size == 8
    assert found.n_trailing == 0


WHOLE = wave(FMT, chunk(b"data", bytes(8)))


@pytest.mark.parametrize(
    ("content", "word"),
    [
        (b"", "start"),
        (b"RIFF\x04\x00\x00\x00AVI ", "start"),
        (WHOLE[:20], "header states"),
        (WHOLE[:-1], "header states"),
        (wave(FMT, chunk(b"data", bytes(8)), length=0xFFFFFFFF), "header states"),
        (wave(FMT, chunk(b"data", bytes(8), length=9000)), "9000"),
        (wave(FMT, chunk(b"data", bytes(8), length=0xFFFFFFFF)), "4294967295"),
        (wave(FMT), "data"),
        (wave(chunk(b"data", bytes(8))), "fmt"),
        (wave(FMT, chunk(b"data", bytes(8)), kind=b"RF64"), "ds64"),
        (wave(chunk(b"ds64", bytes(8)), FMT, chunk(b"data", bytes(8)), kind=b"RF64"), "ds64"),
        (wave(*[chunk(b"junk", b"")] * 1001), "too many"),
    ],
    ids=range(12),
)
def test_lengths_that_lie_and_chunks_that_are_missing(tmp_path, content, word):
    path = tmp_path / "x.wav"
    path.write_bytes(content)
    with pytest.raises(FileError) as caught:
        walk(path)
    assert caught.value.where == str(path)
    assert word in caught.value.problem


def test_first_bytes():
    assert is_wave(WHOLE)
    assert not is_wave(b"RIFF")
