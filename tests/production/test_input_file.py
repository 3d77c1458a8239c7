from fractions import Fraction

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files.format import Annotation, ReadHints
from wavegen.production.input_file import moved, open_input

NO_HINTS = ReadHints()
RATE = Fraction(4_000_000)
RAW = "output: {iq: [{format: raw, datatype: ci8}]}\n"


@pytest.fixture
def made(lab, tmp_path):
    return lab.make(lab.TONES + RAW, tmp_path)


def test_a_stimulus_is_a_loop(made):
    found = open_input(made.files[0], NO_HINTS)
    assert found.loops
    assert found.recording.sample_rate_hz == RATE
    assert found.sha512 == made.document["files"][0]["sha512"]
    assert found.notes == []
    assert [mark.label for mark in found.marks()] == ["period start"]
    assert found.stem == "case"


def test_other_bytes_are_a_recording(made):
    content = bytearray(made.files[0].read_bytes())
    content[100] ^= 1
    made.files[0].write_bytes(content)
    found = open_input(made.files[0], NO_HINTS)
    assert not found.loops
    (note,) = found.notes
    assert "as a recording" in note.text


def test_another_rate_is_a_recording(made):
    found = open_input(made.files[0], ReadHints(sample_rate_hz=RATE + 1))
    assert not found.loops


def test_the_rate_of_the_output_is_that_of_a_file_without_one(tmp_path):
    path = tmp_path / "x.ci8"
    path.write_bytes(bytes(20))
    with pytest.raises(FileError, match="rate"):
        open_input(path, NO_HINTS)
    assert open_input(path, NO_HINTS, output_rate_hz=RATE).recording.sample_rate_hz == RATE
    told = open_input(path, ReadHints(sample_rate_hz=Fraction(5)), output_rate_hz=RATE)
    assert told.recording.sample_rate_hz == 5


def test_a_file_that_states_its_rate_keeps_it(lab, tmp_path):
    made = lab.make(lab.TONES, tmp_path)
    made.files[2].unlink()
    found = open_input(made.files[0], NO_HINTS, output_rate_hz=Fraction(1))
    assert found.recording.sample_rate_hz == RATE
    assert not found.loops


def test_power_alone_is_refused(tmp_path):
    path = tmp_path / "power.csv"
    path.write_text("time [s],power [dBm]\n0,1\n1e-6,2\n2e-6,3\n")
    with pytest.raises(FileError, match="power"):
        open_input(path, NO_HINTS)


def test_markers_of_a_file_beside_it(tmp_path):
    path = tmp_path / "x.ci8"
    np.zeros(40, "i1").tofile(path)
    hints = ReadHints(sample_rate_hz=RATE)
    assert open_input(path, hints).marks() == ()
    beside = tmp_path / "x.markers.csv"
    beside.write_text("start_sample,n_samples,label\n3,4,slot\n")
    (mark,) = open_input(path, hints).marks()
    assert (mark.start_sample, mark.n_samples, mark.label) == (3, 4, "slot")
    beside.write_text("start_sample,n_samples,label\n30,4,slot\n")
    with pytest.raises(FileError):
        open_input(path, hints).marks()


def test_markers_move_with_the_rate():
    marks = (
        Annotation(start_sample=0, n_samples=100),
        Annotation(start_sample=33, n_samples=10, label="a"),
        Annotation(start_sample=99),
        Annotation(start_sample=-1),
        Annotation(start_sample=50, n_samples=60),
        Annotation(start_sample=150, n_samples=1),
    )
    found = [(mark.start_sample, mark.n_samples) for mark in moved(marks, Fraction(3, 2), 150)]
    assert found == [(0, 150), (49, 16), (148, None), (75, 75)]
    assert moved(marks[:3], Fraction(1), 100) == marks[:3]
    assert moved(marks, Fraction(3, 2), 150)[1].label == "a"


def test_the_folder_or_the_sidecar_of_a_stimulus(lab, made, tmp_path):
    for path in (made.folder, made.folder / "case.ccdf.json"):
        found = open_input(path, NO_HINTS)
        assert (found.recording.path, found.loops) == (made.files[0], True)
    two = lab.make(lab.TONES + "output: {iq: [sigmf, wav]}\n", tmp_path / "two")
    with pytest.raises(FileError, match="2 files") as caught:
        open_input(two.folder, NO_HINTS)
    assert "case.wav" in caught.value.allowed
    with pytest.raises(FileError, match="no sidecars"):
        open_input(tmp_path, NO_HINTS)
