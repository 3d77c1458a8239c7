import json

import pytest

from wavegen.production.symbol_plan import described_recipe, symbol_plan

OFDM = """wavegen: 1
sample_rate: 1.92 MHz
duration: 28 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups: [{subcarriers: "-30..-1, 1..30", constellation: qpsk}]
  cyclic_prefix: [10/128, 6 x 9/128]
"""


def test_symbols_of_a_recipe_and_their_law(lab):
    plan = symbol_plan(lab.prepared(OFDM))
    assert plan.prefixed.layout.n_fft == 128
    assert "crossing" in plan.law.name.lower()


@pytest.mark.parametrize("stage", ["{kind: clip, ceiling: 6 dB}", "{kind: scale, gain: -3 dB}"])
def test_behind_stages_symbols_stand_where_they_did_without_a_law(lab, stage):
    plan = symbol_plan(lab.prepared(OFDM + f"stages: [{stage}]\n"))
    assert plan.prefixed is not None
    assert plan.law is None


@pytest.mark.parametrize(
    "stage", ["{kind: delay, delay: 3 us}", "{kind: resample, input_rate: 3.84 MHz}"]
)
def test_no_plan_where_symbols_have_moved(lab, stage):
    text = OFDM + f"stages: [{stage}]\n"
    assert symbol_plan(lab.prepared(text)) is None


def test_other_sources_have_no_symbols(lab):
    assert symbol_plan(lab.prepared(lab.SINGLE)) is None


def test_the_recipe_of_a_sidecar(lab, tmp_path):
    lab.make(OFDM, tmp_path)
    (path,) = tmp_path.rglob("*.ccdf.json")
    sidecar = json.loads(path.read_text())
    found = described_recipe(sidecar, path.parent, 0)
    assert symbol_plan(found).prefixed.layout.n_symbols == 7
    assert described_recipe(sidecar, path.parent, 1) is None
    assert described_recipe(sidecar | {"n_samples": 5}, path.parent, 0) is None
    broken = sidecar | {"recipe": sidecar["recipe"] | {"text": "wavegen: 2"}}
    assert described_recipe(broken, path.parent, 0) is None
