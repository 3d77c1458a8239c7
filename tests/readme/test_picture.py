"""The README's picture is what the command beside it makes."""

import re
import shlex
from pathlib import Path

import pytest

from wavegen.cli.main import run

ROOT = Path(__file__).resolve().parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def texts(svg):
    """Return everything that is written in a drawing: title, axes, legend, levels."""
    return sorted(re.findall(r">([^<>\n]+)</text>", svg))


def test_the_command_beside_it_makes_it(tmp_path, monkeypatch):
    pytest.importorskip("matplotlib")
    (image,) = re.findall(r"^!\[([^]]+)\]\(([^)]+)\)$", README, re.MULTILINE)
    words, path = image
    assert len(words.split()) > 8  # for who cannot see it
    shown = (ROOT / path).read_text(encoding="utf-8")
    assert len(shown) < 100_000
    (command,) = re.findall(r"\(`(wavegen make [^`]+ --figures)`", README)
    monkeypatch.chdir(tmp_path)
    assert run(shlex.split(command)[1:]) == 0
    (made,) = tmp_path.glob(f"output/*/{Path(path).name}")
    assert texts(made.read_text(encoding="utf-8")) == texts(shown), (
        f"copy {made.name} of `{command}`"
    )
    assert len(texts(shown)) > 10
