"""Tables and sentences that fit a terminal."""

import pytest

from wavegen.core.table import Table
from wavegen.reports.text import NARROWEST, fold, held, text_of, visible

WIDE = Table(
    title="A title of many words " * 6,
    headings=("name", "about", "dB"),
    rows=(("folder/" * 12 + "file.wav", "some words " * 20, "-10.25"), ("short", "", "1.00")),
    right=frozenset({2}),
)


@pytest.mark.parametrize("width", [40, 60, 80, 200])
def test_no_line_is_wider_and_no_word_is_lost(width):
    said = text_of(WIDE, width=width, rule="-")
    lines = said.splitlines()
    assert max(map(len, lines)) <= width
    assert "".join(said.split()).count("folder/") >= 1
    assert said.count("words") == 6 + 20
    assert [line for line in lines if line.rstrip().endswith("1.00")]


def test_numbers_stand_at_the_right_and_are_folded_last():
    lines = text_of(WIDE, width=60).splitlines()
    (first,) = [line for line in lines if line.endswith("-10.25")]
    (second,) = [line for line in lines if line.endswith("1.00")]
    assert len(first) == len(second)


def test_columns_of_numbers_too_wide_are_folded_too():
    table = Table(title="", headings=("x" * 50,) * 3, rows=(), right=frozenset(range(3)))
    assert max(map(len, text_of(table, width=40).splitlines())) <= 40


def test_too_many_columns_keep_a_least_width():
    table = Table(title="", headings=("heading",) * 30, rows=())
    assert max(map(len, text_of(table, width=40).splitlines())) <= 2 + 30 * (NARROWEST + 1)


def test_a_cell_keeps_its_indent_and_its_lines():
    table = Table(title="t", headings=("tree",), rows=(("  deep " + "word " * 30,), ("a\nb",)))
    lines = text_of(table, width=40).splitlines()[2:]
    assert all(line.startswith("    ") for line in lines[:-2])
    assert lines[-2:] == ["  a", "  b"]


def test_a_sentence_is_folded_between_words():
    text = "Run wavegen measure run7.iq --sample-rate 20MHz --format ci16_le. " * 4
    lines = fold(text, 40).splitlines()
    assert max(map(len, lines)) <= 40
    assert " ".join(lines).split() == text.split()
    assert fold("", 40) == ""
    assert fold("x" * 100, 40, indent="  ").splitlines() == [
        "x" * 40,
        "  " + "x" * 38,
        "  " + "x" * 22,
    ]
    assert fold("36\u00a0dBm is 19.95 V", 14) == "36\u00a0dBm is\n19.95 V"


@pytest.mark.parametrize(
    "hostile", ["\x1b]0;owned\x07", "\x9b2J", "a\rb", "\x00", "\u202eabc", "\ud800", "\x08"]
)
def test_nothing_that_acts_on_a_terminal_is_left(hostile):
    said = visible(hostile)
    assert said.isprintable()
    assert "\\" in said
    table = Table(title=hostile, headings=(hostile,), rows=((hostile,),))
    assert all(line.isprintable() for line in text_of(table).split("\n"))


def test_what_is_printable_stays():
    for text in ("5 \u00b5s \u2026 \u00e9\u4e2d", "a\tb\nc", "plain"):
        assert visible(text) == text


def test_what_an_encoding_lacks_is_spelt_another_way():
    assert held("5 \u00b5s \u2500 \u00e9", "utf-8") == "5 \u00b5s \u2500 \u00e9"
    assert held("5 \u00b5s \u2500 \u00e9", "latin-1") == "5 \u00b5s - \u00e9"
    assert held("5 \u00b5s \u2500 \u00e9", "ascii") == "5 us - \\xe9"


def test_words_stay_whole_where_there_is_room():
    table = Table(
        title="t",
        headings=("file", "SHA-512", "mean", "largest level", "verdict"),
        rows=(("harbour-link-qpsk.sigmf-data", "equal", "+0.000 dB", "+0.000 dB", "match"),),
        right=frozenset({2, 3}),
    )
    said = text_of(table, width=60)
    for word in ("SHA-512", "largest", "verdict", "+0.000 dB"):
        assert word in said
