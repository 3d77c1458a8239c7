"""The contract of every format with every datatype: write, detect, read back the same codes."""

import hashlib
import json
import pickle
import resource
from fractions import Fraction
from itertools import pairwise, product

import numpy as np
import pytest

from wavegen.core.errors import FileError
from wavegen.files import FORMATS
from wavegen.files.atomic import Drafts
from wavegen.files.datatypes import encode, join_channels, quantised, takes_words
from wavegen.files.digest import sha512_of, verify_hash
from wavegen.files.format import Annotation, FileFacts, ReadHints, pick_datatype
from wavegen.files.read import open_recording

N = 3000
RATE = Fraction(30_720_000)
WITHOUT_RATE = {"raw", "npy"}
"""Formats whose files do not hold the sample rate."""

MEMBERS = [(name, key) for name in FORMATS for key in FORMATS.load(name).datatypes]


def samples():
    rng = np.random.default_rng(11)
    made = (0.4 * (rng.standard_normal(N) + 1j * rng.standard_normal(N))).astype(np.complex64)
    made[:4] = [1 + 1j, -1 - 1j, 0, 1e-7]  # both ends, exact zero, less than a code
    return made


SELF_DESCRIBING = {"sigmf", "sigmf_archive", "raw"}
"""Formats in which two real channels cannot be taken for I and Q of one."""

PAIRS = [
    (name, key)
    for name, key in MEMBERS
    if name in SELF_DESCRIBING or not FORMATS.load(name).datatypes[key].is_real
]
WORDS = [
    (name, key, bits, align)
    for (name, key), (bits, align) in product(
        MEMBERS, [(12, "left"), (12, "right"), (14, "left"), (14, "right")]
    )
    if takes_words(FORMATS.load(name).datatypes[key])
]


def write(folder, name, key, *, n_announced=N, cuts=(0, 1, 1000, N), bits=None, align=None, **more):
    form = FORMATS.load(name)()
    datatype = pick_datatype(form, key, "output", bits=bits, align=align)
    facts = FileFacts(
        sample_rate_hz=RATE,
        n_samples=n_announced,
        datatype=datatype,
        title="Prüfsignal",
        annotations=(Annotation(start_sample=3, n_samples=7, label="burst"),),
        **more,
    )
    form.check(facts, "output")
    codes, _ = encode(samples(), datatype)
    if facts.n_channels == 2:
        codes = join_channels(codes, encode(1j * samples()[::-1], datatype)[0])
    files = form.files("run 7", datatype)
    with Drafts(folder) as drafts:
        writer = form.writer(tuple(drafts.add(file) for file in files), facts)
        try:
            for start, stop in pairwise(cuts):
                writer.write(codes[start:stop])
            writer.finish({"mean_dbfs": -5.0})
        finally:
            writer.close()
    return form, datatype, codes, writer, [folder / file for file in files]


def hints_for(form, **more):
    return ReadHints(sample_rate_hz=RATE if form.name in WITHOUT_RATE else None, **more)


def check_read(recording, codes, datatype, wanted=None):
    """Check codes, samples and warnings; the envelope of real samples has a test of its own."""
    wanted = quantised(samples(), datatype) if wanted is None else wanted
    read = recording.signal.compute(0, N)
    np.testing.assert_array_equal(recording.signal.codes(0, N), codes)
    assert recording.is_real == datatype.is_real
    assert not recording.is_power
    if datatype.is_real:
        np.testing.assert_array_equal(read.real, wanted.real)
        (text,) = recording.warnings
        assert "is real" in text
    else:
        np.testing.assert_array_equal(read, wanted)
        assert recording.warnings == ()


@pytest.mark.parametrize(("name", "key"), MEMBERS)
def test_what_is_read_is_what_was_written(tmp_path, name, key):
    form, datatype, codes, writer, paths = write(tmp_path, name, key)
    assert sorted(tmp_path.iterdir()) == sorted(paths)
    for path in paths:  # every file of a set opens the recording
        recording = open_recording(path, hints_for(form))
        assert recording.format == name
        assert recording.datatype is datatype
        assert recording.sample_rate_hz == recording.signal.sample_rate_hz == RATE
        assert recording.n_samples == recording.signal.n_samples == N
        assert recording.files == tuple(paths)
        assert recording.path == paths[0]
        check_read(recording, codes, datatype)
        assert (recording.n_channels, recording.channel) == (1, 0)
    content = paths[0].read_bytes()
    assert writer.sha512 == hashlib.sha512(content).hexdigest()
    if recording.sha512 is not None:
        start, count = recording.data_start, recording.data_bytes or len(content)
        digest = hashlib.sha512(content[start : start + count]).hexdigest()
        assert recording.sha512 == digest
    assert verify_hash(recording) == (recording.sha512 is not None)


