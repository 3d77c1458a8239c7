import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.stages.numbers_file import MOST_BYTES, Column, read_columns

COLUMNS = (
    Column(names=("frequency", "f"), units={"hz": 1.0, "mhz": 1e6}),
    Column(names=("magnitude",), units={"db": 1.0}),
)


def read(tmp_path, text, *, least_rows=1):
    path = tmp_path / "table.csv"
    path.write_text(text, encoding="utf-8")
    return read_columns(path, COLUMNS, least_rows=least_rows)


@pytest.mark.parametrize(
    "text",
    [
        "frequency_hz,magnitude_db\n1e6,-1\n2e6,-2\n",
        "Magnitude (dB);note;F [MHz]\n-1;7;1\n-2;7;2\n",
        "# gain: 3\nfrequency,magnitude\n1e6,-1\n2e6,-2\n",
        "1000000 -1\n2000000 -2\n",
        "f_mhz,magnitude_dB\n1,-1\n2,-2\n",
    ],
)
def test_columns_are_found_by_heading_else_by_order(tmp_path, text):
    values, table = read(tmp_path, text)
    np.testing.assert_allclose(values, [[1e6, 2e6], [-1, -2]])
    assert table.settings == ({"gain": "3"} if "gain" in text else {})


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("frequency_hz,phase\n1,2\n", "no column magnitude"),
        ("frequency_ghz,magnitude_db\n1,2\n", "no column frequency"),
        ("frequency_hz,f_hz,magnitude_db\n1,2,3\n", "2 columns frequency"),
        ("1,2,3\n", "3 columns and no headings"),
        ("frequency_hz,magnitude_db\n1,2\n", "1 rows"),
        ("frequency_hz,magnitude_db\n1,nan\n2,3\n", ""),
        ("frequency_hz,magnitude_db\n1,x\n2,3\n", ""),
        ("", ""),
    ],
)
def test_faults_say_the_file_and_what_is_wanted(tmp_path, text, words):
    with pytest.raises(FileError) as caught:
        read(tmp_path, text, least_rows=2)
    assert caught.value.where.endswith("table.csv")
    assert words in caught.value.problem


def test_size_is_limited(tmp_path):
    with pytest.raises(FileError) as caught:
        read(tmp_path, "1,2\n" * (MOST_BYTES // 4 + 1))
    assert "MB" in caught.value.problem
    with pytest.raises(FileError) as caught:
        read(tmp_path, "1,2\n" * 10_001)
    assert "10001 rows" in caught.value.problem
    with pytest.raises(FileError):
        read_columns(tmp_path / "none.csv", COLUMNS, least_rows=1)
