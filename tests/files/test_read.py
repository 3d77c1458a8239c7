"""Files of every malformed and hostile kind end in a FileError with its four fields."""

import gzip
import json
import os
import struct
import zipfile
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
import soundfile

from wavegen.core.errors import ArgumentsError, FileError
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording

RATE = Fraction(20_000_000)
META = {
    "global": {"core:datatype": "ci16_le", "core:version": "1.2.5", "core:sample_rate": 1e6},
    "captures": [],
    "annotations": [],
}


def pair(folder, *, meta=None, data=bytes(400)):
    if meta is not None:
        content = meta if isinstance(meta, bytes) else json.dumps(meta).encode()
        (folder / "run.sigmf-meta").write_bytes(content)
    if data is not None:
        (folder / "run.sigmf-data").write_bytes(data)
    return folder / "run.sigmf-meta"


def plain(folder, name, content):
    (folder / name).write_bytes(content)
    return folder / name


def sound(folder, channels, **more):
    path = folder / "x.wav"
    soundfile.write(path, np.zeros((100, channels), np.int16), 48_000, **more)
    return path


def changed_sound(folder, change):
    path = sound(folder, 2)
    path.write_bytes(change(path.read_bytes()))
    return path


def pipe(folder):
    os.mkfifo(folder / "x.ci16_le")
    return folder / "x.ci16_le"


def zipped(folder):
    with zipfile.ZipFile(folder / "x.zip", "w") as file:
        file.writestr("x.ci16_le", bytes(100))
    return folder / "x.zip"


def circle(folder):
    (folder / "x.wav").symlink_to(folder / "y.wav")
    (folder / "y.wav").symlink_to(folder / "x.wav")
    return folder / "x.wav"


def huge_meta(folder):
    path = pair(folder, meta=META)
    with path.open("r+b") as file:
        file.truncate(20_000_000)
    return path


CI16 = ReadHints(format="ci16_le", sample_rate_hz=RATE)
NONE = ReadHints()
RATE_ONLY = ReadHints(sample_rate_hz=RATE)

