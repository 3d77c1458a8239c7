"""Where real samples stand before and after a conversion."""

from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import ArgumentsError
from wavegen.core.render import samples_of
from wavegen.files.datatypes import CI16_LE, RI16_LE
from wavegen.files.format import ReadHints
from wavegen.production.carriage import Carriage, check_folding, plan_carriage
from wavegen.production.conversion_level import power_of
from wavegen.production.input_file import open_input

RATE = Fraction(4_000_000)
MHZ = Fraction(1_000_000)
REAL = "output: {iq: [{format: wav, real: {centre: 1 MHz}}]}\n"


@pytest.fixture
def real(lab, tmp_path):
    """A real stimulus around 1 MHz, with its sidecar."""
    return lab.make(lab.SINGLE.replace("1 MHz,", "0.5 MHz,") + REAL, tmp_path / "a")


@pytest.fixture
def complex_file(lab, tmp_path):
    return open_input(lab.make(lab.SINGLE, tmp_path / "a").files[0], ReadHints())


def planned(source, datatype, *, rate_hz=RATE, **asked):
    asked = {"centre_hz": None, "input_centre_hz": None} | asked
    n_samples = int(source.recording.n_samples * rate_hz / source.recording.sample_rate_hz)
    return plan_carriage(source, datatype, rate_hz=rate_hz, n_samples=n_samples, **asked)


def loose(made):
    """Open a stimulus as a recording: its sidecar is gone."""
    (made.folder / "case.ccdf.json").unlink()
    return open_input(made.files[0], ReadHints())


def test_complex_to_real_and_back(complex_file):
    up = planned(complex_file, RI16_LE, centre_hz=MHZ)
    assert (up.up_hz, up.shift_hz, up.from_hz, up.to_hz) == (MHZ, MHZ, None, MHZ)
    assert up.is_moved_up
    signal = complex_file.recording.signal
    samples = samples_of(up.raised(signal))
    phases = np.exp(2j * np.pi * 0.25 * np.arange(signal.n_samples))
    np.testing.assert_allclose(samples, (samples_of(signal) * phases).real, atol=1e-6)
    assert up.lowered(signal) is signal
    assert complex_file.notes == []


def test_a_loop_has_whole_cycles_and_a_recording_what_is_asked(complex_file):
    asked = Fraction(1_000_100)
    assert planned(complex_file, RI16_LE, centre_hz=asked).to_hz == MHZ
    (note,) = complex_file.notes
    assert (note.kind, note.asked, note.given) == ("rounded", "1.0001 MHz", "1 MHz")
    record = replace(complex_file, stimulus=None, notes=[])
    assert planned(record, RI16_LE, centre_hz=asked).to_hz == asked
    assert record.notes == []
    with pytest.raises(ArgumentsError, match="no room"):
        planned(record, RI16_LE, centre_hz=RATE / 2)
    assert planned(record, RI16_LE, centre_hz=Fraction(1)).to_hz == 1


def test_a_real_stimulus_becomes_baseband(real):
    source = open_input(real.files[0], ReadHints())
    down = planned(source, CI16_LE)
    assert (down.down_hz, down.up_hz, down.from_hz, down.to_hz) == (MHZ, None, MHZ, None)
    assert not down.is_moved_up
    assert "moved from 1 MHz to 0 Hz" in source.notes[-1].text
    signal = source.recording.signal
    phases = np.exp(-2j * np.pi * 0.25 * np.arange(signal.n_samples))
    np.testing.assert_allclose(
        samples_of(down.lowered(signal)), samples_of(signal) * phases, atol=1e-6
    )
    assert down.raised(signal) is signal


def test_a_real_file_of_unknown_centre_becomes_analytic(real):
    source = loose(real)
    assert planned(source, CI16_LE) == Carriage()
    assert "--input-real-centre" in source.notes[-1].text
    told = planned(source, CI16_LE, input_centre_hz=MHZ)
    assert (told.down_hz, told.from_hz) == (MHZ, MHZ)


def test_real_stays_where_it_is_or_moves(real):
    source = open_input(real.files[0], ReadHints())
    stays = planned(source, RI16_LE)
    assert (stays.shift_hz, stays.from_hz, stays.to_hz) == (0, MHZ, MHZ)
    assert not stays.is_moved_up
    moves = planned(source, RI16_LE, centre_hz=Fraction(1_200_000))
    assert (moves.down_hz, moves.up_hz, moves.shift_hz) == (MHZ, 1_200_000, 200_000)
    unknown = planned(loose(real), RI16_LE)
    assert (unknown.shift_hz, unknown.from_hz, unknown.to_hz) == (0, None, None)


def test_the_user_is_believed_over_the_sidecar(real):
    source = open_input(real.files[0], ReadHints())
    assert planned(source, CI16_LE, input_centre_hz=Fraction(1_500_000)).down_hz == 1_500_000
    assert any("its sidecar states 1 MHz" in note.text for note in source.notes)


@pytest.mark.parametrize(
    ("datatype", "asked", "where"),
    [
        (RI16_LE, {}, "--datatype"),
        (CI16_LE, {"input_centre_hz": MHZ}, "--input-real-centre"),
        (RI16_LE, {"centre_hz": RATE / 2}, "--real-centre"),
        (RI16_LE, {"centre_hz": Fraction(100)}, "--real-centre"),
        (RI16_LE, {"centre_hz": RATE}, "--real-centre"),
        (RI16_LE, {"centre_hz": MHZ, "rate_hz": 2 * MHZ}, "--real-centre"),
    ],
)
def test_what_a_complex_file_does_not_take(complex_file, datatype, asked, where):
    with pytest.raises(ArgumentsError) as caught:
        planned(complex_file, datatype, **asked)
    assert caught.value.where == where


def test_what_a_real_file_does_not_take(real):
    source = open_input(real.files[0], ReadHints())
    with pytest.raises(ArgumentsError, match="rates above 2 MHz") as caught:
        planned(source, RI16_LE, rate_hz=2 * MHZ)
    assert caught.value.where == "--sample-rate"
    with pytest.raises(ArgumentsError) as caught:
        planned(source, CI16_LE, input_centre_hz=RATE / 2)
    assert caught.value.where == "--input-real-centre"
    with pytest.raises(ArgumentsError, match="not known") as caught:
        planned(loose(real), RI16_LE, centre_hz=MHZ)
    assert "--input-real-centre" in caught.value.remedy


def folding(source, centre_hz):
    signal = source.recording.signal
    carriage = Carriage(up_hz=centre_hz, to_hz=centre_hz)
    check_folding(source, [signal], [power_of(signal)], carriage)


def test_what_would_fold_back_is_refused_and_a_little_told(lab, tmp_path):
    """A carrier at -50 dB 500 kHz above another: half the rate is 2 MHz."""
    text = lab.HEAD + (
        "signal: {kind: sum, parts: [{signal: {kind: carrier}},"
        " {frequency_offset: 500 kHz, level: -50 dB, signal: {kind: carrier}}]}\n"
    )
    source = open_input(lab.make(text, tmp_path).files[0], ReadHints())
    folding(source, MHZ)
    assert source.notes == []
    folding(source, Fraction(1_600_000))
    (note,) = source.notes
    assert (note.kind, note.where) == ("warning", "--real-centre")
    assert "-50.0 dB" in note.text
    with pytest.raises(ArgumentsError, match="fold back") as caught:
        folding(source, Fraction(1_999_000))
    assert caught.value.where == "--real-centre"
