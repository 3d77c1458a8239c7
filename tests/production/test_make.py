import errno
import hashlib
import multiprocessing
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np
import pytest

from wavegen.core import render as render_room
from wavegen.core import stored
from wavegen.core.errors import FileError, RecipeError, SignalError
from wavegen.files import FORMATS
from wavegen.files.format import Annotation

SUM = """signal:
  kind: sum
  parts:
    - {name: a, frequency_offset: -1 MHz, signal: {QPSK}}
    - {frequency_offset: 1 MHz, level: -3 dB, signal: {kind: noise, bandwidth: 500 kHz}}
stages: [{kind: clip, ceiling: 6 dB}]
output: {iq: [sigmf, {format: wav, datatype: float32}], peak: -1 dBFS}
"""


def hashes(made):
    return [
        hashlib.sha512(path.read_bytes()).hexdigest()
        for path in made.files
        if path.suffix in {".sigmf-data", ".wav"}
    ]


@pytest.fixture(scope="module")
def both(lab):
    return lab.HEAD.replace("2 ms", "40 ms") + SUM.replace("QPSK", lab.QPSK)


@pytest.fixture(scope="module")
def reference(lab, both, tmp_path_factory):
    return lab.make(both, tmp_path_factory.mktemp("reference"))


def test_what_is_left_is_what_was_told(lab, reference):
    names = [path.name for path in reference.files]
    assert names == [
        "case.sigmf-data", "case.sigmf-meta", "case.wav", "case.ccdf.json", "case.ccdf.csv",
        "case.markers.csv",
    ]  # fmt: skip
    assert lab.left_in(reference.folder) == sorted(names)
    assert not reference.differs


@pytest.fixture
def short_strips(monkeypatch):
    """Let 160 000 samples be ten strips, so that there is work to share."""
    monkeypatch.setattr(render_room, "strip_length", lambda _: 1 << 14)


@pytest.mark.parametrize("workers", [1, 2, 5])
@pytest.mark.usefixtures("short_strips")
def test_threads_do_not_change_a_byte(lab, both, reference, tmp_path, workers):
    made = lab.make(both, tmp_path, workers=workers)
    assert hashes(made) == hashes(reference)
    assert made.document == reference.document


@pytest.mark.usefixtures("short_strips")
def test_processes_do_not_change_a_byte(lab, both, reference, tmp_path):
    context = multiprocessing.get_context("spawn")
    with ProcessPoolExecutor(2, mp_context=context) as executor:
        for workers in (1, 2, 5):
            made = lab.make(both, tmp_path / str(workers), workers=workers, executor=executor)
            assert hashes(made) == hashes(reference)
            assert made.document == reference.document


def test_the_seed_and_an_override_change_the_file(lab, both, reference, tmp_path):
    made = lab.make(both, tmp_path, overrides=["seed=2"])
    assert hashes(made) != hashes(reference)
    assert made.document["recipe"]["overrides"] == ["seed=2"]
    assert made.document["seed"] == 2


def test_existing_files_are_kept_unless_told(lab, tmp_path):
    first = lab.make(lab.SINGLE, tmp_path)
    before = [path.read_bytes() for path in first.files]
    with pytest.raises(FileError) as caught:
        lab.make(lab.SINGLE, tmp_path, overrides=["seed=2"])
    assert "--overwrite" in caught.value.remedy
    assert [path.read_bytes() for path in first.files] == before
    second = lab.make(lab.SINGLE, tmp_path, overrides=["seed=2"], overwrite=True)
    assert second.files == first.files
    assert [path.read_bytes() for path in first.files] != before
    assert len(lab.left_in(first.folder)) == len(first.files)


@pytest.mark.parametrize("task", ["rendering", "writing case.wav"])
@pytest.mark.parametrize("error", [KeyboardInterrupt, RuntimeError])
def test_an_interruption_leaves_nothing_behind(lab, both, tmp_path, task, error):
    def stop(name, done, _total):
        if name == task and done:
            raise error

    with pytest.raises(error):
        lab.make(both, tmp_path, progress=stop, workers=2)
    assert lab.left_in(tmp_path) == []


def test_an_interruption_while_overwriting_keeps_what_was_there(lab, tmp_path):
    made = lab.make(lab.SINGLE, tmp_path)
    before = [path.read_bytes() for path in made.files]

    def stop(name, _done, _total):
        if name.startswith("writing"):
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        lab.make(lab.SINGLE, tmp_path, overrides=["seed=2"], overwrite=True, progress=stop)
    assert [path.read_bytes() for path in made.files] == before
    assert len(lab.left_in(made.folder)) == len(made.files)


def test_a_writer_that_is_interrupted_leaves_nothing_behind(lab, tmp_path, monkeypatch):
    form = FORMATS.load("sigmf")
    plain = form.writer

    def writer(self, drafts, facts):
        made = plain(self, drafts, facts)

        def write(_self, _codes):
            raise KeyboardInterrupt

        monkeypatch.setattr(type(made), "write", write)
        return made

    monkeypatch.setattr(form, "writer", writer)
    with pytest.raises(KeyboardInterrupt):
        lab.make(lab.SINGLE, tmp_path)
    assert lab.left_in(tmp_path) == []


def test_a_disk_that_is_too_small_is_told_before_the_work(lab, tmp_path, monkeypatch):
    usage = type("Usage", (), {"free": 63_999})()
    monkeypatch.setattr(stored.shutil, "disk_usage", lambda _: usage)
    with pytest.raises(FileError) as caught:
        lab.make(lab.SINGLE, tmp_path)  # 8000 samples of 8 bytes
    assert "scratch" in caught.value.problem
    assert lab.left_in(tmp_path) == []