HOSTILE = {
    # name: (make the file, hints, words of the problem, words of the remedy, end of the place)
    "missing": (lambda f: f / "x.wav", NONE, "no such file", "Check", "x.wav"),
    "missing, told raw": (lambda f: f / "x.iq", CI16, "no such file", "Check", "x.iq"),
    "a file as a folder": (
        lambda f: plain(f, "a", b"1") / "x.wav",
        NONE,
        "not a folder",
        "path",
        "x.wav",
    ),
    "folder": (lambda f: f, NONE, "folder", "inside", ""),
    "folder, told raw": (lambda f: f, CI16, "folder", "inside", ""),
    "pipe": (pipe, RATE_ONLY, "pipe", "Save", "x.ci16_le"),
    "pipe, told raw": (pipe, CI16, "pipe", "Save", "x.ci16_le"),
    "device": (lambda _: Path("/dev/zero"), NONE, "device", "Save", "zero"),
    "device, told raw": (lambda _: Path("/dev/zero"), CI16, "device", "Save", "zero"),
    "links in circles": (circle, NONE, "circles", "Name", "x.wav"),
    "name too long": (lambda f: f / ("x" * 5000), NONE, "too long", "Shorten", "x"),
    "NUL in the name": (lambda f: Path(f"{f}/a\0b"), NONE, "NUL", "name", "'"),
    "empty": (lambda f: plain(f, "x.ci16_le", b""), RATE_ONLY, "empty", "finished", "x.ci16_le"),
    "empty, told raw": (lambda f: plain(f, "x.iq", b""), CI16, "empty", "finished", "x.iq"),
    "empty WAV": (lambda f: plain(f, "x.wav", b""), NONE, "empty", "finished", "x.wav"),
    "odd bytes": (
        lambda f: plain(f, "x.ci16_le", bytes(4002)),
        RATE_ONLY,
        "4002 bytes leave 2",
        "finished",
        "x.ci16_le",
    ),
    "odd bytes, told raw": (
        lambda f: plain(f, "x.iq", bytes(7)),
        CI16,
        "7 bytes leave 3",
        "finished",
        "x.iq",
    ),
    "no rate": (
        lambda f: plain(f, "x.ci16_le", bytes(400)),
        NONE,
        "rate",
        "--sample-rate 20MHz",
        "x.ci16_le",
    ),
    "raw without a datatype": (
        lambda f: plain(f, "x.iq", bytes(400)),
        ReadHints(format="raw", sample_rate_hz=RATE),
        "datatype",
        "--format ci16_le",
        "x.iq",
    ),
    "unknown ending": (
        lambda f: plain(f, "x.iq", bytes(400)),
        NONE,
        "neither",
        "--format ci16_le --sample-rate 20MHz",
        "x.iq",
    ),
    "text": (
        lambda f: plain(f, "notes.txt", b"measured on the bench today"),
        NONE,
        "text",
        "recording",
        "notes.txt",
    ),
    "recipe": (
        lambda f: plain(f, "carrier.yaml", b"wavegen: 1\ntitle: a carrier\n"),
        NONE,
        "text",
        "recording",
        "carrier.yaml",
    ),
    "sidecar": (
        lambda f: plain(f, "x.ccdf.json", b'{"files": [], "mean_dbfs": -3}'),
        NONE,
        "sidecar",
        "recordings",
        "x.ccdf.json",
    ),
    "zip": (zipped, NONE, "zip", "Unpack", "x.zip"),
    "gzip": (
        lambda f: plain(f, "x.ci16_le.gz", gzip.compress(bytes(400))),
        NONE,
        "gzip",
        "Unpack",
        ".gz",
    ),
    "gzip under a raw name": (
        lambda f: plain(f, "x.ci16_le", gzip.compress(bytes(400))),
        RATE_ONLY,
        "gzip",
        "Unpack",
        "x.ci16_le",
    ),
    "WAV that is none": (
        lambda f: plain(f, "x.wav", bytes(range(200))),
        NONE,
        "RIFF",
        "--format",
        "x.wav",
    ),
    "raw, told WAV": (
        lambda f: plain(f, "x.iq", bytes(400)),
        ReadHints(format="wav"),
        "RIFF",
        "copy",
        "x.iq",
    ),
    "WAV header alone": (
        lambda f: changed_sound(f, lambda b: b[:30]),
        NONE,
        "header states",
        "copy",
        "x.wav",
    ),
    "WAV of 12 bytes": (
        lambda f: plain(f, "x.wav", b"RIFF\x04\x00\x00\x00WAVE"),
        NONE,
        "fmt",
        "copy",
        "x.wav",
    ),
    "WAV cut short": (
        lambda f: changed_sound(f, lambda b: b[:-9]),
        NONE,
        "header states",
        "copy",
        "x.wav",
    ),
    "WAV with a lying data length": (
        lambda f: changed_sound(f, lambda b: b[:40] + struct.pack("<I", 10**9) + b[44:]),
        NONE,
        "1000000000",
        "copy",
        "x.wav",
    ),
    "WAV without samples": (
        lambda f: changed_sound(
            f, lambda b: b[:4] + struct.pack("<I", 36) + b[8:40] + struct.pack("<I", 0)
        ),
        NONE,
        "0 samples",
        "finished",
        "x.wav",
    ),
    "WAV at 0 Hz": (
        lambda f: changed_sound(f, lambda b: b[:24] + bytes(8) + b[32:]),
        NONE,
        "",
        "finished",
        "x.wav",
    ),
    "WAV of an unknown coding": (
        lambda f: changed_sound(f, lambda b: b[:20] + b"\x34\x12" + b[22:]),
        NONE,
        "decoded",
        "copy",
        "x.wav",
    ),
    "WAV of 8 bits": (
        lambda f: sound(f, 2, subtype="PCM_U8"),
        NONE,
        "PCM_U8",
        "Convert",
        "x.wav",
    ),
    "WAV of four channels": (lambda f: sound(f, 4), NONE, "2 channels", "--channel 0", "x.wav"),
    "a channel that a WAV file has not": (
        lambda f: sound(f, 4),
        ReadHints(channel=2),
        "channel 2",
        "--channel 0",
        "x.wav",
    ),
    "a second channel of one": (
        lambda f: sound(f, 2),
        ReadHints(channel=1),
        "has 1 channel, and channel 1",
        "Leave",
        "x.wav",
    ),
    "rows of two channels cut": (
        lambda f: plain(f, "x.ci16_le", bytes(404)),
        ReadHints(sample_rate_hz=RATE, channel=1),
        "404 bytes leave 4",
        "finished",
        "x.ci16_le",
    ),
    "codes beyond their word": (
        lambda f: plain(f, "x.ci16_le", b"\0\0\0\x08" * 100),
        ReadHints(sample_rate_hz=RATE, bits=12, align="right"),
        "sample 0 holds 2048",
        "alignment",
        "x.ci16_le",
    ),
    "bits below their word": (
        lambda f: plain(f, "x.ci16_le", bytes(398) + b"\1\0"),
        ReadHints(sample_rate_hz=RATE, bits=14, align="left"),
        "sample 99 holds 1",
        "alignment",
        "x.ci16_le",
    ),
    "words in bytes": (
        lambda f: plain(f, "x.ci8", bytes(400)),
        ReadHints(sample_rate_hz=RATE, bits=12, align="left"),
        "ci8",
        "ci16_le",
        "x.ci8",
    ),
    "WAV of three channels": (lambda f: sound(f, 3), NONE, "3 channels", "I and Q", "x.wav"),
    "WAV, told another datatype": (
        lambda f: sound(f, 2),
        ReadHints(format="wav", datatype="cf32_le"),
        "ci16_le",
        "datatype",
        "x.wav",
    ),
    "meta alone": (
        lambda f: pair(f, meta=META, data=None),
        NONE,
        "missing beside run.sigmf-meta",
        "Copy",
        "run.sigmf-data",
    ),
    "data alone": (
        lambda f: pair(f).with_suffix(".sigmf-data"),
        NONE,
        "no such file",
        "--format ci16_le --sample-rate 20MHz",
        "run.sigmf-meta",
    ),
    "meta that is no JSON": (
        lambda f: pair(f, meta=b"core:datatype = ci16_le"),
        NONE,
        "line 1",
        "copied",
        "run.sigmf-meta",
    ),
    "meta that is binary": (
        lambda f: pair(f, meta=bytes(range(256))),
        NONE,
        "UTF-8",
        "copied",
        "run.sigmf-meta",
    ),
    "empty meta": (lambda f: pair(f, meta=b""), NONE, "line 1", "copied", "run.sigmf-meta"),
    "meta of 20 MB": (huge_meta, NONE, "20.0 MB", "copied", "run.sigmf-meta"),
    "meta with NaN": (
        lambda f: pair(f, meta=META | {"global": {"core:sample_rate": float("nan")}}),
        NONE,
        "NaN",
        "copied",
        "run.sigmf-meta",
    ),
    "meta nested deep": (
        lambda f: pair(f, meta=b'{"global":' * 5000),
        NONE,
        "deep",
        "copied",
        "run.sigmf-meta",
    ),
    "empty data": (
        lambda f: pair(f, meta=META, data=b""),
        NONE,
        "empty",
        "finished",
        "run.sigmf-data",
    ),
    "data with a byte over": (
        lambda f: pair(f, meta=META, data=bytes(401)),
        NONE,
        "401 bytes leave 1",
        "finished",
        "run.sigmf-data",
    ),
    "meta, told another datatype": (
        lambda f: pair(f, meta=META),
        ReadHints(format="sigmf", datatype="ci8"),
        "ci16_le",
        "datatype",
        "run.sigmf-meta",
    ),
    "WAV, told SigMF": (
        lambda f: sound(f, 2),
        ReadHints(format="sigmf"),
        "no such file",
        "--format",
        "x.wav.sigmf-meta",
    ),
}


