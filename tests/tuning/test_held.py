"""A signal held in scratch is the same signal, and still says what it is made of."""

import numpy as np
import pytest

from wavegen.core.evaluate import evaluate
from wavegen.core.render import samples_of
from wavegen.core.symbol_bodies import HasBodies
from wavegen.meters.evm_probe import measure_evm
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text
from wavegen.tuning.held import held

SUM = """wavegen: 1
sample_rate: 8 MHz
duration: 2 ms
signal:
  kind: sum
  parts:
    - {frequency_offset: -1 MHz, signal: {kind: single_carrier, constellation: qpsk,
       symbol_rate: 500 kHz}}
    - {frequency_offset: 2 MHz, signal: {kind: noise, bandwidth: 500 kHz}}
"""


@pytest.mark.parametrize("which", ["sum", "cell"])
def test_the_same_samples_and_symbols(tmp_path, made, which):
    signal = prepare(load_text(SUM if which == "sum" else made.CELL)).built.signal
    with held(signal, folder=tmp_path, workers=2) as kept:
        assert np.array_equal(samples_of(kept), samples_of(signal))
        assert isinstance(kept, HasBodies) == (which == "cell")
        assert len(list(tmp_path.iterdir())) == 1
    assert list(tmp_path.iterdir()) == []


def test_nothing_of_the_original_is_computed(tmp_path):
    signal = prepare(load_text(SUM)).built.signal
    with held(signal, folder=tmp_path) as kept:
        made = {}
        evaluate({kept: (0, 1000)}, made=made)
        assert {item: n for item, n in made.items() if n} == {kept: 1000}


def test_symbols_are_still_found(tmp_path, made):
    signal = prepare(load_text(made.CELL)).built.signal
    with held(signal, folder=tmp_path) as kept:
        (found,) = measure_evm(kept)
        assert found.percent < 0.01
