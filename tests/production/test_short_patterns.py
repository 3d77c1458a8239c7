"""Data that repeat too soon, told by `make` with numbers."""

import pytest

from wavegen.production.judgement import Question, law_of
from wavegen.production.short_patterns import short_patterns

PRBS = "data: {kind: prbs, sequence: NAME}"


def found(lab, text, down_to=1e-4):
    prepared = lab.prepared(text)
    laws = [law_of(channel) for channel in prepared.channels]
    return short_patterns(prepared.channels, laws, down_to=down_to)


def carrier(lab, data):
    return f"{{{lab.QPSK}, {data}}}"


def one(lab, data):
    return lab.HEAD + f"signal: {carrier(lab, data)}\n"


@pytest.mark.parametrize(
    ("sequence", "down_to", "said"),
    [
        ("pn9", 1e-4, ("511 bits", "1.96 %", "0.01 %", "1e+05 bits", "pn20 has 1048575")),
        ("pn9", 0.02, None),
        ("pn9", 0.019, ("1.96 %", "1.9 %", "pn11 has 2047")),
        ("pn15", 1e-4, ("0.0305 %",)),
        ("pn15", 1e-3, None),
        ("pn20", 1e-4, None),
        ("pn31", 1e-9, ("only random data",)),
    ],
)
def test_a_sequence(lab, sequence, down_to, said):
    notes = found(lab, one(lab, PRBS.replace("NAME", sequence)), down_to)
    if said is None:
        assert notes == []
        return
    (note,) = notes
    assert (note.kind, note.where) == ("warning", "signal.data")
    for words in said:
        assert words in note.text


def test_a_pattern_and_random_data(lab):
    (note,) = found(lab, one(lab, 'data: {kind: pattern, bits: "1100"}'))
    assert "4 bits" in note.text
    assert "nothing of random data" in note.text
    assert found(lab, lab.SINGLE) == []


def test_parts_groups_and_channels_have_their_places(lab):
    parts = [f"{{signal: {carrier(lab, PRBS.replace('NAME', name))}}}" for name in ("pn9", "pn11")]
    both = lab.HEAD + f"signal: {{kind: sum, parts: [{', '.join(parts)}]}}\n"
    second = f"second_channel: {{signal: {carrier(lab, PRBS.replace('NAME', 'pn15'))}}}\n"
    places = [note.where for note in found(lab, both + second)]
    assert places == [
        "signal.parts[0].signal.data",
        "signal.parts[1].signal.data",
        "second_channel.signal.data",
    ]
    group = f"{{subcarriers: '-20..-1', constellation: qpsk, {PRBS.replace('NAME', 'pn9')}}}"
    ofdm = (
        "signal: {kind: ofdm, subcarrier_spacing: 62.5 kHz, cyclic_prefix: [1/16], "
        f"groups: [{group}, {group.replace('-20..-1', '1..20')}]}}\n"
    )
    (note,) = found(lab, lab.HEAD + ofdm)
    assert note.where == "signal.groups[0].data"


def test_a_constant_envelope_is_the_same_for_all_data(lab):
    text = (
        "signal: {kind: phase_modulation, scheme: msk, symbol_rate: 0.5 MHz, "
        f"{PRBS.replace('NAME', 'pn9')}}}\n"
    )
    assert found(lab, lab.HEAD + text) == []


def test_make_says_it(lab, tmp_path):
    text = one(lab, PRBS.replace("NAME", "pn9")).replace("2 ms", "2 PRBS periods")
    (row,) = lab.make(text, tmp_path).document["warnings"]
    assert "1.96 %" in row["text"]
    asked = Question(down_to=0.02)
    assert lab.make(text, tmp_path / "b", question=asked).document["warnings"] == []
