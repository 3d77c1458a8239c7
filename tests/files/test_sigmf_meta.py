"""Metadata from strangers; each case changes one thing in a valid file."""

import json

import pytest

from wavegen.core.errors import FileError
from wavegen.files.format import ReadHints
from wavegen.files.sigmf import Sigmf
from wavegen.files.sigmf_meta import read_meta


def document():
    return {
        "global": {
            "core:datatype": "ci16_le",
            "core:version": "1.2.5",
            "core:sample_rate": 1000.0,
        },
        "captures": [{"core:sample_start": 0}],
        "annotations": [],
    }


def write(folder, changed):
    path = folder / "run.sigmf-meta"
    path.write_text(json.dumps(changed), encoding="utf-8")
    (folder / "run.sigmf-data").write_bytes(bytes(400))
    return path


def with_global(**fields):
    changed = document()
    for key, value in fields.items():
        changed["global"][key.replace("__", ":")] = value
    return changed


def without(key):
    changed = document()
    del changed["global"][key]
    return changed


def with_section(name, value):
    return document() | {name: value}


FOREIGN = {"name": "radar", "version": "1.0.0", "optional": False}


@pytest.mark.parametrize(
    ("changed", "words"),
    [
        ({}, ("global", "missing")),
        (with_section("global", []), ("global", "list")),
        (with_section("captures", {}), ("captures",)),
        (with_section("captures", [3]), ("captures.0",)),
        (with_section("captures", [{}]), ("captures.0", "core:sample_start")),
        (with_section("annotations", "none"), ("annotations",)),
        (with_section("annotations", [{"core:sample_start": -1}]), ("annotations.0",)),
        (with_section("annotations", [{"core:sample_start": "0"}]), ("annotations.0",)),
        (
            with_section("annotations", [{"core:sample_start": 9}, {"core:sample_start": 3}]),
            ("annotations", "order"),
        ),
        (with_section("more", {}), ("more",)),
        (without("core:datatype"), ("core:datatype", "missing")),
        (without("core:version"), ("core:version", "missing")),
        (with_global(core__datatype=16), ("core:datatype", "16")),
        (with_global(core__datatype="ci16"), ("core:datatype", "ci16")),
        (with_global(core__datatype="ci16_le_"), ("core:datatype", "ci16_le_")),
        (with_global(core__datatype="ci8_le"), ("core:datatype", "ci8_le")),
        (with_global(core__datatype="ru16_le"), ("core:datatype", "ru16_le")),
        (with_global(core__datatype="cf32_be"), ("core:datatype", "cf32_be")),
        (with_global(core__version="2.0.0"), ("core:version", "2.0.0")),
        (with_global(core__version="1.2"), ("core:version", "1.2")),
        (with_global(core__version=1), ("core:version", "1")),
        (with_global(core__sample_rate=0), ("core:sample_rate", "0")),
        (with_global(core__sample_rate=-1e6), ("core:sample_rate", "-1000000.0")),
        (with_global(core__sample_rate="20MHz"), ("core:sample_rate", "20MHz")),
        (with_global(core__sample_rate=True), ("core:sample_rate", "True")),
        (with_global(core__sample_rate=10**400), ("core:sample_rate", "1000")),
        (with_global(core__sample_rate=None), ("core:sample_rate", "missing")),
        (with_global(core__sha512="abc"), ("core:sha512", "abc")),
        (with_global(core__sha512="0" * 129), ("core:sha512",)),
        (with_global(core__num_channels=2), ("2 channels",)),
        (with_global(core__num_channels=0), ("core:num_channels", "0")),
        (with_global(core__num_channels=1e9), ("core:num_channels",)),
        (with_global(core__num_channels="2"), ("core:num_channels",)),
        (with_global(core__num_channels=True), ("core:num_channels",)),
        (with_global(core__metadata_only=True), ("core:metadata_only",)),
        (with_global(core__trailing_bytes=8), ("core:trailing_bytes",)),
        (
            with_section("captures", [{"core:sample_start": 0, "core:header_bytes": 16}]),
            ("core:header_bytes",),
        ),
        (with_global(core__extensions=[FOREIGN]), ("radar",)),
        (with_global(core__extensions=[{"name": "radar"}]), ("core:extensions.0",)),
        (with_global(core__extensions="radar"), ("core:extensions",)),
        (with_global(core__dataset="../../etc/passwd"), ("../../etc/passwd",)),
        (with_global(core__dataset="/dev/zero"), ("/dev/zero",)),
        (with_global(core__offset=-5), ("core:offset",)),
        (with_global(core__description=["x" * 10_000]), ("core:description", "...")),
    ],
    ids=range(44),
)
def test_metadata_that_are_refused(tmp_path, changed, words):
    path = write(tmp_path, changed)
    with pytest.raises(FileError) as caught:
        Sigmf().read(path, ReadHints())
    assert caught.value.where.startswith(str(path))
    for word in words:
        assert word in caught.value.problem
    assert len(caught.value.problem) < 400
    assert caught.value.allowed
    assert caught.value.remedy


