"""EVM and ACLR by the series, beside what the codes of a simulation show."""

import numpy as np
import pytest

from wavegen.production.fidelity import recipe_fidelity
from wavegen.production.predict import predict

OFDM = """\
wavegen: 1
sample_rate: 30.72 MHz
duration: 18 ms
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups: [{subcarriers: "-150..-1, 1..150", constellation: qpsk}]
  cyclic_prefix: 144/2048
  edge_window: 72/2048
"""
STAGES = {
    "clip": "[{kind: clip, ceiling: 5 dB}]",
    "rapp": "[{kind: rapp, smoothness: 2, input_back_off: 5 dB}]",
    "saleh": "[{kind: saleh, input_back_off: 12 dB}]",
    "two": "[{kind: clip, ceiling: 6 dB}, {kind: rapp, smoothness: 3, input_back_off: 6 dB}]",
}


def predicted(lab, text):
    return predict(lab.load(text))["distortion"]


@pytest.mark.parametrize("name", STAGES)
def test_the_series_agrees_with_simulation(lab, name):
    text = OFDM + f"stages: {STAGES[name]}\n"
    found = predicted(lab, text)
    seen = recipe_fidelity(lab.load(text))
    # 252 symbols of 300 subcarriers, clipped where 1 in 25 stands: 3000 events, whose squares
    # scatter the power of the error by some 3 %, 0.12 dB; the published agreement is 0.1 dB.
    evm = 20 * np.log10(
        found["evm_in_band_percent"] / seen.after.fidelity.evm[0].overall.fitted_percent
    )
    total = 20 * np.log10(found["evm_percent"] / seen.after.fidelity.total.fitted_percent)
    assert evm == pytest.approx(0, abs=0.2)
    assert total == pytest.approx(0, abs=0.2)
    (own,) = found["aclr"]
    for row in seen.after.fidelity.aclr.ratios:
        assert own["aclr_db"] == pytest.approx(row.ratio_db, abs=0.2)


def test_what_does_not_distort_changes_nothing(lab):
    clip = "{kind: clip, ceiling: 5 dB}]\n"
    plain = predicted(lab, f"{OFDM}stages: [{clip}")
    late = predicted(lab, f"{OFDM}stages: [{{kind: delay, delay: 5 samples}}, {clip}")
    assert late["evm_percent"] == plain["evm_percent"]
    assert late["aclr"][0]["aclr_db"] == pytest.approx(plain["aclr"][0]["aclr_db"], abs=0.01)


CARRIER = (
    "{kind: single_carrier, constellation: qpsk, symbol_rate: 1 MHz, "
    "pulse: {kind: root_raised_cosine, roll_off: 0.22}}"
)
TWO_BANDS = (
    "{kind: sum, parts: [{frequency_offset: -1 MHz, signal: {kind: noise, bandwidth: 300 kHz}}, "
    "{frequency_offset: 1 MHz, level: -6 dB, signal: {kind: noise, bandwidth: 500 kHz}}]}"
)


@pytest.mark.parametrize(
    ("signal", "words"),
    [(CARRIER, "not like complex Gaussian"), (TWO_BANDS, "one flat band")],
)
def test_what_the_series_does_not_hold_for_says_so(lab, signal, words):
    text = f"{lab.HEAD}signal: {signal}\nstages: [{{kind: clip, ceiling: 4 dB}}]\n"
    assert words in predicted(lab, text)["says"]


def test_nothing_is_said_where_nothing_distorts(lab):
    assert predicted(lab, lab.NOISE) is None
    assert predicted(lab, lab.SINGLE) is None
    tones = f"{lab.TONES}stages: [{{kind: clip, ceiling: 2 dB}}]\n"
    assert predicted(lab, tones) is None  # its law is that of its own samples
