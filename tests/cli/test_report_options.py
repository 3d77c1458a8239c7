"""Pictures and pages from the command line."""

import argparse
from pathlib import Path

import numpy as np
import pytest

from wavegen.cli.main import run
from wavegen.cli.report_options import are_wanted, stem_of
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
    assert "picture-" + name in (tmp_path / "r.html").read_text()
    assert run(words) == 4
