from fractions import Fraction
from pathlib import Path

import pytest

from wavegen.core.errors import FileError
from wavegen.files.datatypes import CI8, CI16_LE, RI16_LE
from wavegen.files.format import (
    FileFacts,
    ReadHints,
    distinct_stems,
    pick_datatype,
    refuse_other_datatype,
    refuse_real_pair,
    told_channel,
    told_rate,
)
from wavegen.files.raw import Raw
from wavegen.files.sigmf import Sigmf
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


@pytest.mark.parametrize(
    ("bits", "align", "label"),
    [
        (None, None, "ci16_le"),
        (16, None, "ci16_le"),
        (16, "left", "ci16_le"),
        (12, "left", "ci16_le_12bit_left"),
        (14, "right", "ci16_le_14bit_right"),
    ],
)
def test_words_by_bits_and_alignment(bits, align, label):
    assert pick_datatype(Raw(), "ci16_le", "x", bits=bits, align=align).label == label


@pytest.mark.parametrize(
    ("datatype", "bits", "align", "word"),
    [
        ("ci8", 12, "left", "ci8"),
        ("cf32_le", 12, "left", "cf32_le"),
        ("ci16_le", 13, "left", "13 bits"),
        ("ci16_le", None, "left", "without bits"),
        ("ci16_le", 12, None, "missing"),
        ("ci16_le", 12, "centre", "'centre'"),
        ("ci16_le", 16, "centre", "'centre'"),
    ],
)
def test_words_that_are_not_stated_in_full(datatype, bits, align, word):
    with pytest.raises(FileError) as caught:
        pick_datatype(Raw(), datatype, "output.iq[0]", bits=bits, align=align)
    assert caught.value.where == "output.iq[0]"
    assert word in caught.value.problem


def test_which_channel_is_meant():
    assert told_channel(PATH, n_channels=1, hints=ReadHints()) == 0
    assert told_channel(PATH, n_channels=1, hints=ReadHints(channel=0)) == 0
    assert told_channel(PATH, n_channels=2, hints=ReadHints(channel=1)) == 1
    for n_channels, channel in ((1, 1), (2, None), (2, 2), (2, -1)):
        with pytest.raises(FileError) as caught:
            told_channel(PATH, n_channels=n_channels, hints=ReadHints(channel=channel))
        assert f"{n_channels} channel" in caught.value.problem
        assert "--channel" in caught.value.remedy


def test_outputs_of_one_recipe_share_no_file():
    pair, raw, wav = Sigmf(), Raw(), Wav()
    left = pick_datatype(raw, "ci16_le", "x", bits=12, align="left")
    wanted = [
        (pair, CI16_LE, None),
        (pair, CI8, None),
        (raw, CI16_LE, None),
        (raw, left, None),
        (wav, CI16_LE, None),
        (wav, CI16_LE, "Run.ci24_le"),
        (wav, wav.datatypes["int24"], None),
    ]
    stems = distinct_stems("run", wanted)
    assert stems == [
        "run",
        "run.ci8",
        "run",
        "run.ci16_le_12bit_left",
        "run",
        "Run.ci24_le",
        "run.ci24_le",  # collides with the name that the recipe gives: refused when written
    ]
    # a name that the recipe gives is not taken by another file, whatever the order
    assert distinct_stems("run", [(pair, CI8, None), (pair, CI16_LE, "run")]) == ["run.ci8", "run"]


def test_two_real_channels_beside_each_other():
    facts = FileFacts(sample_rate_hz=Fraction(1), n_samples=2, datatype=RI16_LE, n_channels=2)
    assert facts.n_columns == 2
    with pytest.raises(FileError) as caught:
        refuse_real_pair(facts, "output")
    assert "I and Q" in caught.value.problem
