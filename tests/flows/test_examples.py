"""Every example that a help shows runs, one after the other in one folder, within 80 columns."""

import json
import shlex

import pytest

from wavegen.cli.main import VERBS, run

ALLOWED = {"match": {0, 5, 6}, "gain-curve": {0, 5, 6}, "tune": {0, 6}}
"""Exit statuses besides 0: of verbs whose verdict the example does not promise."""


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("bench")


@pytest.mark.parametrize("verb", list(VERBS))
def test_examples_run(verb, folder, monkeypatch, capsys):
    monkeypatch.chdir(folder)
    member = VERBS.load(verb)
    assert member.examples
    for example in member.examples:
        words, _, target = example.partition(" > ")
        program, *arguments = shlex.split(words)
        assert (program, arguments[0]) == ("wavegen", verb)
        assert len(example) <= 78  # two columns of indent, within 80
        assert run(arguments) in ALLOWED.get(verb, {0}), example
        said = capsys.readouterr()
        assert not [line for line in said.err.splitlines() if line.startswith("error: ")]
        if target:
            assert json.loads(said.out)
        elif verb != "completion":
            assert said.out
            assert max(map(len, said.out.splitlines())) <= 80, example
