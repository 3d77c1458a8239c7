"""Archives of one recording: written as they stream, read in place."""

import gzip
import io
import json
import tarfile
from fractions import Fraction

import numpy as np
import pytest
import sigmf

from wavegen.core.errors import FileError
from wavegen.files.atomic import Drafts
from wavegen.files.datatypes import CI16_LE, word_in
from wavegen.files.digest import verify_hash
from wavegen.files.format import Annotation, FileFacts, ReadHints
from wavegen.files.read import open_recording
from wavegen.files.sigmf_archive import SigmfArchive

RATE = Fraction(812_500, 3)
META = {
    "global": {"core:datatype": "ci16_le", "core:version": "1.2.5", "core:sample_rate": 1e6},
    "captures": [],
    "annotations": [],
}
DATA = np.arange(200, dtype="<i2").tobytes()


def packed(folder, members, mode="w", name="run.sigmf"):
    path = folder / name
    with tarfile.open(path, mode) as file:
        for member, content in members:
            info = tarfile.TarInfo(member)
            info.size = len(content)
            file.addfile(info, io.BytesIO(content))
    return path


def meta(**changed):
    return json.dumps(META | {"global": META["global"] | changed}).encode()


def plain(data=DATA, **changed):
    return [("run/run.sigmf-meta", meta(**changed)), ("run/run.sigmf-data", data)]


def write(folder, name="träger 1", datatype=CI16_LE):
    codes = np.arange(200, dtype="<i2").reshape(-1, 2)
    facts = FileFacts(
        sample_rate_hz=RATE,
        n_samples=100,
        datatype=datatype,
        title="Träger",
        annotations=(Annotation(start_sample=3, n_samples=5, label="slot"),),
    )
    form = SigmfArchive()
    with Drafts(folder) as drafts:
        writer = form.writer(tuple(drafts.add(file) for file in form.files(name, datatype)), facts)
        writer.write(codes[:30])
        writer.write(codes[30:])
        writer.finish({"mean_dbfs": -40.0})
    return folder / f"{name}.sigmf", codes


def test_layout_is_that_of_the_specification(tmp_path):
    path, codes = write(tmp_path)
    with tarfile.open(path, "r:") as file:
        members = file.getmembers()
        assert [item.name for item in members] == [
            "träger 1",
            "träger 1/träger 1.sigmf-data",
            "träger 1/träger 1.sigmf-meta",
        ]
        assert members[0].isdir()
        assert file.extractfile(members[1]).read() == codes.tobytes()


def test_the_reference_library_reads_it(tmp_path):
    path, codes = write(tmp_path, name="run")
    theirs = sigmf.fromfile(path)
    read = theirs.read_samples()
    np.testing.assert_array_equal(read * 32768, codes[:, 0] + 1j * codes[:, 1])
    assert theirs.get_annotations()[0]["core:label"] == "slot"


def test_everything_said_is_read_back(tmp_path):
    path, codes = write(tmp_path)
    recording = open_recording(path)
    assert (recording.title, recording.sample_rate_hz) == ("Träger", RATE)
    assert recording.statistics == {"mean_dbfs": -40.0}
    assert recording.annotations[0].label == "slot"
    assert recording.files == (path,)
    assert verify_hash(recording)
    np.testing.assert_array_equal(recording.signal.codes(10, 20), codes[10:20])
    content = bytearray(path.read_bytes())
    content[recording.data_start] ^= 1
    path.write_bytes(content)
    with pytest.raises(FileError):
        verify_hash(open_recording(path))


def test_words_are_in_the_metadata(tmp_path):
    word = word_in(CI16_LE, bits=12, align="right")
    path, _ = write(tmp_path, datatype=word)
    assert open_recording(path).datatype == word


