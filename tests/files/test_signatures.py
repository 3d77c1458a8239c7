import gzip
import io
import tarfile
import zipfile

import numpy as np
import pytest

from wavegen.files.signatures import is_text, signature_of


def archive_heads():
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as file:
        file.writestr("a.sigmf-data", bytes(100))
    tape = io.BytesIO()
    with tarfile.open(fileobj=tape, mode="w") as file:
        file.addfile(tarfile.TarInfo("a.sigmf-data"))
    array = io.BytesIO()
    np.save(array, np.zeros(3))
    return [
        (packed.getvalue(), "zip"),
        (tape.getvalue(), "tar"),
        (gzip.compress(bytes(100), mtime=0), "gzip"),
        (array.getvalue(), "NumPy"),
    ]


@pytest.mark.parametrize(("head", "word"), archive_heads())
def test_archives_of_this_machines_making_are_known(head, word):
    assert word in signature_of(head[:4096]).what


def test_samples_are_not_taken_for_anything():
    rng = np.random.default_rng(2)
    for _ in range(50):
        noise = np.rint(rng.standard_normal(2048) * 3000).astype("<i2").tobytes()
        assert signature_of(noise) is None
        assert not is_text(noise)
    assert signature_of(b"") is None
    assert signature_of(bytes(4096)) is None
    assert not is_text(bytes(4096))


@pytest.mark.parametrize(
    "text", ["plain text, long enough", "Prüfsignal für den Verstärker\r\n", '{"a": "some JSON"}\n']
)
def test_text_is_known(text):
    assert is_text(text.encode())
    assert is_text(("x" + text * 400).encode()[:4096])  # cut inside a character


def test_a_byte_that_is_no_text_inside():
    assert not is_text(b"plain text, long \xff enough to tell")
    assert not is_text(b"plain text, long \x00 enough to tell")
