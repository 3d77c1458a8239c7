from fractions import Fraction
from pathlib import Path

import pytest

from wavegen.core.errors import FileError
from wavegen.files.datatypes import CI8, CI16_LE
from wavegen.files.format import ReadHints, pick_datatype, refuse_other_datatype, told_rate
from wavegen.files.raw import Raw
from wavegen.files.wav import Wav

PATH = Path("run.wav")


def test_default_and_aliases():
    assert pick_datatype(Raw(), None, "x") is CI16_LE
    assert pick_datatype(Wav(), "int16", "x") is CI16_LE
    assert pick_datatype(Raw(), "ci8", "x") is CI8


def test_a_misspelt_datatype_is_guessed():
    with pytest.raises(FileError) as caught:
        pick_datatype(Wav(), "float23", "output.iq[1].datatype")
    assert "float32" in caught.value.remedy


def test_the_told_rate_wins_with_a_warning():
    stated, asked = Fraction(48_000), Fraction(96_000)
    assert told_rate(PATH, stated_hz=stated, hints=ReadHints()) == (stated, ())
    assert told_rate(PATH, stated_hz=stated, hints=ReadHints(sample_rate_hz=stated)) == (stated, ())
    assert told_rate(PATH, stated_hz=None, hints=ReadHints(sample_rate_hz=asked)) == (asked, ())
    rate, warnings = told_rate(PATH, stated_hz=stated, hints=ReadHints(sample_rate_hz=asked))
    assert rate == asked
    assert "48 kHz" in warnings[0]
    assert "96 kHz" in warnings[0]


def test_no_rate_at_all():
    with pytest.raises(FileError) as caught:
        told_rate(PATH, stated_hz=None, hints=ReadHints())
    assert "--sample-rate" in caught.value.remedy


def test_a_contradiction_of_datatypes():
    refuse_other_datatype(PATH, CI8, ReadHints())
    refuse_other_datatype(PATH, CI8, ReadHints(datatype="ci8"))
    with pytest.raises(FileError) as caught:
        refuse_other_datatype(PATH, CI8, ReadHints(datatype="cu8"))
    assert "ci8" in caught.value.problem
    assert "cu8" in caught.value.problem
