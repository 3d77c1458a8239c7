"""Pictures and pages from the command line."""

import argparse
import hashlib
from pathlib import Path

import numpy as np
import pytest

from wavegen.cli.main import run
from wavegen.cli.report_options import are_wanted, read_files, stem_of
from wavegen.core.errors import ArgumentsError

SHORT = ("harbour-link-qpsk", "--set", "duration=2000 symbols")


def test_a_measurement_with_pictures_and_a_page(tmp_path, capsys):
    words = ["measure", *SHORT, "--figures", str(tmp_path / "f")]
    words += ["--report", str(tmp_path / "r.html")]
    assert run(words) == 0
    assert "pictures in" in capsys.readouterr().out
    names = {path.name for path in (tmp_path / "f").iterdir()}
    assert {"harbour-link-qpsk.ccdf.svg", "harbour-link-qpsk.constellation.png"} <= names
    assert "<svg" in (tmp_path / "r.html").read_text()
    assert run(words) == 4
    assert run([*words, "--overwrite"]) == 0


def test_a_page_must_be_html(tmp_path, capsys):
    assert run(["measure", *SHORT, "--report", str(tmp_path / "r.pdf")]) == 2
    assert ".html" in capsys.readouterr().err


def test_nothing_is_drawn_unasked():
    assert not are_wanted(argparse.Namespace(figures=None, report=None))
    assert are_wanted(argparse.Namespace(figures=None, report=Path("x.HTML")))
    with pytest.raises(ArgumentsError):
        are_wanted(argparse.Namespace(figures=Path("x"), report=Path("x")))


@pytest.mark.parametrize(
    ("name", "stem"), [("a b.wav", "a_b"), ("../../x", "x"), ("", "figures"), ("ü.cf32", "ü")]
)
def test_names_that_files_can_have(name, stem):
    assert stem_of(name) == stem


@pytest.fixture
def pair(tmp_path):
    rng = np.random.default_rng(7)
    names = []
    for name in ("in", "out"):
        noise = rng.standard_normal(1 << 15) + 1j * rng.standard_normal(1 << 15)
        path = tmp_path / f"{name}.cf32"
        (0.1 * noise).astype("<c8").tofile(path)
        names.append(str(path))
    return [*names, "--format", "cf32_le", "--sample-rate", "1MHz"]


@pytest.mark.parametrize(("verb", "name"), [("match", "ccdf"), ("gain-curve", "gain")])
def test_comparisons_are_drawn(verb, name, pair, tmp_path, capsys):
    words = [verb, *pair, "--figures", str(tmp_path / "f"), "--report", str(tmp_path / "r.html")]
    assert run(words) in {0, 5, 6}
    said = capsys.readouterr().out
    assert "Report: " in said.replace("\n", " ")
    assert any(f".{name}.svg" in path.name for path in (tmp_path / "f").iterdir())
    page = (tmp_path / "r.html").read_text()
    assert "picture-" + name in page
    for path in pair[:2]:  # which files they were
        assert hashlib.sha512(Path(path).read_bytes()).hexdigest() in page
    assert run(words) == 4


def test_the_files_of_a_stimulus_and_of_a_pair(tmp_path):
    names = ("a.sigmf-meta", "a.sigmf-data", "a.ccdf.json", "a.ccdf.csv", "a.ci16_le", "iq.csv")
    for name in names:
        (tmp_path / name).write_text(name)
    page = tmp_path / "r.html"
    found = read_files(argparse.Namespace(report=page, stimulus=str(tmp_path), field="a-recipe"))
    told = {item["name"]: item["sha512"] for item in found["files_read"]}
    assert list(told) == ["a.ci16_le", "a.sigmf-data", "a.sigmf-meta", "iq.csv"]
    assert told["iq.csv"] == hashlib.sha512(b"iq.csv").hexdigest()
    meta = str(tmp_path / "a.sigmf-meta")
    found = read_files(argparse.Namespace(report=page, subjects=[meta, meta]))
    assert [item["name"] for item in found["files_read"]] == ["a.sigmf-meta", "a.sigmf-data"]
    assert read_files(argparse.Namespace(report=None, subjects=[meta])) == {}
