import json
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
import sigmf

from wavegen.core.errors import FileError
from wavegen.files.datatypes import CI16_LE, encode
from wavegen.files.format import Annotation, FileFacts, ReadHints
from wavegen.files.sigmf import Sigmf, meta_beside

MARKERS = (
    Annotation(start_sample=40, n_samples=20, label="burst", low_hz=-1e3, high_hz=2e3),
    Annotation(start_sample=0, n_samples=100, label="period", comment="loops here"),
)


def write(folder, *, rate=Fraction(30_720_000), **more):
    rng = np.random.default_rng(2)
    samples = (0.1 * (rng.standard_normal(100) + 1j * rng.standard_normal(100))).astype(
        np.complex64
    )
    facts = FileFacts(sample_rate_hz=rate, n_samples=100, datatype=CI16_LE, **more)
    paths = folder / "run.sigmf-data", folder / "run.sigmf-meta"
    writer = Sigmf().writer(paths, facts)
    writer.write(encode(samples, CI16_LE)[0])
    writer.finish({"mean_dbfs": -17.0, "law": None})
    return samples, *paths


def test_the_reference_library_reads_the_same(tmp_path):
    samples, _, meta = write(
        tmp_path, title="Carrier", annotations=MARKERS, centre_frequency_hz=2.1e9
    )
    theirs = sigmf.fromfile(meta)  # checks the hash too
    theirs.validate()
    read = theirs.read_samples()
    np.testing.assert_allclose(read, samples, atol=0.75 / 32768)  # 0.71 codes: both rails half
    ours = Sigmf().read(meta, ReadHints()).signal.compute(0, 100)
    np.testing.assert_array_equal(read, ours)
    assert theirs.get_captures() == [{"core:sample_start": 0, "core:frequency": 2.1e9}]
    assert [item["core:label"] for item in theirs.get_annotations()] == ["period", "burst"]


def test_everything_said_is_read_back(tmp_path):
    _, data, _ = write(
        tmp_path,
        title="Träger",
        description="Two lines\nof text",
        annotations=MARKERS,
        centre_frequency_hz=2.1e9,
    )
    recording = Sigmf().read(data, ReadHints(reference_level_dbm=-20))
    assert (recording.title, recording.description) == ("Träger", "Two lines\nof text")
    assert recording.annotations == (MARKERS[1], MARKERS[0])
    assert recording.centre_frequency_hz == 2.1e9
    assert recording.statistics == {"mean_dbfs": -17.0, "law": None}
    assert recording.reference_level_dbm == -20


def test_fields_belong_to_core_or_a_declared_extension(tmp_path):
    *_, meta = write(tmp_path, title="Carrier", extra={"seed": 1}, recipe_sha512="0f" * 64)
    fields = json.loads(meta.read_text(encoding="utf-8"))["global"]
    names = {key.partition(":")[0] for key in fields}
    assert names == {"core", "wavegen"}
    assert fields["core:extensions"] == [{"name": "wavegen", "version": "1.0.0", "optional": True}]


def test_every_field_of_the_extension_is_defined_in_its_document(tmp_path):
    import wavegen.files

    document = Path(wavegen.files.__file__).with_name("schemas") / "wavegen.sigmf-ext.md"
    text = document.read_text(encoding="utf-8")
    *_, meta = write(
        tmp_path, title="x", extra={"a": 1}, recipe_sha512="0f" * 64, rate=Fraction(812_500, 3)
    )
    fields = [
        key
        for key in json.loads(meta.read_text(encoding="utf-8"))["global"]
        if key.startswith("wavegen:")
    ]
    assert len(fields) == 5
    for key in fields:
        assert f"| `{key}` | false |" in text
    assert "v1.0.0" in text.splitlines()[0]


@pytest.mark.parametrize(
    "rate",
    [Fraction(812_500, 3), Fraction(30_720_000), Fraction("1234567.89"), Fraction(1, 3)],
)
def test_rates_come_back_exactly(tmp_path, rate):
    *_, meta = write(tmp_path, rate=rate)
    assert Sigmf().read(meta, ReadHints()).sample_rate_hz == rate


def test_a_changed_rate_outranks_a_ratio_left_behind(tmp_path):
    *_, meta = write(tmp_path, rate=Fraction(812_500, 3))
    document = json.loads(meta.read_text(encoding="utf-8"))
    document["global"]["core:sample_rate"] = 250_000
    meta.write_text(json.dumps(document), encoding="utf-8")
    assert Sigmf().read(meta, ReadHints()).sample_rate_hz == 250_000


def test_a_rate_above_the_limit(tmp_path):
    with pytest.raises(FileError) as caught:
        write(tmp_path, rate=Fraction(10**12 + 1))
    assert "GHz" in caught.value.problem
    assert list(tmp_path.iterdir()) == []


def test_statistics_that_are_no_json(tmp_path):
    paths = tmp_path / "a", tmp_path / "b"
    facts = FileFacts(sample_rate_hz=Fraction(1), n_samples=1, datatype=CI16_LE)
    writer = Sigmf().writer(paths, facts)
    writer.write(np.zeros((1, 2), "<i2"))
    with pytest.raises(FileError) as caught:
        writer.finish({"mean_dbfs": float("-inf")})
    writer.close()
    assert caught.value.where == "b"


def test_a_data_file_under_another_name(tmp_path):
    _, data, meta = write(tmp_path)
    data.rename(tmp_path / "samples.bin")
    document = json.loads(meta.read_text(encoding="utf-8"))
    document["global"]["core:dataset"] = "samples.bin"
    meta.write_text(json.dumps(document), encoding="utf-8")
    assert Sigmf().read(meta, ReadHints()).path == tmp_path / "samples.bin"


def test_indices_that_start_elsewhere(tmp_path):
    *_, meta = write(tmp_path, annotations=MARKERS)
    document = json.loads(meta.read_text(encoding="utf-8"))
    document["global"]["core:offset"] = 1000
    for item in document["captures"] + document["annotations"]:
        item["core:sample_start"] += 1000
    meta.write_text(json.dumps(document), encoding="utf-8")
    recording = Sigmf().read(meta, ReadHints())
    assert [item.start_sample for item in recording.annotations] == [0, 40]
    assert recording.warnings == ()


def test_names_of_a_pair():
    for name in ("a/run.v1.sigmf-data", "a/run.v1.sigmf-meta", "a/run.v1"):
        assert meta_beside(Path(name)) == Path("a/run.v1.sigmf-meta")