@pytest.mark.parametrize(
    ("changed", "word"),
    [
        (with_global(core__version="0.0.2"), "0.0.2"),
        (with_global(radar__prf=1000), "radar"),
        (
            with_section("captures", [{"core:sample_start": 0}, {"core:sample_start": 50}]),
            "2 segments",
        ),
        (
            with_section(
                "captures",
                [
                    {"core:sample_start": 0, "core:frequency": 1e9},
                    {"core:sample_start": 50, "core:frequency": 2e9},
                ],
            ),
            "frequencies differ",
        ),
        (
            with_section("annotations", [{"core:sample_start": 90, "core:sample_count": 11}]),
            "100 samples",
        ),
        (with_section("captures", [{"core:sample_start": 100}]), "100 samples"),
        (
            with_global(core__offset=5) | {"annotations": [{"core:sample_start": 0}]},
            "-5",
        ),
    ],
)
def test_metadata_that_are_read_with_a_warning(tmp_path, changed, word):
    recording = Sigmf().read(write(tmp_path, changed), ReadHints())
    assert recording.n_samples == 100
    assert word in " ".join(recording.warnings)


@pytest.mark.parametrize(
    "changed",
    [
        document(),
        with_section("captures", []),
        with_global(core__num_channels=1, core__trailing_bytes=0, core__metadata_only=False),
        with_global(core__extensions=[FOREIGN | {"optional": True}], radar__prf=1000),
        with_global(wavegen__word_bits=12, wavegen__word_align="middle"),
        with_global(wavegen__word_bits=[12], wavegen__word_align={}),
        with_global(wavegen__title=3, wavegen__statistics="none", wavegen__sample_rate_exact="1/0")
        | {},
        with_section("annotations", [{"core:sample_start": 5.0, "core:sample_count": 5.0}]),
    ],
)
def test_metadata_that_are_read(tmp_path, changed):
    if any(key.startswith("wavegen:") for key in changed["global"]):
        changed["global"]["core:extensions"] = [
            {"name": "wavegen", "version": "1.0.0", "optional": True}
        ]
    recording = Sigmf().read(write(tmp_path, changed), ReadHints())
    assert recording.warnings == ()
    assert recording.sample_rate_hz == 1000
    assert recording.statistics is None
    assert all(isinstance(item.start_sample, int) for item in recording.annotations)


def test_no_rate_needs_a_hint(tmp_path):
    path = write(tmp_path, without("core:sample_rate"))
    assert read_meta(path).sample_rate_hz is None
    with pytest.raises(FileError) as caught:
        Sigmf().read(path, ReadHints())
    assert "--sample-rate" in caught.value.remedy
    assert Sigmf().read(path, ReadHints(sample_rate_hz=2)).sample_rate_hz == 2


@pytest.mark.parametrize(
    ("name", "is_grammatical"),
    [("ci16_le_", False), ("ci8_le", False), ("ci16", False), ("ru16_le", True), ("cf32_be", True)],
)
def test_what_breaks_the_grammar_is_told_from_what_is_not_read(tmp_path, name, is_grammatical):
    with pytest.raises(FileError) as caught:
        read_meta(write(tmp_path, with_global(core__datatype=name)))
    assert caught.value.allowed.startswith("ci16_le, ") == is_grammatical
