"""Lengths in whole periods of the data."""

import pytest

from wavegen.core.errors import RecipeError
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text

QPSK = """\
wavegen: 1
sample_rate: 4 MHz
duration: LENGTH
signal:
  kind: single_carrier
  constellation: qpsk
  symbol_rate: 1 MHz
  data: {kind: prbs, sequence: pn9}
"""


def prepared(text, length):
    return prepare(load_text(text.replace("LENGTH", length)))


def test_two_bits_a_symbol_need_two_periods():
    found = prepared(QPSK, "2 PRBS periods")
    assert found.site.n_samples == 511 * 4
    assert found.notes == []


def test_half_a_loop_is_rounded_and_said():
    found = prepared(QPSK, "1 PRBS period")
    assert found.site.n_samples == 511 * 4
    assert [note.kind for note in found.notes] == ["rounded"]
    assert found.notes[0].asked == "1 PRBS period"


def test_a_multiple_counts_too():
    found = prepared(QPSK, '{at: 10 PRBS periods, multiple: "16 samples"}')
    assert found.site.n_samples % 16 == 0
    assert found.site.n_samples % (511 * 4) == 0


@pytest.mark.parametrize("data", ["random", "{kind: random}"])
def test_random_data_have_no_period(data):
    with pytest.raises(RecipeError) as caught:
        prepared(QPSK.replace("{kind: prbs, sequence: pn9}", data), "1 PRBS period")
    assert "duration" in caught.value.where
    assert "without a period" in caught.value.problem


def test_ofdm_counts_the_bits_of_its_symbols():
    text = """\
wavegen: 1
sample_rate: 1.92 MHz
duration: LENGTH
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups:
    - {subcarriers: "1..7", constellation: bpsk, data: {kind: prbs, sequence: pn9}}
    - {subcarriers: "-7..-1", constellation: qpsk}
  cyclic_prefix: 9/128
"""
    # 7 bits a symbol divide 511: 73 symbols hold one period.
    assert prepared(text, "3 PRBS periods").site.n_samples == 3 * 73 * 137


def test_a_sum_holds_whole_periods_of_all_parts():
    part = QPSK[QPSK.index("  kind") :].replace("\n", "\n      ").rstrip()
    text = f"""\
wavegen: 1
sample_rate: 4 MHz
duration: LENGTH
signal:
  kind: sum
  parts:
    - frequency_offset: 1 MHz
      signal:
      {part}
    - signal: {{kind: phase_modulation, scheme: msk, symbol_rate: 1 MHz,
               data: {{kind: pattern, bits: "1100"}}}}
"""
    n_samples = prepared(text, "8 PRBS periods").site.n_samples
    assert n_samples % (511 * 4) == 0
    assert n_samples % 16 == 0


def test_behind_a_change_of_rate():
    text = QPSK.replace("sample_rate: 4 MHz", "sample_rate: 6 MHz")
    text += "stages: [{kind: resample, input_rate: 4 MHz}]\n"
    assert prepared(text, "2 PRBS periods").site.n_samples == 511 * 6
