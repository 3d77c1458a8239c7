import io
import json
import sys

import pytest

from wavegen.cli.console import Console, discard_stdout
from wavegen.core.errors import FileError
from wavegen.core.table import Table

TABLE = Table(
    title="Levels",
    headings=("place", "average"),
    rows=(("generator [bold]", "-10.00 dBm"), ("x" * 200, "1.00 dBm")),
    right=frozenset({1}),
)


class Terminal(io.StringIO):
    def isatty(self):
        return True


def test_results_go_to_stdout_and_talk_to_stderr(capsys):
    console = Console()
    console.document({"a": "\u00b5"})
    console.line("word " * 40)
    console.table(TABLE)
    console.warn("first\nsecond")
    console.fail("third")
    said = capsys.readouterr()
    assert json.loads(said.out.splitlines()[0] + said.out.splitlines()[1] + "}") == {"a": "\u00b5"}
    assert "[bold]" in said.out
    assert max(map(len, said.out.splitlines())) <= 80
    assert said.err == "note: first\nnote: second\nerror: third\n"


def test_colour_on_terminals_only(monkeypatch):
    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.delenv("NO_COLOR", raising=False)
    plain, coloured = Terminal(), Terminal()
    monkeypatch.setattr(sys, "stderr", coloured)
    Console().fail("x")
    monkeypatch.setattr(sys, "stderr", io.StringIO())
    Console().fail("x")
    assert "\x1b[" in coloured.getvalue()
    assert sys.stderr.getvalue() == "error: x\n"
    monkeypatch.setattr(sys, "stdout", plain)
    Console().table(TABLE)
    assert "\x1b[" in plain.getvalue()


@pytest.mark.parametrize(
    ("is_plain", "variables"),
    [(True, {}), (False, {"NO_COLOR": "1"}), (False, {"TERM": "dumb"})],
)
def test_no_colour_where_none_is_wanted(monkeypatch, is_plain, variables):
    monkeypatch.delenv("NO_COLOR", raising=False)
    for name, value in ({"TERM": "xterm"} | variables).items():
        monkeypatch.setenv(name, value)
    for stream in ("stdout", "stderr"):
        monkeypatch.setattr(sys, stream, Terminal())
    console = Console(is_plain=is_plain)
    console.fail("x")
    console.warn("y")
    console.table(TABLE)
    assert "\x1b" not in sys.stderr.getvalue() + sys.stdout.getvalue()
    assert "error: x" in sys.stderr.getvalue()


def test_an_empty_no_color_says_nothing(monkeypatch):
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.setenv("NO_COLOR", "")
    monkeypatch.setattr(sys, "stderr", Terminal())
    Console().fail("x")
    assert "\x1b[" in sys.stderr.getvalue()


def test_quiet_is_results_and_errors_alone(capsys):
    console = Console(is_quiet=True)
    console.warn("a note")
    console.fail("why it ends")
    console.line("a result")
    said = capsys.readouterr()
    assert said.err == "error: why it ends\n"
    assert said.out == "a result\n"


@pytest.mark.parametrize("columns", [40, 80, 200])
def test_what_is_said_fits_the_terminal(monkeypatch, columns):
    monkeypatch.setenv("COLUMNS", str(columns))
    for stream in ("stdout", "stderr"):
        monkeypatch.setattr(sys, stream, Terminal())
    console = Console(is_plain=True)
    console.line("word " * 60)
    console.table(TABLE)
    console.fail("a/long/path/" * 20)
    for stream in (sys.stdout, sys.stderr):
        assert max(map(len, stream.getvalue().splitlines())) <= min(columns, 80)


def test_what_acts_on_a_terminal_is_spelt_out(capsys):
    console = Console()
    console.warn("title\x1b]0;owned\x07")
    console.line("\x1b[2J")
    said = capsys.readouterr()
    assert "\x1b" not in said.err + said.out
    assert "\\x1b" in said.err


def test_a_closed_stderr_is_borne(monkeypatch):
    monkeypatch.setattr(sys, "stderr", None)
    Console().fail("x")


def test_a_closed_stdout_is_a_file_error(monkeypatch):
    monkeypatch.setattr(sys, "stdout", None)
    with pytest.raises(FileError, match="standard output"):
        Console().line("x")
    discard_stdout()
    closed = io.StringIO()
    closed.close()
    monkeypatch.setattr(sys, "stdout", closed)
    with pytest.raises(FileError):
        Console().table(TABLE)


def test_numbers_that_are_none_are_refused():
    with pytest.raises(ValueError, match="JSON compliant"):
        Console().document({"a": float("nan")})
