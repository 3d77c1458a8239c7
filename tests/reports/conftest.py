"""Documents as the program makes them, small ones."""

import pytest

from wavegen.production.make import make
from wavegen.production.measure import measure_recipe
from wavegen.production.prepare import prepare
from wavegen.production.views import views_of
from wavegen.recipe.load import load_text
from wavegen.stages.channel.gate import on_time

GATED = """\
wavegen: 1
title: A <gated> carrier
sample_rate: 4 MHz
duration: 4 ms
signal:
  kind: single_carrier
  constellation: qpsk
  symbol_rate: 1 MHz
  pulse: {kind: root_raised_cosine, roll_off: 0.22}
stages:
  - {kind: gate, duty: 50 %, period: 1 ms, ramp: 64 samples}
bench:
  average_power_at_device: -20 dBm
  path:
    - {name: cable, gain: -1 dB, peak_limit: 30 dBm}
    - {name: amplifier, role: device, gain: 30 dB}
"""


@pytest.fixture(scope="session")
def gated():
    return prepare(load_text(GATED, name="gated"))


@pytest.fixture(scope="session")
def gated_views(gated):
    signal = gated.built.signal
    return views_of(signal, loops=True, graph=signal, bursts=on_time(signal))


@pytest.fixture(scope="session")
def made_document(tmp_path_factory):
    loaded = load_text(GATED, name="gated")
    return make(loaded, out=tmp_path_factory.mktemp("made")).document


@pytest.fixture(scope="session")
def measured_document(gated):
    return measure_recipe(gated)
