"""Ctrl-C on a terminal: work shows rate and time left, nothing is left half-made."""

import os
import select
import signal
import subprocess
import sys
import time

import pytest

pty = pytest.importorskip("pty")

COMMAND = "import sys; from wavegen.cli.main import run; sys.exit(run())"
LONG = """wavegen: 1
title: A pier for a long time
sample_rate: 4 MHz
duration: 300 s
signal: {kind: tones, count: 8, spacing: 10 kHz, phases: newman}
"""
SHORT = LONG.replace("300 s", "1 ms").replace("for a long time", "for a moment")
PATIENCE_S = 60.0


@pytest.fixture
def stop(tmp_path):
    """Run a command on a terminal, interrupt it once a text is seen, give status and what it said.

    The terminal is that of stderr; stdout goes to a pipe.
    """

    def stop(*arguments, seen, number=signal.SIGINT):
        ours, theirs = pty.openpty()
        environment = os.environ | {"TERM": "dumb", "COLUMNS": "80"}
        with subprocess.Popen(
            [sys.executable, "-c", COMMAND, *arguments],
            cwd=tmp_path,
            env=environment,
            stdout=subprocess.PIPE,
            stderr=theirs,
        ) as process:
            os.close(theirs)
            said, is_sent, end = "", False, time.monotonic() + PATIENCE_S
            while time.monotonic() < end:
                if select.select([ours], [], [], 0.05)[0]:
                    try:
                        heard = os.read(ours, 4096)
                    except OSError:  # the other end has gone
                        break
                    if not heard:
                        break
                    said += heard.decode("utf-8", "replace")
                if seen in said and not is_sent:
                    process.send_signal(number)
                    is_sent = True
            if process.poll() is None and not is_sent:
                process.kill()
            out = process.communicate(timeout=PATIENCE_S)[0].decode()
        os.close(ours)
        assert is_sent, said
        assert "Traceback" not in said
        return process.returncode, out, said

    return stop


def files_below(folder):
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_make_keeps_what_is_finished(tmp_path, stop, number):
    (tmp_path / "first.yaml").write_text(SHORT)
    (tmp_path / "second.yaml").write_text(LONG)
    status, out, said = stop("make", "first.yaml", "second.yaml", seen="left", number=number)
    assert status == 130
    assert "MS/s, rendering" in said
    assert "nothing half-written is left; kept: output/first" in " ".join(said.split())
    assert "A pier for a moment" in out
    assert "for a long time" not in out
    assert files_below(tmp_path) == [
        "first.yaml",
        "output/first/first.ccdf.csv",
        "output/first/first.ccdf.json",
        "output/first/first.markers.csv",
        "output/first/first.sigmf-data",
        "output/first/first.sigmf-meta",
        "second.yaml",
    ]
    assert not (tmp_path / "output" / "second").exists()


def test_measure_leaves_nothing(tmp_path, stop):
    (tmp_path / "pier.yaml").write_text(LONG)
    status, out, said = stop(
        "measure", "pier.yaml", "--report", "pier.html", "--figures", "pictures", seen="left"
    )
    assert (status, out) == (130, "")
    assert "interrupted; nothing half-written is left" in " ".join(said.split())
    assert "kept" not in said
    assert files_below(tmp_path) == ["pier.yaml"]


def test_tune_keeps_its_evaluations_and_goes_on(tmp_path, stop):
    command = ["tune", "valley-cell-20mhz", "--set", "duration=2 ms", "--evm-limit", "8%"]
    # Whichever method is tried by the time progress is shown; the quick ones may pass unseen.
    status, out, said = stop(*command, "--method", "clip_filter", seen="left, searching: ")
    assert (status, out) == (130, "")
    told = " ".join(said.split())
    assert "kept: what was evaluated, in output/valley-cell-20mhz; the same command goes" in told
    (journal,) = files_below(tmp_path)
    assert journal.endswith(".json")
    again = subprocess.run(
        [sys.executable, "-c", COMMAND, *command, "--method", "clip_filter", "--seconds", "1"],
        cwd=tmp_path,
        capture_output=True,
        text=True,
        check=False,
        timeout=PATIENCE_S,
    )
    assert again.returncode in {0, 5, 6}, again.stderr
    assert "went on from" in again.stderr
