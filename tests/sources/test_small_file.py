import pytest

from wavegen.core.units import QuantityError
from wavegen.sources.small_file import read_numbers, read_small_file


def test_content(tmp_path):
    path = tmp_path / "some.txt"
    path.write_bytes(b"abc")
    assert read_small_file(path, most_bytes=3) == b"abc"
    with pytest.raises(QuantityError) as caught:
        read_small_file(path, most_bytes=2)
    assert caught.value.allowed == "up to 2 bytes"


def test_no_file(tmp_path):
    for path in (tmp_path, tmp_path / "missing", tmp_path / "a" / "b", tmp_path / ("x" * 5000)):
        with pytest.raises(QuantityError):
            read_small_file(path, most_bytes=10)


def test_numbers(tmp_path):
    path = tmp_path / "taps.txt"
    path.write_text("# a pulse\n0.5, 1.0 ; -2e-3 # and more\n\n4\n")
    assert read_numbers(path, most=4) == (0.5, 1.0, -0.002, 4.0)


@pytest.mark.parametrize(
    ("content", "problem"),
    [
        ("1\n2 x", "line 2 holds 'x'"),
        ("nan", "nan"),
        ("1e999", "1e999"),
        ("", "no numbers"),
        ("# 1", "no numbers"),
        ("1 2 3 4 5", "5 numbers"),
    ],
)
def test_no_numbers(tmp_path, content, problem):
    path = tmp_path / "taps.txt"
    path.write_text(content)
    with pytest.raises(QuantityError) as caught:
        read_numbers(path, most=4)
    assert problem in caught.value.problem
