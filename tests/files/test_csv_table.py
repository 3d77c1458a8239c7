"""Tables of numbers as programs of many countries write them."""

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.csv_table import Dialect, Heading, heading_of, open_table

ROWS = np.array([[1.5, -2.0], [0.25, 3e-5], [-4.0, 5.125]])


def table(folder, text, encoding="utf-8"):
    path = folder / "x.csv"
    path.write_bytes(text.encode(encoding))
    return open_table(path)


@pytest.mark.parametrize(
    ("text", "separator", "comma"),
    [
        ("1.5,-2\n0.25,3e-5\n-4,5.125\n", ",", False),
        ("1.5, -2\r\n0.25, 3E-05\r\n-4, 5.125\r\n", ",", False),
        ("1.5;-2.0\n0.25;3e-5\n-4.0;5.125", ";", False),
        ("1,5;-2,0\n0,25;3e-5\n-4;5,125\n", ";", True),
        ("1,5\t-2\n0,25\t3e-5\n-4\t5,125\n", "\t", True),
        ("1.5 -2\n0.25   3e-5\n -4 5.125\n", " ", False),
        ("1,5 -2,0\n0,25 0,00003\n-4,0 5,125\n", " ", True),
        ("1.5,-2,\n0.25,3e-5,\n-4,5.125,\n", ",", False),
        ('"1.5","-2"\n"0.25","3e-5"\n"-4","5.125"\n', ",", False),
        ("\ufeff1.5,-2\n\n# between\n0.25,3e-5\n   \n-4,5.125\n\n", ",", False),
        ("\ufeffI;Q\n1,5;-2\n0,25;3e-5\n-4;5,125\n", ";", True),
    ],
)
def test_separators_and_decimal_commas(tmp_path, text, separator, comma):
    found = table(tmp_path, text)
    assert found.dialect == Dialect(separator=separator, decimal_comma=comma)
    np.testing.assert_array_equal(found.rows(0, 3), ROWS)


def test_one_column_with_decimal_commas_by_its_heading(tmp_path):
    found = table(tmp_path, "Power [dBm]\n-30,5\n-31,25\n")
    assert found.headings == (Heading(name="power", unit="dBm"),)
    np.testing.assert_array_equal(found.rows(0, 2), [[-30.5], [-31.25]])


def test_comments_and_headings(tmp_path):
    text = "# sample_rate_hz: 20000000\n% Title = Carrier\n# only words\nTime (s),I,Q\n0,1,2\n"
    found = table(tmp_path, text)
    assert found.settings == {"sample_rate_hz": "20000000", "title": "Carrier"}
    assert [item.name for item in found.headings] == ["time", "i", "q"]
    assert found.headings[0].unit == "s"


def test_ranges_over_many_marks(tmp_path):
    n = 10_000
    rng = np.random.default_rng(2)
    numbers = rng.integers(-9999, 9999, (n, 2))
    lines = [f"{a},{b}\n" for a, b in numbers]
    lines.insert(5000, "# a comment in the middle\n")
    lines.insert(100, "\n")
    found = table(tmp_path, "I,Q\n" + "".join(lines))
    assert found.n_rows == n
    for start, stop in ((0, n), (0, 1), (4095, 4097), (8192, 8200), (4999, 9999), (n - 1, n)):
        np.testing.assert_array_equal(found.rows(start, stop), numbers[start:stop])


@pytest.mark.parametrize(
    ("text", "name", "unit"),
    [
        ("Level / dB", "level", "dB"),
        ("power_mw", "power", "mW"),
        ("CCDF [%]", "ccdf", "%"),
        ("Zeit in s", "zeit_in", "s"),
        ("in-phase", "in_phase", ""),
        ("dB above average", "db_above_average", ""),
        ("", "", ""),
    ],
)
def test_headings_taken_apart(text, name, unit):
    assert heading_of(text) == Heading(name=name, unit=unit)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("I,Q\n1,2\n3\n", ("'3'", "1 columns")),
        ("I,Q\n1,2\n3,4,5\n", ("'3,4,5'", "3 columns")),
        ("I,Q\n1,2\n3,four\n", ("'3,four'",)),
        ("I,Q\n1,2\n3,\n", ("'3,'",)),
        ("I,Q\n1,2\n,3\n", ("',3'",)),
        ("I,Q\n1,2\nnan,3\n", ("'nan,3'",)),
        ("I,Q\n1,2\n1e999,3\n", ("'1e999,3'",)),
        ("I,Q\n1,2\n1_000,3\n", ("'1_000,3'",)),
        ("I,Q\n1,2\n0x10,3\n", ("'0x10,3'",)),
        ("I,Q\n1,2\n1+2j,3\n", ("'1+2j,3'",)),
        ("I,Q\n1,2\n\x1b[2J,3\n", ("x1b",)),
        ("I;Q\n1;2\nI;Q\n3;4\n", ("'I;Q'",)),
    ],
)
def test_rows_that_are_no_numbers(tmp_path, text, words):
    found = table(tmp_path, text)
    np.testing.assert_array_equal(found.rows(0, 1), [[1, 2]])
    with pytest.raises(FileError) as caught:
        found.rows(0, found.n_rows)
    for word in ("line 3", *words):
        assert word in caught.value.problem


@pytest.mark.parametrize(
    ("content", "word"),
    [
        (b"I,Q\n", "no row"),
        (b"# nothing\n\n", "no row"),
        ("I,Q\n1,2\n".encode("utf-16"), "UTF-16"),
        ("I,Q\n1,2\n".encode("utf-16-le"), "UTF-16"),
        (b"I,Q\n1,2\n\0\0", "NUL"),
        (b'{"i": 1, "q": 2}', "JSON"),
        (b"<table><tr><td>1</td></tr></table>", "XML"),
        (b"I,Q\n1;2\n3;4\n", "headings"),
        (b"I,Q\n1,5,2,5\n", "2 headings over 4 columns"),
        (b"I;Q\n1.000,5;2\n", "commas and points"),
        (b"1" * 70_000, "longer than"),
        (b",".join([b"1"] * 100) + b"\n", "100 columns"),
    ],
)
def test_what_is_no_table(tmp_path, content, word):
    path = tmp_path / "x.csv"
    path.write_bytes(content)
    with pytest.raises(FileError) as caught:
        open_table(path)
    assert word in caught.value.problem
    assert caught.value.remedy


def test_a_table_that_shrinks_while_in_use(tmp_path):
    found = table(tmp_path, "1,2\n" * 5000)
    (tmp_path / "x.csv").write_text("1,2\n" * 4500, encoding="utf-8")
    with pytest.raises(FileError) as caught:
        found.rows(0, 5000)
    assert "4500" in caught.value.problem
