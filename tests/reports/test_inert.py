"""Texts that do nothing."""

from xml.etree import ElementTree as ET

import pytest

from wavegen.reports.inert import inert, one_line


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("plain, µ, ä, 東, \U0001f600", "plain, µ, ä, 東, \U0001f600"),
        ("a\u202eb", r"a\u202eb"),
        ("\u2066x\u2069", r"\u2066x\u2069"),
        ("bell\x07 nul\x00 del\x7f", r"bell\x07 nul\x00 del\x7f"),
        ("half \udc80", r"half \udc80"),
        ("none\uffff", r"none\uffff"),
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