@pytest.mark.parametrize("case", HOSTILE)
def test_malformed_and_hostile_files(tmp_path, case):
    make, hints, problem, remedy, place = HOSTILE[case]
    path = make(tmp_path)
    with pytest.raises(FileError) as caught:  # noqa: PT012 (rows are seen when they are read)
        recording = open_recording(path, hints)
        recording.signal.compute(0, recording.n_samples)
    assert caught.value.where.endswith(place)
    assert problem in caught.value.problem
    assert remedy in caught.value.remedy
    assert caught.value.allowed
    assert len(str(caught.value)) < 6000


@pytest.mark.parametrize(
    ("name", "hints"),
    [
        ("x.ci16_le", RATE_ONLY),
        ("x.iq", NONE),
        ("x.iq", CI16),
        ("x.wav", NONE),
        ("run.sigmf-meta", NONE),
        ("run.sigmf-data", NONE),
        ("run.sigmf-data", CI16),
    ],
)
def test_permission_denied(tmp_path, monkeypatch, name, hints):
    pair(tmp_path, meta=META)
    for other in ("x.ci16_le", "x.wav", "x.iq"):
        (tmp_path / other).write_bytes(bytes(400))

    def refuse(self, *_, **__):
        raise PermissionError(13, "Permission denied", str(self))

    monkeypatch.setattr(Path, "open", refuse)  # the tests may run as a user whom nothing stops
    with pytest.raises(FileError) as caught:
        open_recording(tmp_path / name, hints)
    assert "permission" in caught.value.problem


