"""What README.md says is what the program does."""

import re
import runpy
import shlex
from pathlib import Path

import pytest

from wavegen.cli.main import STATUS, VERBS, join_negative, parser
from wavegen.core.render import samples_of
from wavegen.files import FORMATS
from wavegen.production.prepare import prepare
from wavegen.recipe.find import shipped_recipes
from wavegen.recipe.load import load_text

ROOT = Path(__file__).resolve().parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def block(opening):
    (found,) = re.findall(rf"^```{opening}\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)
    return found


def inline_commands():
    found = re.findall(r"`(wavegen [^`]*)`", README)
    return [command.replace(r"\|", "|") for command in found]


def test_the_recipe_loads_and_builds():
    prepared = prepare(load_text(block("yaml"), name="readme"))
    assert [note for note in prepared.notes if note.kind != "info"] == []
    assert samples_of(prepared.built.signal, 0, 1000).size == 1000
    recipe = prepared.loaded.recipe
    assert [request.format for request in recipe.output.iq] == ["sigmf", "wav"]


@pytest.mark.parametrize("command", inline_commands())
def test_each_command_is_one(command):
    words = shlex.split(command)[1:]
    assert words[0] in VERBS
    if not any(word.isupper() or "|" in word or "..." in word for word in words):
        parsed = parser().parse_args(join_negative(words))
        assert parsed.verb == words[0]


def test_every_verb_is_named():
    told = {shlex.split(command)[1] for command in inline_commands()}
    assert told == set(VERBS)


def test_every_option_named_is_one():
    known = set()
    for verb in VERBS:
        parts = parser()._subparsers._group_actions[0].choices[verb].format_help()
        known |= set(re.findall(r"--[a-z-]+", parts))
    assert set(re.findall(r"`(--[a-z-]+)", README)) <= known


def test_statuses_are_told():
    line = README.partition("Exit status:")[2].partition("\n\n")[0]
    for status in (0, 1, *(status for _, status in STATUS), 130):
        assert re.search(rf"(?<!\d){status} ", line), status


def test_the_first_command_makes_a_shipped_recipe():
    first = block("bash first").strip()
    assert "\n" not in first
    verb, recipe = first.rpartition("wavegen ")[2].split()
    assert verb in VERBS
    assert recipe in {name for name, _, _ in shipped_recipes()}
    assert f"output/{recipe}/" in README


def test_the_tests_command_is_what_ci_reads():
    tests = block("bash tests").strip()
    assert "\n" not in tests
    assert "pytest" in tests
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert re.search(r"/\^```bash tests\$/.*README\.md", script)
    assert 'eval "$command"' in script


def test_formats_named_are_in_the_table():
    assert {"sigmf", "wav"} <= set(FORMATS)


def test_no_word_of_the_output_is_promised_in_vain():
    for word in ("-e '.[dev]'", "'.[compiled]'"):
        assert word in README
    project = (ROOT / "pyproject.toml").read_text(encoding="utf-8")
    for extra in ("compiled", "dev"):
        assert re.search(rf"^{extra} = \[", project, re.MULTILINE)


def test_the_examples_in_python_run(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    for name in ("make", "measure", "match"):
        script = tmp_path / f"{name}.py"
        script.write_text(block(f"python {name}"), encoding="utf-8")
        runpy.run_path(str(script))
    said = capsys.readouterr().out
    assert "PAPR" in said
    assert said.rstrip().endswith("match")
