"""I and Q in text, by this program and by others."""

from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.csv_iq import CsvIq
from wavegen.files.datatypes import CF32_LE, CI16_LE
from wavegen.files.format import FileFacts, ReadHints
from wavegen.files.read import open_recording

RATE = Fraction(1_000_000)
HINTS = ReadHints(sample_rate_hz=RATE)


def opened(folder, text, hints=HINTS, name="x.csv"):
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return open_recording(path, hints)


def test_what_a_file_looks_like(tmp_path):
    path = tmp_path / "x.csv"
    facts = FileFacts(
        sample_rate_hz=Fraction(812_500, 3), n_samples=2, datatype=CI16_LE, title="Two\nlines"
    )
    writer = CsvIq().writer((path,), facts)
    writer.write(np.array([[1, -2], [32767, -32768]], "<i2"))
    writer.finish()
    assert path.read_text(encoding="utf-8").splitlines() == [
        "# sample_rate_hz: 812500/3",
        "# datatype: ci16_le",
        "# full_scale: 32768",
        "# title: Two lines",
        "# generator: wavegen",
        "I,Q",
        "1,-2",
        "32767,-32768",
    ]
    recording = open_recording(path)
    assert (recording.sample_rate_hz, recording.title) == (Fraction(812_500, 3), "Two lines")


def test_nine_digits_give_every_float(tmp_path):
    path = tmp_path / "x.csv"
    rng = np.random.default_rng(4)
    codes = rng.integers(0, 2**32, (4000, 2), np.uint32).view("<f4")
    codes = np.where(np.isfinite(codes), codes, np.float32(1))
    writer = CsvIq().writer(
        (path,), FileFacts(sample_rate_hz=RATE, n_samples=4000, datatype=CF32_LE)
    )
    writer.write(codes)
    writer.finish()
    np.testing.assert_array_equal(open_recording(path).signal.codes(0, 4000), codes)


@pytest.mark.parametrize(
    "text",
    [
        "I,Q\n0.5,-0.25\n",
        "0.5,-0.25\n",
        "Q,I\n-0.25,0.5\n",
        "real;imag\n0,5;-0,25\n",
        "Re\tIm\n0,5\t-0,25\n",
        "time_s,In-Phase (V),Quadrature (V)\n0,0.5,-0.25\n",
        "# full_scale: 2\nI,Q\n1,-0.5\n",
    ],
)
def test_columns_by_their_headings(tmp_path, text):
    recording = opened(tmp_path, text)
    assert recording.signal.compute(0, 1)[0] == 0.5 - 0.25j
    assert recording.format == "csv"


def test_two_channels_by_others(tmp_path):
    text = "I0,Q0,I1,Q1\n1,2,3,4\n"
    for channel, wanted in ((0, 1 + 2j), (1, 3 + 4j)):
        hints = ReadHints(sample_rate_hz=RATE, channel=channel)
        assert opened(tmp_path, text, hints).signal.compute(0, 1)[0] == wanted
    assert opened(tmp_path, "1,2,3,4\n", ReadHints(sample_rate_hz=RATE, channel=0)).n_channels == 2


def test_codes_without_a_full_scale_are_told(tmp_path):
    recording = opened(tmp_path, "I,Q\n2047,-2048\n")
    assert "--full-scale" in recording.warnings[0]
    hints = ReadHints(sample_rate_hz=RATE, full_scale=2048)
    recording = opened(tmp_path, "I,Q\n1024,-2048\n", hints)
    assert recording.warnings == ()
    assert recording.signal.compute(0, 1)[0] == 0.5 - 1j
    hints = ReadHints(sample_rate_hz=RATE, datatype="ci16_le", bits=12, align="right")
    assert opened(tmp_path, "I,Q\n1024,-2048\n", hints).signal.compute(0, 1)[0] == 0.5 - 1j


def test_tabs_under_their_own_ending(tmp_path):
    assert opened(tmp_path, "I\tQ\n0,5\t1\n", name="x.tsv").n_samples == 1


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("I,Q\n1,2\n", "rate"),
        ("# sample_rate_hz: 0\nI,Q\n1,2\n", "sample_rate_hz"),
        ("# sample_rate_hz: -5\nI,Q\n1,2\n", "sample_rate_hz"),
        ("# sample_rate_hz: 20MHz\nI,Q\n1,2\n", "20MHz"),
        ("# sample_rate_hz: 1/0\nI,Q\n1,2\n", "1/0"),
        ("# sample_rate_hz: " + "9" * 400 + "\nI,Q\n1,2\n", "sample_rate_hz"),
        ("# sample_rate_hz: 1\n# full_scale: 0\nI,Q\n1,2\n", "full_scale"),
        ("# sample_rate_hz: 1\n# full_scale: big\nI,Q\n1,2\n", "big"),
        ("# sample_rate_hz: 1\n# datatype: ci16_le\nI,Q\n1.5,2\n", "1.5"),
        ("# sample_rate_hz: 1\n# datatype: ci16_le\nI,Q\n32768,2\n", "32768"),
        ("# sample_rate_hz: 1\nI,I\n1,2\n", None),
        ("# sample_rate_hz: 1\nI0,Q1\n1,2\n", "i0, q1"),
        ("# sample_rate_hz: 1\nQ\n1\n", "q"),
        ("# sample_rate_hz: 1\na,b\n1,2\n", "a, b"),
        ("# sample_rate_hz: 1\n1,2,3\n", "3 columns"),
        ("# sample_rate_hz: 1\nstart_sample,n_samples,label\n1,2,3\n", "markers"),
    ],
)
def test_tables_that_are_refused(tmp_path, text, word):
    if word is None:  # the second I is passed over: real samples
        assert opened(tmp_path, text, ReadHints()).is_real
        return
    with pytest.raises(FileError) as caught:
        opened(tmp_path, text, ReadHints())
    assert word in caught.value.problem
    assert len(str(caught.value)) < 1000


def test_a_word_that_the_comments_state(tmp_path):
    text = "# sample_rate_hz: 1\n# datatype: ci16_le\n# word_bits: 12\n# word_align: left\nI,Q\n"
    recording = opened(tmp_path, text + "16,-32768\n", ReadHints())
    assert recording.signal.compute(0, 1)[0] == 1 / 2048 - 1j
    with pytest.raises(FileError):
        opened(tmp_path, text + "17,0\n", ReadHints())


def test_an_unknown_datatype_is_told(tmp_path):
    recording = opened(tmp_path, "# datatype: cx9\nI,Q\n0.5,0\n")
    assert "cx9" in recording.warnings[0]
