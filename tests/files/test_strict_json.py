import json

import pytest

from wavegen.core.errors import FileError
from wavegen.files.strict_json import finite_json, read_json


def test_plain_documents(tmp_path):
    document = {"a": [1, 2.5, None, True, "ü"], "b": {"c": {}}}
    path = tmp_path / "x.json"
    path.write_text(json.dumps(document), encoding="utf-8")
    assert read_json(path) == document
    path.write_text("\ufeff" + json.dumps(document), encoding="utf-8")
    assert read_json(path) == document


@pytest.mark.parametrize(
    ("content", "word"),
    [
        (b"", "line 1, column 1"),
        (b'{"a": 1', "column"),
        (b'{"a": 1,\n "b" 2}', "line 2"),
        (b'{"a": NaN}', "NaN"),
        (b'{"a": -Infinity}', "Infinity"),
        (b'{"a": 1e999}', "1e999"),
        (b'{"a": 1, "a": 2}', "twice"),
        (b"[1]", "list"),
        (b"3", "int"),
        (b'{"a": "\xff"}', "UTF-8"),
        (b'{"a": "\\ud800"}', "half a character"),
        (b'{"\\ud800": 1}', "half a character"),
        (b'{"a":' * 100_000, "deep"),
        (b'{"a":' * 300 + b"1" + b"}" * 300, "deep"),
        (b'{"a": ' + b"9" * 5000 + b"}", "digits"),
        ("{}".encode("utf-16"), "UTF-8"),
    ],
    ids=range(16),
)
def test_documents_that_are_refused(tmp_path, content, word):
    path = tmp_path / "x.json"
    path.write_bytes(content)
    with pytest.raises(FileError) as caught:
        read_json(path)
    assert caught.value.where == str(path)
    assert word in caught.value.problem


def test_large_documents_are_not_even_opened(tmp_path):
    path = tmp_path / "x.json"
    with path.open("wb") as file:
        file.truncate(16_000_001)
    with pytest.raises(FileError) as caught:
        read_json(path)
    assert "16.0 MB" in caught.value.problem


def test_values_that_can_be_written():
    assert finite_json({"a": [1, "b", None]}) is None
    for value in (float("inf"), object(), {(1, 2): 3}):
        assert finite_json({"a": value}) is not None
