import subprocess
import sys

import pytest

from wavegen.core.registry import Member, Registry, nearest

TABLE = Registry("shape", {"circle": "math:tau", "square": "fractions:Fraction"})


def test_is_a_mapping_in_the_order_of_the_table():
    assert list(TABLE) == ["circle", "square"]
    assert len(TABLE) == 2
    assert TABLE["circle"] == "math:tau"
    assert "triangle" not in TABLE
    assert TABLE.kind == "shape"


def test_members_load_when_named():
    from fractions import Fraction

    assert TABLE.load("square") is Fraction
    assert TABLE.load("circle") == pytest.approx(6.283185307)


def test_nothing_is_imported_before():
    code = (
        "import sys\n"
        "from wavegen.core.registry import Registry\n"
        "table = Registry('x', {'a': 'colorsys:rgb_to_hsv'})\n"
        "assert 'a' in table and 'colorsys' not in sys.modules\n"
        "table.load('a')\n"
        "assert 'colorsys' in sys.modules\n"
    )
    subprocess.run([sys.executable, "-c", code], check=True)


def test_an_unknown_name_is_a_key_error():
    with pytest.raises(KeyError):
        TABLE.load("triangle")


@pytest.mark.parametrize(
    ("name", "found"), [("cirlce", "circle"), ("Square", "square"), ("polygon", None), ("", None)]
)
def test_the_nearest_member_is_suggested_only_when_close(name, found):
    assert TABLE.nearest(name) == found


def test_nearest_takes_what_is_no_text():
    assert nearest("12", ["12", "13"]) == "12"
    assert nearest(12, ["12", "30"]) == "12"


def test_the_table_does_not_follow_its_argument():
    members = {"a": "math:pi"}
    table = Registry("x", members)
    members["b"] = "math:e"
    assert list(table) == ["a"]


def test_members_of_annotations_compare_by_value():
    assert Member(("signal",)) == Member(("signal",))
    assert Member(("signal",)) != Member(("stage",))
