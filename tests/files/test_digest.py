import hashlib
from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.digest import sha512_of, verify_hash
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording


def test_digest_of_more_than_one_block(tmp_path):
    content = np.random.default_rng(1).bytes((1 << 20) * 2 + 17)
    (tmp_path / "x").write_bytes(content)
    heard = []
    digest = sha512_of(tmp_path / "x", lambda *heard_now: heard.append(heard_now))
    assert digest == hashlib.sha512(content).hexdigest()
    assert heard[-1] == ("hashing", len(content), len(content))


def test_claims_are_checked(tmp_path):
    path = tmp_path / "x.ci16_le"
    path.write_bytes(bytes(400))
    recording = open_recording(path, ReadHints(sample_rate_hz=Fraction(1000)))
    assert verify_hash(recording) is False  # nothing is claimed
    claimed = replace(recording, sha512=hashlib.sha512(bytes(400)).hexdigest().upper())
    assert verify_hash(claimed) is True
    path.write_bytes(bytes(399) + b"\1")
    with pytest.raises(FileError) as caught:
        verify_hash(claimed)
    assert caught.value.where == str(path)


def test_a_part_of_a_file(tmp_path):
    content = np.random.default_rng(1).bytes((1 << 20) + 300)
    (tmp_path / "x").write_bytes(content)
    digest = sha512_of(tmp_path / "x", start=100, n_bytes=1 << 20)
    assert digest == hashlib.sha512(content[100 : 100 + (1 << 20)]).hexdigest()
    with pytest.raises(FileError):
        sha512_of(tmp_path / "x", start=300, n_bytes=1 << 21)
