"""One line that says how far work has come."""

import io

import pytest

from wavegen.cli.progress import ConsoleProgress, clock, line
from wavegen.core.progress import UNITS


class Terminal(io.StringIO):
    encoding = "ascii"

    def isatty(self):
        return True


class Clock:
    def __init__(self):
        self.time = 100.0

    def __call__(self):
        return self.time


@pytest.fixture
def look(monkeypatch):
    """Put a terminal in the place of stderr: within a test, since pytest puts its own before."""

    def look(stream=None, columns=80):
        monkeypatch.setenv("COLUMNS", str(columns))
        stream = Terminal() if stream is None else stream
        monkeypatch.setattr("sys.stderr", stream)
        return stream

    return look


def test_rate_and_time_left(look):
    seen = look()
    now = Clock()
    progress = ConsoleProgress(now=now)
    progress("rendering", 0, 60_000_000)
    assert seen.getvalue() == ""
    now.time += 2
    progress("rendering", 20_000_000, 60_000_000)
    # 20 million samples in 2 s, 40 million to go: 10 MS/s, 4 s.
    assert seen.getvalue().startswith("\r 33 % [#####-----------] 0:04 left, 10.0 MS/s, rendering")
    progress.close()
    assert seen.getvalue().endswith("\r")


def test_the_clock_starts_where_work_was_taken_up(look):
    seen = look()
    now = Clock()
    progress = ConsoleProgress(now=now)
    progress("rendering", 50, 100)
    now.time += 5
    progress("rendering", 60, 100)
    assert "0:20 left" in seen.getvalue()


def test_a_new_task_starts_the_clock_again(look):
    seen = look()
    now = Clock()
    progress = ConsoleProgress(now=now)
    progress("rendering", 0, 100)
    now.time += 2
    progress("rendering", 100, 100)
    n_written = len(seen.getvalue())
    progress("writing", 1, 100)
    now.time += 0.5
    progress("writing", 2, 100)
    assert len(seen.getvalue()) == n_written


def test_short_work_a_pipe_and_a_quiet_run_show_nothing(look, monkeypatch):
    seen = look()
    now = Clock()
    short = ConsoleProgress(now=now)
    short("rendering", 0, 10)
    now.time += 0.5
    short("rendering", 10, 10)
    quiet = ConsoleProgress(patience_s=0.0, is_shown=False)
    quiet("rendering", 1, 10)
    assert seen.getvalue() == ""
    pipe = look(io.StringIO())
    ConsoleProgress(patience_s=0.0)("rendering", 1, 10)
    assert pipe.getvalue() == ""
    monkeypatch.setattr("sys.stderr", None)
    ConsoleProgress(patience_s=0.0)("rendering", 1, 10)


def test_it_is_not_redrawn_at_every_call(look):
    seen = look()
    now = Clock()
    progress = ConsoleProgress(now=now, patience_s=0.0)
    for done in range(100):
        now.time += 0.001
        progress("rendering", done, 1000)
    assert seen.getvalue().count("\r") == 1


@pytest.mark.parametrize("columns", [40, 80, 200])
def test_it_fits_the_terminal_and_its_letters(look, columns):
    seen = look(columns=columns)
    now = Clock()
    progress = ConsoleProgress(now=now)
    progress("writing \u00b5" + "x" * 300, 0, 100)
    now.time += 2
    progress("writing \u00b5" + "x" * 300, 50, 100)
    drawn = seen.getvalue()
    assert " 50 %" in drawn
    assert len(drawn.strip("\r")) < min(columns, 80)
    drawn.encode("ascii")


def test_tasks_that_count_no_samples():
    assert "MB/s" in line("hashing", 10**6, 10**6, 10**7, 1.0)
    tuning = line("searching: clip, 7.10 dB so far", 6_000, 6_000, 60_000, 6.0)
    assert "0:54 left, searching" in tuning
    assert "/s" not in tuning
    assert set(UNITS) == {"hashing", "seeds", "searching"}
    assert "-:--" in line("rendering", 0, 0, 10, 1.0)
    assert "100 %" in line("rendering", 0, 0, 0, 1.0)


def test_clocks():
    assert [clock(s) for s in (0, 59.6, 3600)] == ["0:00", "1:00", "1:00:00"]