@pytest.mark.parametrize(("name", "key"), PAIRS)
def test_two_channels_share_a_file(tmp_path, name, key):
    form, datatype, codes, _, paths = write(tmp_path, name, key, n_channels=2)
    half = datatype.n_rails
    second = quantised((1j * samples()[::-1]).astype(np.complex64), datatype)
    for channel, wanted in ((0, quantised(samples(), datatype)), (1, second)):
        recording = open_recording(paths[0], hints_for(form, channel=channel))
        assert (recording.n_channels, recording.channel, recording.n_samples) == (2, channel, N)
        check_read(recording, codes[:, channel * half :][:, :half], datatype, wanted)
    if name != "raw":  # which cannot know
        with pytest.raises(FileError) as caught:
            open_recording(paths[0], hints_for(form))
        assert "2 channels" in caught.value.problem
        assert "--channel" in caught.value.remedy


@pytest.mark.parametrize(("name", "key"), sorted(set(MEMBERS) - set(PAIRS)))
def test_two_real_channels_that_would_be_i_and_q(tmp_path, name, key):
    with pytest.raises(FileError) as caught:
        write(tmp_path, name, key, n_channels=2)
    assert "I and Q" in caught.value.problem
    assert "sigmf" in caught.value.remedy


@pytest.mark.parametrize(("name", "key", "bits", "align"), WORDS)
def test_shorter_words(tmp_path, name, key, bits, align):
    form, datatype, codes, _, paths = write(tmp_path, name, key, bits=bits, align=align)
    recording = open_recording(paths[0], hints_for(form, bits=bits, align=align))
    assert recording.datatype == datatype
    check_read(recording, codes, datatype)
    own = open_recording(paths[0], hints_for(form))
    if own.datatype != datatype:  # a file that does not say so is read by its container
        factor = 2 ** (16 - bits) if align == "right" else 1
        part = own.signal.compute(0, N)
        np.testing.assert_array_equal(part.real * factor, recording.signal.compute(0, N).real)


@pytest.mark.parametrize(("name", "key", "bits", "align"), WORDS)
def test_codes_that_are_no_words_are_not_written(tmp_path, name, key, bits, align):
    form = FORMATS.load(name)()
    datatype = pick_datatype(form, key, "output", bits=bits, align=align)
    facts = FileFacts(sample_rate_hz=RATE, n_samples=10, datatype=datatype)
    codes = np.zeros((10, datatype.n_rails), datatype.dtype)
    codes[9, 0] = 1 if align == "left" else 1 << (bits - 1)
    files = form.files("x", datatype)
    with (  # noqa: PT012 (as production does it)
        pytest.raises(FileError, match="sample 9"),
        Drafts(tmp_path) as drafts,
    ):
        writer = form.writer(tuple(drafts.add(file) for file in files), facts)
        try:
            writer.write(codes)
        finally:
            writer.close()
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(("name", "key"), MEMBERS)
def test_any_range_is_a_part_of_the_whole(tmp_path, name, key):
    form, _, _, _, paths = write(tmp_path, name, key)
    signal = pickle.loads(  # noqa: S301 (our own bytes)
        pickle.dumps(open_recording(paths[0], hints_for(form)).signal)
    )
    whole = signal.compute(0, N)
    rng = np.random.default_rng(4)
    for start, stop in [(0, 1), (N - 1, N), *np.sort(rng.choice(N, (10, 2), replace=True))]:
        part = signal.compute(int(start), int(max(stop, start + 1)))
        np.testing.assert_array_equal(part, whole[start : max(stop, start + 1)])
        assert part.dtype == np.complex64