def test_archives_by_others(tmp_path):
    recording = open_recording(packed(tmp_path, plain()))
    assert (recording.format, recording.n_samples) == ("sigmf_archive", 100)
    flat = [(name.removeprefix("run/"), content) for name, content in plain()]
    assert open_recording(packed(tmp_path, flat)).n_samples == 100
    shadows = [("run/._run.sigmf-meta", b"x"), ("run/README", b"y"), *plain()]
    recording = open_recording(packed(tmp_path, shadows))
    assert "2 more files" in recording.warnings[0]


HOSTILE = {
    "compressed by tar": (lambda f: packed(f, plain(), "w:gz"), "gzip", ""),
    "compressed": (
        lambda f: (f / "run.sigmf").write_bytes(gzip.compress(bytes(5000))),
        "gzip",
        "",
    ),
    "xz": (lambda f: packed(f, plain(), "w:xz"), "xz", ""),
    "no archive": (lambda f: (f / "run.sigmf").write_bytes(b"x" * 2000), "no tar header", ""),
    "nothing inside": (lambda f: packed(f, []), "holds nothing", ""),
    "metadata without samples": (lambda f: packed(f, plain()[:1]), "0 data files", ""),
    "samples without metadata": (lambda f: packed(f, plain()[1:]), "no metadata", ""),
    "several recordings": (
        lambda f: packed(f, [*plain(), ("b/b.sigmf-meta", meta()), ("b/b.sigmf-data", DATA)]),
        "2 recordings",
        "",
    ),
    "samples of another name": (
        lambda f: packed(f, [plain()[0], ("run/walk.sigmf-data", DATA)]),
        "1 data files",
        "",
    ),
    "samples of two names": (
        lambda f: packed(f, [*plain(), ("run/walk.sigmf-data", DATA)]),
        "2 data files",
        "",
    ),
    "a name that climbs": (
        lambda f: packed(f, [("../run.sigmf-meta", meta()), ("../run.sigmf-data", DATA)]),
        "leave",
        "",
    ),
    "metadata that are no JSON": (
        lambda f: packed(f, [("run/run.sigmf-meta", b"{"), plain()[1]]),
        "line 1",
        "run.sigmf-meta",
    ),
    "metadata of 17 MB": (
        lambda f: packed(f, [("run/run.sigmf-meta", bytes(17_000_000)), plain()[1]]),
        "17.0 MB",
        "run.sigmf-meta",
    ),
    "data elsewhere": (
        lambda f: packed(f, plain(**{"core:dataset": "other.bin"})),
        "other.bin",
        "run.sigmf-meta",
    ),
    "no samples": (lambda f: packed(f, plain(data=b"")), "empty", ""),
    "half a sample": (lambda f: packed(f, plain(data=bytes(402))), "402 bytes leave 2", ""),
    "two channels": (
        lambda f: packed(f, plain(**{"core:num_channels": 2})),
        "2 channels",
        "run.sigmf-meta",
    ),
}


@pytest.mark.parametrize("case", HOSTILE)
def test_archives_that_are_refused(tmp_path, case):
    make, word, place = HOSTILE[case]
    make(tmp_path)
    path = tmp_path / "run.sigmf"
    with pytest.raises(FileError) as caught:
        open_recording(path)
    assert word in caught.value.problem
    assert caught.value.where.startswith(str(path))
    assert caught.value.where.endswith(place)
    assert caught.value.allowed
    assert caught.value.remedy
    assert [item.name for item in tmp_path.iterdir()] == ["run.sigmf"]


def test_an_archive_under_another_name_is_told(tmp_path):
    path = packed(tmp_path, plain(), name="run.tar")
    with pytest.raises(FileError) as caught:
        open_recording(path)
    assert "tar" in caught.value.problem
    recording = open_recording(path, ReadHints(format="sigmf_archive"))
    assert recording.n_samples == 100


def test_an_archive_cut_short(tmp_path):
    path, _ = write(tmp_path)
    whole = path.read_bytes()
    for end in (0, 511, 512, 700, 1500, len(whole) - 1500):
        path.write_bytes(whole[:end])
        with pytest.raises(FileError):
            open_recording(path)
