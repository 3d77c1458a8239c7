from wavegen.production.marking import MOST_MARKERS, markers_of
from wavegen.production.prepare import prepare
from wavegen.recipe.load import load_text

GATED = """\
wavegen: 1
sample_rate: 1 MHz
duration: 4 ms
signal: {kind: carrier}
stages:
  - {kind: gate, duty: 25 %, period: 1 ms, ramp: 10 us}
"""

OFDM = """\
wavegen: 1
sample_rate: 1.92 MHz
duration: 2 ms
signal:
  kind: ofdm
  subcarrier_spacing: 15 kHz
  groups: [{subcarriers: "-36..-1, 1..36", constellation: qpsk}]
  cyclic_prefix: [160/2048, 6 x 144/2048]
"""


def found(text):
    prepared = prepare(load_text(text))
    return prepared, [(m.label, m.start_sample, m.n_samples) for m in markers_of(prepared)]


def test_bursts_of_a_gate():
    _, rows = found(GATED)
    assert rows[0] == ("period start", 0, 4000)
    assert rows[1:] == [("burst on", start, 250) for start in (0, 1000, 2000, 3000)]


def test_frames_of_ofdm_and_of_nothing_else():
    _, rows = found(OFDM)
    assert rows == [("period start", 0, 3840)] + [("frame", k * 960, 960) for k in range(4)]
    _, rows = found(GATED.partition("stages")[0])
    assert rows == [("period start", 0, 4000)]


def test_too_many_are_left_out_with_a_note():
    text = GATED.replace("duration: 4 ms", "duration: 200 ms")
    text = text.replace("period: 1 ms, ramp: 10 us", "period: 16 us, ramp: 1 us")
    prepared, rows = found(text)
    assert MOST_MARKERS < 200_000 // 16
    assert [label for label, _, _ in rows] == ["period start"]
    assert any("left out" in note.text for note in prepared.notes)
