from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.format import ReadHints
from wavegen.files.raw import Raw

RATE = Fraction(20_000_000)


def test_ending_or_hint_names_the_datatype(tmp_path):
    codes = np.array([[1, -2], [300, -400]])
    for name, rail in (("ci16_le", "<i2"), ("ci16_be", ">i2"), ("ci32_le", "<i4")):
        for path, hint in ((tmp_path / f"x.{name}", None), (tmp_path / f"{name}.iq", name)):
            codes.astype(rail).tofile(path)
            recording = Raw().read(path, ReadHints(datatype=hint, sample_rate_hz=RATE))
            np.testing.assert_array_equal(recording.signal.codes(0, 2), codes)
            assert recording.datatype.name == name


def test_a_hint_outranks_the_ending(tmp_path):
    path = tmp_path / "x.ci16_le"
    path.write_bytes(bytes([127, 128, 255, 0]))
    recording = Raw().read(path, ReadHints(datatype="cu8", sample_rate_hz=RATE))
    np.testing.assert_allclose(
        recording.signal.compute(0, 2), [(-0.5 + 0.5j) / 127.5, 1 - 1j], rtol=1e-6
    )


def test_hints_are_carried(tmp_path):
    path = tmp_path / "x.ci16_le"
    np.array([[2048, 0]], "<i2").tofile(path)
    hints = ReadHints(sample_rate_hz=RATE, full_scale=2048, reference_level_dbm=-10)
    recording = Raw().read(path, hints)
    assert recording.signal.compute(0, 1)[0] == 1
    assert recording.reference_level_dbm == -10


def test_what_looks_like_another_kind_is_read_if_told_with_a_warning(tmp_path):
    path = tmp_path / "x.bin"
    path.write_bytes(b"RIFF\x24\x00\x00\x00WAVEfmt ")
    recording = Raw().read(path, ReadHints(datatype="ci16_le", sample_rate_hz=RATE))
    assert "WAV" in recording.warnings[0]
    assert not Raw().detect(tmp_path / "x.ci16_le", path.read_bytes())


def test_missing_facts(tmp_path):
    path = tmp_path / "x.iq"
    path.write_bytes(bytes(16))
    with pytest.raises(FileError) as caught:
        Raw().read(path, ReadHints(sample_rate_hz=RATE))
    assert "--format ci16_le" in caught.value.remedy
    with pytest.raises(FileError) as caught:
        Raw().read(path, ReadHints(datatype="ci16_le"))
    assert "--sample-rate" in caught.value.remedy
    with pytest.raises(FileError) as caught:
        Raw().read(path, ReadHints(datatype="ci24_le", sample_rate_hz=RATE))
    assert "ci24_le" in caught.value.problem
