"""Texts that do nothing."""

from xml.etree import ElementTree as ET

import pytest

from wavegen.reports.inert import inert, one_line


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("plain, µ, ä, 東, \U0001f600", "plain, µ, ä, 東, \U0001f600"),
        ("a\u202eb", "a<U+202E>b"),
        ("\u2066x\u2069", "<U+2066>x<U+2069>"),
        ("bell\x07 nul\x00 del\x7f", "bell<U+0007> nul<U+0000> del<U+007F>"),
        ("half \udc80", "half <U+DC80>"),
        ("line\u2028end", "line<U+2028>end"),
        ("none\uffff", "none<U+FFFF>"),
        ("kept\n\tas it is", "kept\n\tas it is"),
        ("של", "של"),  # letters from right to left are letters
    ],
)
def test_what_acts_is_named_and_the_rest_kept(text, shown):
    assert inert(text) == shown
    shown.encode("utf-8")
    element = ET.Element("text")
    element.text = inert(text)
    assert ET.fromstring(ET.tostring(element)).text == shown  # noqa: S314 - our own


def test_one_line():
    assert one_line(" a\r\n  b\tc ") == "a b c"
