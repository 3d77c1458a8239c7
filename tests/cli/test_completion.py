"""What a shell is told that may follow."""

import os
import shutil
import subprocess
import sys

import pytest

from wavegen.cli.completion import CANDIDATES, SHELLS
from wavegen.cli.main import parsers
from wavegen.files import FORMATS
from wavegen.recipe.find import shipped_paths
from wavegen.sources import SOURCES

COMMAND = "import sys; sys.argv[0] = 'wavegen'; from wavegen.cli.main import run; sys.exit(run())"


@pytest.fixture
def ask(tmp_path):
    """Ask the program as a shell does, and return what may follow."""

    def ask(line):
        answer = tmp_path / "answer"
        environment = os.environ | {
            "_ARGCOMPLETE": "1",
            "_ARGCOMPLETE_IFS": "\n",
            "_ARGCOMPLETE_SUPPRESS_SPACE": "1",
            "_ARGCOMPLETE_STDOUT_FILENAME": str(answer),
            "COMP_LINE": line,
            "COMP_POINT": str(len(line.encode())),
            "COMP_TYPE": "9",
        }
        done = subprocess.run(
            [sys.executable, "-c", COMMAND],
            env=environment,
            cwd=tmp_path,
            capture_output=True,
            text=True,
            check=False,
            timeout=30,
        )
        assert (done.stdout, done.stderr) == ("", "")
        return [word.strip() for word in answer.read_text().splitlines()]

    return ask


def test_verbs_and_options(ask):
    assert ask("wavegen m") == ["make", "measure", "match"]
    assert {"--figures", "--format", "--full-scale", "--from"} <= set(ask("wavegen measure x --f"))
    assert ask("wavegen match a b --field-g") == []  # of one side alone: as hidden as in the help


def test_recipes_files_and_names(ask, tmp_path):
    for name in ("mine.yaml", "run7.wav"):
        (tmp_path / name).touch()
    found = ask("wavegen make ")
    assert set(shipped_paths()) | {"mine.yaml"} <= set(found)
    assert "run7.wav" not in found
    assert ask("wavegen new valley-cell-c") == ["valley-cell-clipped"]
    assert "run7.wav" in ask("wavegen measure ")
    assert ask("wavegen measure --report x.html harbour-l") == ["harbour-link-qpsk"]
    assert set(FORMATS) <= set(ask("wavegen convert run7.wav --to "))
    assert "ci16_le" in ask("wavegen measure run7.wav --format ci16")
    assert ask("wavegen tune mine.yaml --method clip_") == ["clip_filter"]
    assert ask("wavegen list source") == ["sources"]


def test_every_place_named_is_one():
    known = set()
    for parser in parsers()[1].values():
        for action in parser._actions:
            known.add(action.dest if action.option_strings else action.metavar)
    assert set(CANDIDATES) <= known
    assert len(SOURCES) > 3


@pytest.mark.parametrize("shell", SHELLS)
def test_lines_for_a_shell(call, shell):
    said = call("completion", shell)
    assert said.status == 0
    assert "wavegen" in said.out
    assert call("completion", shell, "--json").json()["shell"] == shell
    path = shutil.which(shell)
    if path:
        done = subprocess.run(
            [path, "-n"], input=said.out, capture_output=True, text=True, check=False, timeout=30
        )
        assert (done.returncode, done.stderr) == (0, "")


def test_bash_completes(tmp_path):
    bash = shutil.which("bash")
    if not bash:
        pytest.skip("no bash here")
    (tmp_path / "wavegen").write_text(f'#!/bin/sh\nexec {sys.executable} -c "{COMMAND}" "$@"\n')
    (tmp_path / "wavegen").chmod(0o755)
    script = (
        'eval "$(wavegen completion bash)"\n'
        "COMP_WORDS=(wavegen make harbour); COMP_CWORD=2; COMP_TYPE=9\n"
        'COMP_LINE="wavegen make harbour"; COMP_POINT=${#COMP_LINE}\n'
        "compopt() { :; }\n"
        "_python_argcomplete wavegen\n"
        'printf "%s\\n" "${COMPREPLY[@]}"\n'
    )
    done = subprocess.run(
        [bash, "-c", script],
        env=os.environ | {"PATH": f"{tmp_path}:{os.environ['PATH']}"},
        cwd=tmp_path,
        capture_output=True,
        text=True,
        check=False,
        timeout=30,
    )
    assert done.stdout.strip() == "harbour-link-qpsk", done.stderr
