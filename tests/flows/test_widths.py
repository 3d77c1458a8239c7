"""What every verb prints stays within 80 columns, for shipped recipes and for long names."""

import pytest

from wavegen.cli.main import VERBS, run
from wavegen.recipe.find import shipped_paths

NAME = "a-long-name-" * 9 + "end"
TITLE = "A pier of many words and one_word_that_goes_on_" + "and_on_" * 10
RECIPE = f"""wavegen: 1
title: {TITLE}
sample_rate: 15.36 MHz
duration: 0.5 ms
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups: [{{subcarriers: "-200..-1, 1..200", constellation: 16qam}}]
  cyclic_prefix: [72/1024]
stages:
  - {{kind: clip, ceiling: 7 dB}}
bench:
  average_power_at_device: -10 dBm
  path:
    - {{name: {"cable_" * 12}, gain: -1 dB, peak_limit: 33 dBm}}
    - {{name: amplifier, role: device, gain: 30 dB, peak_limit: 27 dBm}}
"""
STIMULUS = f"output/{NAME}/{NAME}.sigmf-meta"
COMMANDS = {
    "make": [f"{NAME}.yaml"],
    "predict": [f"{NAME}.yaml", "--fault", "0.1dB", "--at", "0.1%"],
    "measure": [STIMULUS, "--reference-level", "-10dBm", "--above", "3dB", "--gate", "auto"],
    "fidelity": [f"{NAME}.yaml", "--limits", "NR BS FR1"],
    "match": [STIMULUS, f"{NAME}.yaml"],
    "shape": [STIMULUS, "--name", "shaped"],
    "gain-curve": [STIMULUS, STIMULUS],
    "check": [f"output/{NAME}"],
    "show": [STIMULUS],
    "convert": [STIMULUS, "--to", "wav", "--name", "b-" * 55],
    "list": [],
}
"""``tune`` prints by the same tables; the rest prints for other programs, or two short lines."""


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    folder = tmp_path_factory.mktemp("pier")
    (folder / f"{NAME}.yaml").write_text(RECIPE, encoding="utf-8")
    return folder


def widest(text):
    return max(text.splitlines(), key=len)


@pytest.mark.parametrize("verb", COMMANDS)
def test_long_names(verb, folder, monkeypatch, capsys):
    assert verb in VERBS
    monkeypatch.chdir(folder)
    status = run([verb, *COMMANDS[verb]])
    said = capsys.readouterr()
    assert status in {0, 5, 6}, said.err
    assert len(widest(said.out)) <= 80, widest(said.out)


@pytest.mark.parametrize(
    ("verb", "name"),
    [
        *(("show", name) for name in shipped_paths()),
        *(("predict", name) for name in list(shipped_paths())[::4]),
    ],
)
def test_shipped_recipes(verb, name, capsys):
    """Those that are made, measured and told are in ``test_recipes.py``."""
    assert run([verb, name]) == 0
    said = capsys.readouterr().out
    assert len(widest(said)) <= 80, widest(said)
