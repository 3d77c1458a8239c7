import io
import json
import os
import re
import signal
import subprocess
import sys
import time

import pytest

from wavegen.cli import main
from wavegen.cli.main import STATUS, VERBS, join_negative, parser, run, status_of
from wavegen.core import errors
from wavegen.core.errors import WavegenError
from wavegen.production.judgement import Judgement

COMMAND = "import sys; from wavegen.cli.main import run; sys.exit(run())"


def test_0_done(call, recipe):
    assert call("make", recipe()).status == 0


def test_1_a_fault_of_the_program(call, recipe, monkeypatch):
    def fault(*_, **__):
        msg = "unheard of"
        raise ZeroDivisionError(msg)

    monkeypatch.setattr("wavegen.production.make.make", fault)
    said = call("make", recipe())
    assert said.status == 1
    assert said.out == ""
    assert "ZeroDivisionError: unheard of" in said.err
    assert "WAVEGEN_TRACEBACK=1" in said.err
    monkeypatch.setenv("WAVEGEN_TRACEBACK", "1")
    with pytest.raises(ZeroDivisionError):
        run(["make", str(recipe())])


@pytest.mark.parametrize(
    "arguments",
    [
        [],
        ["mak"],
        ["make"],
        ["make", "x", "--bogus"],
        ["make", "x", "--workers", "0"],
        ["make", "x", "--workers", "257"],
        ["make", "x", "--workers", "1.5"],
        ["make", "x", "--workers", "\u0663"],
        ["list", "nothing"],
        ["measure", "x.iq", "--sample-rate", "20"],
        ["measure", "x.iq", "--sample-rate", "0 Hz"],
        ["measure", "x.iq", "--sample-rate", "-1 MHz"],
        ["measure", "x.iq", "--sample-rate", "20 mHz"],
        ["measure", "x.iq", "--full-scale", "0"],
        ["measure", "x.iq", "--full-scale", "nan"],
        ["measure", "x.iq", "--reference-level", "-10"],
        ["measure", "x.iq", "--reference-level", "-10 dB"],
        ["measure", "x.iq", "--loop", "--period", "5 ms"],
    ],
)
def test_2_arguments(call, arguments):
    said = call(*arguments)
    assert said.status == 2
    assert said.out == ""
    assert said.err


@pytest.mark.parametrize(
    ("text", "arguments"),
    [
        (None, []),
        ("", []),
        ("wavegen: 2\n", []),
        ("\x00", []),
        ("not: [yaml", []),
        ("", ["--set", "signal.kind=nothing"]),
        (..., ["--set", "foo=1"]),
        (..., ["--set", "foo"]),
        (..., ["--set", "duration=2"]),
        (..., ["--set", "duration=3 symbols"]),
        (..., ["--set", "duration=1e9 s"]),
        (..., ["--set", "signal.spacing=1 GHz"]),
        (..., ["--set", "output.average=-1 dBFS"]),
        (..., ["--set", "output.average=-500 dBFS"]),
    ],
)
def test_3_recipe(call, recipe, tmp_path, text, arguments):
    path = tmp_path / "missing.yaml"
    if text is not None:
        path = recipe() if text is ... else recipe(text)
    said = call("make", path, *arguments)
    assert said.status == 3
    assert said.out == ""
    assert "allowed:" in said.err
    assert not (tmp_path / "output").exists()


def test_4_file(call, recipe, tmp_path):
    path = recipe()
    assert call("make", path).status == 0
    again = call("make", path)
    assert again.status == 4
    assert "--overwrite" in again.err
    assert call("make", path, "--overwrite").status == 0
    assert call("measure", tmp_path / "nothing.iq").status == 4


def test_5_a_rating_would_be_exceeded(call, recipe, texts, tmp_path):
    said = call("make", recipe(texts.RECIPE + texts.BENCH.replace("LIMIT", "-9")))
    assert said.status == 5
    assert "bench.path[0]" in said.err
    assert said.out == ""
    assert not (tmp_path / "output").exists()


def test_5_a_file_that_differs_from_its_law_is_kept(call, recipe, tmp_path, monkeypatch):
    differs = Judgement(verdict="differs", statement="differs: by a fault of the test")
    monkeypatch.setattr("wavegen.production.make.judge_files", lambda *_: [differs])
    said = call("make", recipe())
    assert said.status == 5
    assert "DIFFERS FROM it: by a fault" in said.out
    assert (tmp_path / "output" / "pier" / "pier.sigmf-data").is_file()


def test_130_interrupted(call, recipe, tmp_path, monkeypatch):
    def interrupt(_self, task, done, _total):
        if task == "rendering" and done:
            raise KeyboardInterrupt

    monkeypatch.setattr("wavegen.cli.progress.ConsoleProgress.__call__", interrupt)
    said = call("make", recipe())
    assert said.status == 130
    assert said.out == ""
    assert not (tmp_path / "output").exists()


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_130_when_the_system_asks(tmp_path, recipe, texts, number):
    path = recipe(texts.RECIPE.replace("2 ms", "60 s"))
    with subprocess.Popen(
        [sys.executable, "-c", COMMAND, "make", str(path)], cwd=tmp_path, stderr=subprocess.PIPE
    ) as process:
        end = time.monotonic() + 30
        while not list(tmp_path.glob("output/pier/.scratch*")) and time.monotonic() < end:
            time.sleep(0.02)
        process.send_signal(number)
        said = process.communicate(timeout=60)[1]
    assert process.returncode == 130
    assert b"interrupted" in said
    assert b"Traceback" not in said
    assert not (tmp_path / "output").exists()


