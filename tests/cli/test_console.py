import io
import json
import sys

import pytest

from wavegen.cli.console import Console, ConsoleProgress, discard_stdout
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


def test_progress_is_drawn_on_terminals_after_a_while(monkeypatch):
    quiet = io.StringIO()
    monkeypatch.setattr(sys, "stderr", quiet)
    progress = ConsoleProgress(patience_s=0.0)
    progress("rendering", 1, 10)
    progress.close()
    assert quiet.getvalue() == ""

    drawn = Terminal()
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.setattr(sys, "stderr", drawn)
    progress("rendering", 1_000_000, 10_000_000)
    progress("rendering", 10_000_000, 10_000_000)
    progress("writing x", 5, 10)
    progress.close()
    progress.close()
    assert "rendering" in drawn.getvalue()
    assert "MS/s" in drawn.getvalue()

    patient = Terminal()
    monkeypatch.setattr(sys, "stderr", patient)
    slow = ConsoleProgress(patience_s=60.0)
    slow("rendering", 1, 10)
    slow.close()
    assert patient.getvalue() == ""