def test_a_disk_that_fills_up_meanwhile(lab, tmp_path, monkeypatch):
    def full(_self, _samples):
        raise FileError(
            where="x", problem="no space", allowed="space", remedy="Free some disk."
        ) from OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(stored.Scratch, "write", full)
    with pytest.raises(FileError, match="no space"):
        lab.make(lab.SINGLE, tmp_path)
    assert lab.left_in(tmp_path) == []


def test_a_sidecar_that_cannot_be_written_takes_the_files_with_it(lab, tmp_path, monkeypatch):
    plain = Path.write_text

    def write_text(self, text, **options):
        if "ccdf.csv" in self.name:
            raise OSError(errno.ENOSPC, "No space left on device")
        return plain(self, text, **options)

    monkeypatch.setattr(Path, "write_text", write_text)
    with pytest.raises(FileError) as caught:
        lab.make(lab.SINGLE, tmp_path)
    assert "case.ccdf.csv" in caught.value.where
    assert lab.left_in(tmp_path) == []


def test_an_output_folder_that_cannot_be(lab, tmp_path):
    (tmp_path / "file").write_text("x")
    with pytest.raises(FileError) as caught:
        lab.make(lab.SINGLE, tmp_path / "file")
    assert str(tmp_path / "file") in caught.value.where
    assert lab.left_in(tmp_path) == ["file"]


def test_a_folder_without_permission(lab, tmp_path, monkeypatch):
    monkeypatch.setattr("wavegen.files.atomic.os.access", lambda *_: False)
    with pytest.raises(FileError, match="cannot be written"):
        lab.make(lab.SINGLE, tmp_path / "out")


def test_two_files_of_one_name(lab, tmp_path):
    text = lab.SINGLE + "output: {iq: [sigmf, {format: sigmf, datatype: ci16_le}]}\n"
    with pytest.raises(RecipeError):
        lab.make(text, tmp_path)
    names = "{format: sigmf, name: a}, {format: sigmf, datatype: cf32_le, name: A}"
    with pytest.raises(RecipeError):
        lab.make(lab.SINGLE + f"output: {{iq: [{names}]}}\n", tmp_path)
    assert lab.left_in(tmp_path) == []


def test_files_of_one_format_and_several_datatypes_stand_side_by_side(lab, tmp_path):
    ask = "[sigmf, {format: sigmf, datatype: cf32_le}, {format: raw, bits: 12, align: left}, raw]"
    made = lab.make(lab.SINGLE + f"output: {{iq: {ask}}}\n", tmp_path)
    assert [item["name"] for item in made.document["files"]] == [
        "case.sigmf-data", "case.cf32_le.sigmf-data", "case.ci16_le", "case.ci16_le.ci16_le",
    ]  # fmt: skip
    assert all(path.is_file() for path in made.files)
    # A name of the recipe's own goes first; what would collide with it gives way.
    ask = "[sigmf, {format: sigmf, datatype: cf32_le, name: Case}]"
    made = lab.make(lab.SINGLE + f"output: {{iq: {ask}}}\n", tmp_path / "own")
    names = [item["name"] for item in made.document["files"]]
    assert names == ["case.ci16_le.sigmf-data", "Case.sigmf-data"]


def test_words_shorter_than_their_containers(lab, tmp_path):
    ask = "[raw, {format: raw, bits: 14, align: left}, {format: raw, bits: 14, align: right}]"
    made = lab.make(lab.SINGLE + f"output: {{iq: {ask}, peak: -1 dBFS}}\n", tmp_path)
    wide, left, right = (np.fromfile(path, "<i2").astype(int) for path in made.files[:3])
    assert np.all(left == 4 * right)
    assert np.abs(right).max() < 1 << 13
    assert np.abs(wide - left).max() <= 3  # half a step of 4 each, and half a code
    said = [(item["datatype"], item["bits"], item["align"]) for item in made.document["files"]]
    assert said == [("ci16_le", None, None), ("ci16_le", 14, "left"), ("ci16_le", 14, "right")]
    noise = [item["rounding_noise_dbc"] for item in made.document["files"]]
    assert noise[1] == noise[2] == pytest.approx(noise[0] + 20 * np.log10(4), abs=1e-3)


def test_markers_are_checked_before_they_are_written(lab, tmp_path, monkeypatch):
    wrong = (Annotation(start_sample=9000, label="burst on"),)
    monkeypatch.setattr("wavegen.production.make.markers_of", lambda _: wrong)
    with pytest.raises(FileError, match="burst on"):
        lab.make(lab.SINGLE, tmp_path)
    assert lab.left_in(tmp_path) == []


def test_names_of_files_are_the_recipes(lab, tmp_path):
    text = lab.SINGLE + "output: {iq: [{format: raw, datatype: ci8, name: short}, sigmf]}\n"
    made = lab.make(text, tmp_path)
    assert {"short.ci8", "case.sigmf-data"} <= {path.name for path in made.files}
    assert [item["name"] for item in made.document["files"]] == ["short.ci8", "case.sigmf-data"]


def test_a_signal_of_zeros_is_refused(lab, tmp_path, monkeypatch):
    plain = stored.Scratch.write
    monkeypatch.setattr(stored.Scratch, "write", lambda self, x: plain(self, 0 * x))
    with pytest.raises(SignalError):
        lab.make(lab.SINGLE, tmp_path)
    assert lab.left_in(tmp_path) == []
