import json
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest

from wavegen.core.errors import FileError
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording
from wavegen.production import stimulus as room
from wavegen.production.stimulus import mismatch, read_sidecar, sidecar_of


@pytest.fixture
def made(lab, tmp_path):
    return lab.make(lab.SINGLE, tmp_path)


@pytest.fixture
def recording(made):
    return open_recording(made.files[0])


def test_a_stimulus_finds_its_sidecar_from_every_file_of_it(made):
    for path in made.files[:2]:
        found = sidecar_of(open_recording(path))
        assert found == json.loads(made.files[2].read_text(encoding="utf-8"))


def test_a_recording_beside_it_has_none(made):
    other = made.folder / "other.ci16_le"
    other.write_bytes(made.files[0].read_bytes())
    hints = ReadHints(sample_rate_hz=Fraction(4_000_000))
    assert sidecar_of(open_recording(other, hints)) is None


@pytest.mark.parametrize("text", ["{", "[]", "", "\xff", "[" * 100_000])
def test_a_broken_sidecar_of_another_file_does_not_matter(made, recording, text):
    (made.folder / "a-first.ccdf.json").write_text(text)
    (made.folder / "folder.ccdf.json").mkdir()
    assert sidecar_of(recording) is not None


@pytest.mark.parametrize(
    "change",
    [
        lambda text: text[:-10],
        lambda text: text.replace('"version": 1', '"version": 2'),
        lambda text: text.replace('"n_samples": 8000', '"n_samples": "8000"', 1),
        lambda text: json.dumps(["case.sigmf-data", text]),
        lambda _: "[" * 100_000 + '"case.sigmf-data"',
        lambda _: "[" * 900 + '"case.sigmf-data"' + "]" * 900,
        lambda text: text.replace('"per_db": [', '"per_db": [-1.0, '),
        lambda text: text.replace('"per_db": [', '"per_db": ["0", '),
    ],
)
def test_a_broken_sidecar_of_this_file_is_told(made, recording, change):
    sidecar = made.files[2]
    sidecar.write_text(change(sidecar.read_text(encoding="utf-8")), encoding="utf-8")
    with pytest.raises(FileError) as caught:
        sidecar_of(recording)
    assert caught.value.where == str(sidecar)


def test_a_sidecar_that_only_speaks_of_the_file_is_not_its_own(made, recording):
    sidecar = made.files[2]
    document = json.loads(sidecar.read_text(encoding="utf-8"))
    document["title"] = "case.sigmf-data"
    document["files"][0]["name"] = "another.sigmf-data"
    sidecar.write_text(json.dumps(document), encoding="utf-8")
    assert sidecar_of(recording) is None


def test_a_sidecar_that_may_not_be_read_says_nothing(recording, monkeypatch):
    def refuse(_self):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "read_bytes", refuse)
    assert sidecar_of(recording) is None


def test_a_sidecar_beyond_all_size(made, recording, monkeypatch):
    monkeypatch.setattr(room, "LARGEST_BYTES", 1000)
    assert sidecar_of(recording) is None
    with pytest.raises(FileError, match="larger than"):
        read_sidecar(made.files[2])


def test_names_with_quotes_are_found(lab, tmp_path):
    made = lab.make(lab.CARRIER, tmp_path, name="it's µ-wave")
    assert sidecar_of(open_recording(made.files[0])) is not None


def test_a_file_of_another_length_or_rate_is_not_the_sidecars_loop(recording):
    document = sidecar_of(recording)
    assert mismatch(recording, document) is None
    assert "8000 samples" in mismatch(replace(recording, n_samples=7999), document)
    other = replace(recording, sample_rate_hz=Fraction(5_000_000))
    assert "4000000 Hz" in mismatch(other, document)
