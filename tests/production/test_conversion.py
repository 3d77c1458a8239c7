from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError, FileError
from wavegen.files import FORMATS
from wavegen.files.datatypes import CF32_LE
from wavegen.files.format import ReadHints
from wavegen.files.mat import Mat
from wavegen.files.read import open_recording
from wavegen.production.conversion import (
    Conversion,
    check_conversion,
    datatype_of,
    format_named,
)

CENTRE = Fraction(1000)


def chosen(tmp_path, stored, form, **wanted):
    """Return the datatype for a raw file of another."""
    path = tmp_path / f"x.{stored}"
    np.zeros(32, "u1").tofile(path)
    recording = open_recording(path, ReadHints(sample_rate_hz=Fraction(8000)))
    asked = Conversion(format=form, **wanted)
    return datatype_of(format_named(form), asked, recording).name


@pytest.mark.parametrize(
    ("stored", "form", "wanted", "expected"),
    [
        ("cf32_le", "wav", {}, "cf32_le"),
        ("ci8", "wav", {}, "ci16_le"),
        ("ri16_le", "wav", {}, "ri16_le"),
        ("ri16_le", "mat", {}, "rf32_le"),
        ("ri16_be", "sigmf", {}, "ri16_be"),
        ("ci16_be", "raw", {"real_centre_hz": CENTRE}, "ri16_be"),
        ("ri16_be", "npy", {}, "rf32_le"),
        ("ri16_le", "sigmf", {"datatype": "cf32_le"}, "cf32_le"),
        ("cf32_le", "wav", {"real_centre_hz": CENTRE}, "rf32_le"),
        ("ci16_le", "npy", {"real_centre_hz": CENTRE}, "ri16_le"),
        ("cu8", "sigmf", {"real_centre_hz": CENTRE}, "ri16_le"),
        ("cf32_le", "wav", {"real_centre_hz": CENTRE, "datatype": "ri16_le"}, "ri16_le"),
    ],
)
def test_the_datatype(tmp_path, stored, form, wanted, expected):
    assert chosen(tmp_path, stored, form, **wanted) == expected


def test_real_samples_need_a_real_datatype(tmp_path):
    with pytest.raises(ArgumentsError, match="I and Q") as caught:
        chosen(tmp_path, "ci8", "wav", datatype="cf32_le", real_centre_hz=CENTRE)
    assert "ri16_le" in caught.value.allowed
    with pytest.raises(FileError):
        chosen(tmp_path, "ci8", "wav", datatype="ci8")


def test_every_format_writes_real_samples():
    for name in FORMATS:
        assert any(one.is_real for one in format_named(name).datatypes.values()), name


def test_a_format_without_real_samples(tmp_path, monkeypatch):
    monkeypatch.setattr(Mat, "datatypes", {"cf32_le": CF32_LE})
    with pytest.raises(ArgumentsError, match="does not write real samples") as caught:
        chosen(tmp_path, "cf32_le", "mat", real_centre_hz=CENTRE)
    assert (caught.value.where, "wav" in caught.value.allowed) == ("--to", True)
    assert chosen(tmp_path, "ri16_le", "mat") == "cf32_le"


@pytest.mark.parametrize("level", [0.1, float("nan"), float("-inf"), -301.0])
def test_levels_that_mean_nothing(level):
    with pytest.raises(ArgumentsError) as caught:
        check_conversion(Conversion(format="wav", peak_dbfs=level))
    assert caught.value.where == "--peak"
    with pytest.raises(ArgumentsError) as caught:
        check_conversion(Conversion(format="wav", gain_db=level * 4000))
    assert caught.value.where == "--gain"
    check_conversion(Conversion(format="wav", peak_dbfs=-300.0, gain_db=300.0))


def test_a_format_by_its_name():
    assert format_named("wav").name == "wav"
    with pytest.raises(ArgumentsError, match="Did you mean wav"):
        format_named("wavv")
