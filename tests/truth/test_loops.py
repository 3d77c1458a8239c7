"""Every family of sources loops without a seam, and a record that does not is told apart.

The rule: out-of-band power of a Kaiser-windowed stretch over the seam is at most 3 dB above the
largest of 20 such stretches at the same place relative to symbol edges, or below the floor of
-125 dBc; a record cut so that it breaks the loop exceeds that by 20 dB. Derivation: a jump of the
size of the signal itself spreads over all bins, at about -20 log10(stretch) dBc in each.
"""

from __future__ import annotations

import pytest

from wavegen.core.excerpt import excerpt
from wavegen.meters.seam import MARGIN_DB, seam_figure
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text

HEAD = "wavegen: 1\nsample_rate: 8 MHz\nduration: 16 ms\n"
OFDM = """\
signal:
  kind: ofdm
  subcarrier_spacing: 15.625 kHz
  groups: [{subcarriers: "-60..-1, 1..60", constellation: 16qam}]
  cyclic_prefix: 96/512
  edge_window: 80/512
"""
FAMILIES = {
    "single_carrier": "signal: {kind: single_carrier, constellation: 16qam, symbol_rate: 1 MHz}\n",
    "single_carrier at 120/13": """\
signal: {kind: single_carrier, constellation: qpsk, symbol_rate: 2600/3 kHz}
""",
    "ofdm": OFDM,
    "tones": "signal: {kind: tones, count: 16, spacing: 31.25 kHz, phases: newman}\n",
    "noise": "signal: {kind: noise, bandwidth: 1 MHz}\n",
    "carrier": """\
signal: {kind: sum, parts: [{frequency_offset: 100 kHz, signal: {kind: carrier}}]}
""",
    "phase_modulation": """\
signal: {kind: phase_modulation, scheme: gmsk, bt: 0.3, symbol_rate: 1 MHz}
""",
    "sum": """\
signal:
  kind: sum
  parts:
    - {frequency_offset: 1 MHz, signal: {kind: noise, bandwidth: 500 kHz}}
    - frequency_offset: -1 MHz
      signal: {kind: single_carrier, constellation: qpsk, symbol_rate: 500 kHz}
""",
}


@pytest.mark.parametrize("family", FAMILIES)
def test_the_loop_closes_and_a_cut_record_does_not(family):
    prepared = prepare(load_text(HEAD + FAMILIES[family], name="loop"))
    signal, cycle = prepared.built.signal, prepared.cycle_samples
    whole = seam_figure(signal, cycle_samples=cycle)
    assert whole.n_stretches == 20
    assert whole.excess_db <= MARGIN_DB or whole.at_seam_dbc < whole.floor_dbc
    # 139 samples: no whole number of symbols, tone periods or cycles of the offsets used here.
    cut = seam_figure(excerpt(signal, 0, signal.n_samples - 139), cycle_samples=cycle)
    assert cut.excess_db > MARGIN_DB + 20
    assert cut.at_seam_dbc > cut.floor_dbc
