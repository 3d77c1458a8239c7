"""What the README says of its own verification is not more than there is."""

import re
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]


def test_there_are_as_many_truths_as_it_says():
    (said,) = re.findall(r"more than (\d+) of them", (ROOT / "README.md").read_text("utf-8"))
    rows = [
        line
        for path in (ROOT / "tests" / "truth").glob("*.md")
        for line in path.read_text("utf-8").splitlines()
        if line.startswith("| ") and not line.startswith("| check ")
    ]
    assert len(rows) > int(said)


def test_files_it_names_are_there():
    text = (ROOT / "README.md").read_text("utf-8")
    named = set(re.findall(r"`(tests/[\w./-]+)`", text)) | {"DEVELOPERS.md"}
    assert len(named) > 2
    assert [name for name in named if not (ROOT / name).exists()] == []
