"""Symbols for looking at."""

import numpy as np
import pytest

from wavegen.meters.symbol_clouds import symbol_clouds
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text

CARRIER = """\
wavegen: 1
sample_rate: 4 MHz
duration: 2000 symbols
signal:
  kind: single_carrier
  constellation: 16qam
  symbol_rate: 1 MHz
  pulse: {kind: root_raised_cosine, roll_off: 0.22}
"""
OFDM = """\
wavegen: 1
sample_rate: 1.024 MHz
duration: 40 symbols
signal:
  kind: ofdm
  subcarrier_spacing: 8 kHz
  groups:
    - {subcarriers: "-20..-1", constellation: qpsk}
    - {subcarriers: "1..20", constellation: 64qam, level: 3 dB}
  cyclic_prefix: 1/8
stages:
  - {kind: clip, ceiling: 6 dB}
"""


def clouds(text):
    return symbol_clouds(prepare(load_text(text, name="x")).built.signal)


def test_a_carrier_shows_its_sixteen_points():
    (cloud,) = clouds(CARRIER)
    assert cloud.received.size == 2000
    assert cloud.evm_percent < 0.01
    assert np.unique(np.round(cloud.ideal, 4)).size == 16
    assert np.mean(np.abs(cloud.ideal) ** 2) == pytest.approx(1, rel=1e-5)
    assert cloud.label == "symbols, 16qam"


def test_groups_are_apart_and_each_has_unit_power():
    low, high = clouds(OFDM)
    assert (low.constellation, high.constellation) == ("qpsk", "64qam")
    for cloud, order in ((low, 4), (high, 64)):
        assert np.unique(np.round(cloud.ideal, 4)).size == order
        assert np.mean(np.abs(cloud.ideal) ** 2) == pytest.approx(1, rel=1e-5)
    # the clip's error is white over the band, so the weaker group suffers more, by 3 dB
    assert low.evm_percent / high.evm_percent == pytest.approx(10 ** (3 / 20), rel=0.15)
    assert 2 < low.evm_percent < 15


def test_noise_has_no_symbols():
    head = "wavegen: 1\nsample_rate: 1 MHz\nduration: 1 ms\n"
    assert clouds(head + "signal: {kind: noise, bandwidth: 0.5 MHz}\n") == []
