"""Documents that show themselves."""

import pytest

from wavegen.core.table import Table
from wavegen.reports.result import Result

TABLE = Table(
    title="A <title>",
    headings=("what", "dB"),
    rows=(("short", "1.00"), ("<b>longer</b>", "-10.25")),
    right=frozenset({1}),
)


def result():
    return Result({"levels": [{"probability": 0.1}]}, lambda: [TABLE], lambda: ["A & B."])


def test_it_is_its_document():
    assert result()["levels"] == [{"probability": 0.1}]
    assert dict(result()) == {"levels": [{"probability": 0.1}]}
    assert len(result()) == 1
    with pytest.raises(KeyError):
        result()["x"]


def test_as_text_columns_are_aligned():
    lines = str(result()).splitlines()
    assert lines[2].index("1.00") + 4 == lines[3].index("-10.25") + 6
    assert str(result()).endswith("A & B.")
    assert repr(result()) == str(result())


def test_in_a_notebook_everything_is_escaped():
    shown = result()._repr_html_()
    assert "<b>" not in shown
    assert "&lt;b&gt;longer&lt;/b&gt;" in shown
    assert "<p>A &amp; B.</p>" in shown
    assert shown.count("<tr>") == 3


def test_as_a_row_of_a_table_library():
    found = Result({"a": 1, "law": {"verdict": "agrees", "deep": {"x": None}}, "levels": []}, list)
    assert found.row() == {"a": 1, "law_verdict": "agrees", "law_deep_x": None}


def test_its_pictures_are_figures():
    level = [-10.0, 0.0, 5.0]
    document = {
        "name": "x",
        "levels": [],
        "papr_db": 5.0,
        "ccdf": {"level_db": level, "probability": [0.9, 0.4, 0.0]},
    }
    found = Result(document, list).figures()
    assert list(found) == ["ccdf"]
    assert found["ccdf"].axes
