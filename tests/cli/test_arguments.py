"""What the parser says to whoever mistypes."""

import argparse
import re

import pytest

from wavegen.cli.arguments import Formatter, Parser, epilogue, join_negative, options_in
from wavegen.cli.main import VERBS, parsers
from wavegen.core.errors import ArgumentsError


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["mak"], "Did you mean make?"),
        (["gaincurve"], "Did you mean gain-curve?"),
        (["link.yaml"], "wavegen make link.yaml"),
        (["help"], "See `wavegen --help`."),
        ([], "wavegen make valley-cell-20mhz"),
        (["make"], "RECIPE is missing"),
        (["make", "x", "--figure"], "Did you mean --figures?"),
        (["make", "x", "--workerz", "2"], "Did you mean --workers?"),
        (["measure", "x", "--gat=auto"], "Did you mean --gate?"),
        (["convert", "x", "--too", "wav"], "Did you mean --to?"),
        (["measure", "x", "--edges", "movd"], "Did you mean moved?"),
        (["measure", "x", "--sample-rate"], "its value is missing"),
        (["measure", "x", "--loop", "--period", "5ms"], "cannot stand beside --loop"),
        (["make", "x", "--json=3"], "takes no value"),
        (["list", "recipe"], "Did you mean recipes?"),
        (["--json", "list"], "wavegen list"),
        (["list", "-q"], "-q: there is no such option"),
        (["completion", "tcsh"], "bash, zsh, fish"),
    ],
)
def test_a_fault_is_one_sentence_that_helps(call, arguments, said):
    found = call(*arguments)
    assert found.status == 2
    assert found.out == ""
    (line,) = found.err.splitlines()
    assert re.match(r"error: wavegen\b.*; allowed: [^;]+", line)
    assert said in line


def test_a_file_for_a_verb(call, noise):
    assert f"wavegen measure {noise().name}" in call("noise.cf32_le").err


def test_no_option_is_taken_when_shortened(call):
    assert call("list", "--jso").status == 2
    assert call("list", "pulses", "--json").status == 0


def test_words_behind_two_dashes_are_no_options(call):
    assert call("measure", "--", "--file").status == 4


@pytest.mark.parametrize("verb", ["--help", "--version", *VERBS])
@pytest.mark.parametrize("columns", [40, 80, 200])
def test_help_fits_the_terminal(call, monkeypatch, verb, columns):
    monkeypatch.setenv("COLUMNS", str(columns))
    said = call(verb) if verb.startswith("-") else call(verb, "--help")
    assert said.status == 0
    for line in said.out.splitlines():
        # Commands, lists and headings of groups are not folded.
        if not line.startswith(" ") and not line.endswith(":"):
            assert len(line) <= min(columns, 80), line


def test_folding_keeps_what_is_indented():
    text = "First words " * 10 + "\n  kept   as it is\n\nAnd more.\n\n  all of it kept"
    parser = argparse.ArgumentParser(formatter_class=Formatter, description=text)
    said = parser.format_help()
    assert "\n  kept   as it is\n\nAnd more.\n\n  all of it kept\n" in said


def test_epilogues():
    assert epilogue(["a", "b"], "Before.") == "Before.\n\nexamples:\n  a\n  b"


def test_the_parser_raises(monkeypatch):
    monkeypatch.setenv("COLUMNS", "80")
    parser = Parser(prog="wavegen trial")
    parser.add_argument("--n", type=int)
    with pytest.raises(ArgumentsError) as caught:
        parser.parse_args(["--n", "x"])
    assert caught.value.where == "wavegen trial --n"
    assert caught.value.problem == "invalid int value: 'x'"
    parser.add_argument("--long-name")
    with pytest.raises(ArgumentsError):
        parser.parse_args(["--long", "x"])


def test_negative_values_are_values():
    assert join_negative(["--a", "-1dBm", "-x", "-2", "--b=1", "-3"]) == [
        "--a=-1dBm",
        "-x",
        "-2",
        "--b=1",
        "-3",
    ]
    assert join_negative(["-5"]) == ["-5"]
    assert options_in(["-5", "--a=-1", "-x"]) == ["--a", "-x"]


def test_every_verb_takes_what_all_take():
    for name, parser in parsers()[1].items():
        arguments = {option for action in parser._actions for option in action.option_strings}
        assert {"--json", "--quiet", "--no-color", "--help"} <= arguments, name
