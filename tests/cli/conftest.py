"""The command, run in this process; files to run it on."""

import json
from types import SimpleNamespace

import numpy as np
import pytest

from wavegen.cli.main import run

RECIPE = """wavegen: 1
title: Pier link, a carrier for the tests
sample_rate: 4 MHz
duration: 2 ms
signal: {kind: tones, count: 8, spacing: 10 kHz, phases: newman}
"""
BENCH = """bench:
  average_power_at_device: -10 dBm
  path: [{name: amplifier, role: device, gain: 30 dB, peak_limit: LIMIT dBm}]
"""


@pytest.fixture
def call(capsys, tmp_path, monkeypatch):
    """Run the command in an empty folder; give its status and what it said."""
    monkeypatch.chdir(tmp_path)

    def call(*arguments):
        capsys.readouterr()
        status = run([str(argument) for argument in arguments])
        said = capsys.readouterr()
        assert "Traceback" not in said.err
        return SimpleNamespace(
            status=status,
            out=said.out,
            err=said.err,
            json=lambda: json.loads(said.out),
        )

    return call


@pytest.fixture
def recipe(tmp_path):
    def recipe(text=RECIPE, name="pier.yaml"):
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return path

    return recipe


@pytest.fixture
def noise(tmp_path):
    """A file of 5000 complex Gaussian samples, full scale 1, times a factor."""

    def noise(scale=1.0, name="noise.cf32_le", n=5000):
        rng = np.random.default_rng(5)
        rails = rng.standard_normal(2 * n) * np.sqrt(0.5) * scale
        path = tmp_path / name
        rails.astype("<f4").tofile(path)
        return path

    return noise


@pytest.fixture
def texts():
    return SimpleNamespace(RECIPE=RECIPE, BENCH=BENCH)