@pytest.mark.parametrize(("name", "key"), MEMBERS)
def test_bytes_do_not_depend_on_how_blocks_are_cut(tmp_path, name, key):
    digests = set()
    for number, cuts in enumerate([(0, N), (0, 1, 2, 2999, N), (0, 1500, N)]):
        *_, paths = write(tmp_path / str(number), name, key, cuts=cuts)
        digests.add(tuple(sha512_of(path) for path in paths))
    assert len(digests) == 1


@pytest.mark.parametrize("name", FORMATS)
@pytest.mark.parametrize("announced", [N - 1, N + 1])
def test_a_wrong_number_of_samples_leaves_no_file(tmp_path, name, announced):
    with pytest.raises(FileError) as caught:
        write(tmp_path, name, None, n_announced=announced)
    assert str(N) in caught.value.problem
    assert str(announced) in caught.value.allowed
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("name", FORMATS)
def test_a_disk_that_takes_no_more_leaves_no_file(tmp_path, name):
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    resource.setrlimit(resource.RLIMIT_FSIZE, (5000, hard))
    try:
        with pytest.raises(FileError) as caught:
            write(tmp_path, name, None)
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
    assert "run 7" in caught.value.where
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(("name", "other"), list(product(FORMATS, FORMATS)))
def test_no_detector_claims_anothers_file(tmp_path, name, other):
    detector = FORMATS.load(other)()
    for key in FORMATS.load(name).datatypes:
        *_, paths = write(tmp_path / key, name, key)
        for path in paths:
            assert detector.detect(path, path.read_bytes()[:4096]) == (name == other)


@pytest.mark.parametrize("name", FORMATS)
def test_members_are_what_the_table_says(name):
    form = FORMATS.load(name)()
    assert form.name == name
    assert form.default_datatype in form.datatypes
    for datatype in form.datatypes.values():
        for file in form.files("stem", datatype):
            assert file.startswith("stem.")
            assert "." + file.partition(".")[2] in form.suffixes


@pytest.mark.parametrize("name", FORMATS)
@pytest.mark.parametrize("key", ["cu8", "ci17_le", "ci16_LE"])
def test_datatypes_that_are_not_written(name, key):
    form = FORMATS.load(name)()
    with pytest.raises(FileError) as caught:
        pick_datatype(form, key, "output.iq[0]")
    assert caught.value.where == "output.iq[0]"
    assert key in caught.value.problem
    assert form.default_datatype in caught.value.allowed


def facts(name, **changed):
    plain = {
        "sample_rate_hz": RATE,
        "n_samples": 10,
        "datatype": pick_datatype(FORMATS.load(name)(), None, "output"),
    }
    return FileFacts(**(plain | changed))


@pytest.mark.parametrize("name", FORMATS)
@pytest.mark.parametrize(
    ("changed", "word"),
    [
        ({"n_samples": 0}, "0 samples"),
        ({"sample_rate_hz": Fraction(0)}, "0 Hz"),
        ({"n_channels": 0}, "0 channels"),
        ({"n_channels": 3}, "3 channels"),
        ({"annotations": (Annotation(start_sample=10, label="late"),)}, "late"),
        ({"annotations": (Annotation(start_sample=-1, label="early"),)}, "early"),
        ({"annotations": (Annotation(start_sample=8, n_samples=3, label="long"),)}, "long"),
        ({"annotations": (Annotation(start_sample=0, low_hz=1.0, label="edge"),)}, "edge"),
    ],
)
def test_facts_that_no_format_takes(name, changed, word):
    with pytest.raises(FileError) as caught:
        FORMATS.load(name)().check(facts(name, **changed), "output")
    assert caught.value.where == "output"
    assert word in caught.value.problem


def test_statistics_and_facts_of_a_pair(tmp_path):
    *_, paths = write(
        tmp_path, "sigmf", "ci8", recipe_sha512="ab" * 64, extra={"seed": 11}, generator="wavegen 1"
    )
    meta = json.loads(paths[1].read_text(encoding="utf-8"))
    fields = meta["global"]
    assert fields["wavegen:statistics"] == {"mean_dbfs": -5.0}
    assert fields["wavegen:recipe_sha512"] == "ab" * 64
    assert fields["wavegen:facts"] == {"seed": 11}
    assert fields["core:recorder"] == "wavegen 1"
    assert open_recording(paths[0]).statistics == {"mean_dbfs": -5.0}