@pytest.mark.parametrize("name", ["run.sigmf-meta", "run.sigmf-data", "run"])
def test_a_pair_by_either_file_or_its_common_name(tmp_path, name):
    pair(tmp_path, meta=META)
    recording = open_recording(tmp_path / name)
    assert (recording.format, recording.n_samples) == ("sigmf", 100)


def test_the_data_file_of_a_pair_told_raw(tmp_path):
    data = pair(tmp_path).with_suffix(".sigmf-data")
    recording = open_recording(data, CI16)
    assert (recording.format, recording.n_samples) == ("raw", 100)


def test_text_is_samples_where_the_ending_says_so(tmp_path):
    path = plain(tmp_path, "x.ci8", b"@" * 400)  # a constant of half the scale looks like text
    recording = open_recording(path, RATE_ONLY)
    assert recording.signal.compute(0, 1)[0] == 0.5 + 0.5j
    assert "text" in recording.warnings[0]


def test_a_wav_file_under_any_name(tmp_path):
    path = sound(tmp_path, 2).rename(tmp_path / "capture.bin")
    assert open_recording(path).format == "wav"


@pytest.mark.parametrize(
    ("hints", "word"),
    [
        (ReadHints(format="sigfm"), "sigmf"),
        (ReadHints(format="ci16le"), "ci16_le"),
        (ReadHints(datatype="f32"), "cf32_le"),
        (ReadHints(format="ci8", datatype="cu8"), "once"),
        (ReadHints(sample_rate_hz=Fraction(0)), "--sample-rate"),
        (ReadHints(sample_rate_hz=Fraction(-1)), "--sample-rate"),
        (ReadHints(full_scale=0.0), "--full-scale"),
        (ReadHints(full_scale=float("nan")), "--full-scale"),
        (ReadHints(full_scale=float("inf")), "--full-scale"),
        (ReadHints(bits=13, align="left"), "bits"),
        (ReadHints(bits=12), "--align left"),
        (ReadHints(align="left"), "--bits"),
        (ReadHints(bits=12, align="middle"), "--align"),
        (ReadHints(bits=12, align="left", full_scale=2048), "--bits"),
    ],
)
def test_hints_that_mean_nothing(tmp_path, hints, word):
    path = plain(tmp_path, "x.ci16_le", bytes(400))
    with pytest.raises(ArgumentsError) as caught:
        open_recording(path, hints)
    assert word in caught.value.remedy


def test_files_cut_anywhere_never_end_in_another_error(tmp_path):
    """Every prefix of a small WAV file and of a small metadata file: read, or a FileError."""
    path = tmp_path / "x.wav"
    soundfile.write(path, np.zeros((4, 2), np.int16), 48_000)
    whole = path.read_bytes()
    meta = pair(tmp_path, meta=META)
    text = meta.read_bytes()
    for content, target in ((whole, path), (text, meta)):
        for end in range(len(content)):
            target.write_bytes(content[:end])
            with pytest.raises(FileError):
                open_recording(target)


def test_files_with_any_byte_changed_never_end_in_another_error(tmp_path):
    """Each byte of a header in turn replaced: read, or a FileError."""
    path = tmp_path / "x.wav"
    soundfile.write(path, np.zeros((4, 2), np.int16), 48_000)
    meta = pair(tmp_path, meta=META)
    n_refused = 0
    for target, values in ((path, (0, 127, 255)), (meta, (0x22,))):
        whole = target.read_bytes()
        for place in range(len(whole)):
            for value in values:
                target.write_bytes(whole[:place] + bytes([value]) + whole[place + 1 :])
                try:
                    recording = open_recording(target)
                    recording.signal.compute(0, recording.n_samples)
                except FileError:
                    n_refused += 1
    assert n_refused > 100