def test_every_error_of_the_program_has_a_status():
    def kinds(kind):
        yield kind
        for below in kind.__subclasses__():
            yield from kinds(below)

    said = {"where": "a", "problem": "b", "allowed": "c", "remedy": "d"}
    ours = [k for k in kinds(WavegenError) if k.__module__ == errors.__name__]
    for kind in ours:
        if kind is WavegenError:
            continue
        made = kind([errors.RecipeError(**said)]) if kind is errors.RecipeFaults else kind(**said)
        assert status_of(made) in {2, 3, 4, 5}, kind
    assert {status for _, status in STATUS} == {2, 3, 4, 5}
    assert status_of(WavegenError(**said)) == 1


def test_help_names_verbs_statuses_and_dangers(call):
    said = call("--help")
    assert said.status == 0
    for word in (*VERBS, "130 interrupted", "peak", "licence", "exposure", "qualified people"):
        assert word in said.out
    assert max(map(len, said.out.splitlines())) <= 80


@pytest.mark.parametrize("verb", list(VERBS))
def test_each_verb_has_help_and_json(call, verb):
    said = call(verb, "--help")
    assert said.status == 0
    assert "--json" in said.out
    assert max(map(len, said.out.splitlines())) <= 80


def test_the_version(call):
    from wavegen import __version__

    assert call("--version").out == f"wavegen {__version__}\n"


def test_quiet_leaves_out_the_notes(call, recipe, texts):
    path = recipe(texts.RECIPE.replace("2 ms", "2.01 ms"))  # no whole number of periods
    told, quiet = call("show", path), call("show", path, "--quiet")
    assert told.err.startswith("note: duration")
    assert quiet.err == ""
    assert quiet.out == told.out
    assert "error:" in call("show", "nowhere.wav", "--quiet").err


def test_without_colour(call, monkeypatch):
    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.delenv("NO_COLOR", raising=False)
    monkeypatch.setattr("wavegen.cli.console.is_terminal", lambda _stream: True)
    assert "\x1b[" in call("list", "data").out
    assert "\x1b[" in call("lisst").err
    assert "\x1b[" not in call("list", "data", "--no-color").out
    assert "\x1b[" not in call("lisst", "--no-color").err


def test_starting_loads_nothing_heavy():
    code = (
        "import sys, wavegen.cli.main as main; main.parser().format_help(); "
        "print(sorted({name.partition('.')[0] for name in sys.modules}))"
    )
    said = subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, text=True)
    loaded = set(re.findall(r"'(\w+)'", said.stdout))
    assert "wavegen" in loaded
    heavy = {"numpy", "scipy", "pydantic", "ruamel", "argcomplete", "soundfile", "jsonschema"}
    assert not loaded & heavy


@pytest.mark.parametrize(
    "verb",
    [["list"], ["measure", "harbour-link-qpsk", "--json"], ["list", "--help"], ["schema"]],
)
def test_a_pipe_that_is_closed_early_is_no_error(verb, tmp_path):
    read, write = os.pipe()
    os.close(read)
    said = subprocess.run(
        [sys.executable, "-c", COMMAND, *verb],
        check=False,
        stdout=write,
        stderr=subprocess.PIPE,
        env={k: v for k, v in os.environ.items() if k != "PYTHONUNBUFFERED"},
        cwd=tmp_path,
        timeout=60,
    )
    os.close(write)
    assert (said.returncode, said.stderr) == (0, b"")


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="needs a device that is always full")  # noqa: PTH110
def test_an_output_that_is_full_is_a_file_error():
    with open("/dev/full", "wb") as full:  # noqa: PTH123
        said = subprocess.run(
            [sys.executable, "-c", COMMAND, "list"],
            check=False,
            stdout=full,
            stderr=subprocess.PIPE,
            timeout=60,
        )
    assert said.returncode == 4
    assert b"standard output" in said.stderr
    assert b"Traceback" not in said.stderr
    assert b"Exception ignored" not in said.stderr


@pytest.mark.parametrize("encoding", ["ascii", "latin-1"])
def test_results_fit_the_encoding_of_the_terminal(recipe, texts, monkeypatch, encoding):
    path = recipe(texts.RECIPE.replace("2 ms", "200 us"), "pier\u00b5.yaml")
    for arguments in (["measure", str(path)], ["measure", str(path), "--json"], ["--help"]):
        held = io.BytesIO()
        with monkeypatch.context() as patch:
            patch.setattr(sys, "stdout", io.TextIOWrapper(held, encoding=encoding))
            assert run(arguments) == 0
            sys.stdout.flush()
            said = held.getvalue().decode(encoding)
        assert said
        if "--json" in arguments:
            assert json.loads(said)["name"] == "pier\u00b5"


def test_negative_levels_are_values():
    assert parser().parse_args(
        join_negative(["measure", "x", "--reference-level", "-0.5 dBm"])
    ).reference_level == pytest.approx(-0.5)


def test_run_leaves_the_handlers_of_who_calls_it(call):
    before = signal.getsignal(signal.SIGTERM)
    call("list", "pulses")
    assert signal.getsignal(signal.SIGTERM) is before
    assert main.BUG == 1
