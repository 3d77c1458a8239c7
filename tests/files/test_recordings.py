"""Real recordings by others read as their sources and NumPy say; see recordings/README.md."""

import hashlib
import re
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.files import FORMATS
from wavegen.files.atomic import Drafts
from wavegen.files.datatypes import encode
from wavegen.files.digest import verify_hash
from wavegen.files.format import FileFacts, ReadHints, pick_datatype
from wavegen.files.read import open_recording

FOLDER = Path(__file__).parent / "recordings"
TOLERANCE_DB = 0.0006
"""The table states three decimals: half a unit of the last, and float32 samples add 1e-6 dB."""


def levels_db(samples):
    power = np.abs(samples.astype(np.complex128)) ** 2
    mean = power.mean()
    return 10 * np.log10(mean), 10 * np.log10(power.max() / mean)


@pytest.mark.parametrize(
    ("name", "rate_hz", "n_samples", "mean_dbfs", "peak_db"),
    [
        ("wifi_11a_conducted_20msps.ci16_le", 20_000_000, 52_000, -12.994, 9.971),
        ("rxnoise_440mhz_10ksps.ci16_le", 10_000, 10_000, -36.965, 39.975),
        ("nbiot_uplink_832mhz_640ksps_cut.sigmf-meta", None, 78_000, -37.246, 6.695),
    ],
)
def test_statistics_of_whole_files(name, rate_hz, n_samples, mean_dbfs, peak_db):
    hints = ReadHints(sample_rate_hz=None if rate_hz is None else Fraction(rate_hz))
    recording = open_recording(FOLDER / name, hints)
    assert recording.n_samples == n_samples
    samples = recording.signal.compute(0, n_samples)
    assert levels_db(samples) == pytest.approx((mean_dbfs, peak_db), abs=TOLERANCE_DB)
    plain = np.fromfile(recording.path, "<i2").reshape(-1, 2) / 32768
    np.testing.assert_array_equal(samples, plain[:, 0] + 1j * plain[:, 1])


def test_traps_of_the_noise_recording():
    recording = open_recording(
        FOLDER / "rxnoise_440mhz_10ksps.ci16_le", ReadHints(sample_rate_hz=Fraction(10_000))
    )
    assert recording.signal.compute(0, 1)[0] == -1 - 1j  # the fill code
    rest = recording.signal.compute(100, 10_000).astype(np.complex128)
    assert levels_db(rest) == pytest.approx((-59.460, 2.671), abs=TOLERANCE_DB)
    assert levels_db(rest - rest.mean()) == pytest.approx((-76.552, 9.640), abs=TOLERANCE_DB)


def test_nbiot_metadata_and_bursts():
    recording = open_recording(FOLDER / "nbiot_uplink_832mhz_640ksps_cut.sigmf-data")
    assert verify_hash(recording)
    assert recording.sample_rate_hz == 640_000
    assert recording.centre_frequency_hz == 832_344_126
    assert recording.warnings == ()
    assert len(recording.annotations) == 9
    for burst in recording.annotations:
        samples = recording.signal.compute(burst.start_sample, burst.start_sample + burst.n_samples)
        mean_dbfs, peak_db = levels_db(samples)
        # stated of the original: bursts near -32 to -39 dBFS, peaks 1.4 to 4.8 dB over their mean
        assert -39 < mean_dbfs < -32
        assert 1.4 < peak_db < 4.8
    floor_dbfs, _ = levels_db(recording.signal.compute(0, 1900))
    assert floor_dbfs == pytest.approx(-79, abs=0.5)  # 1900 samples: 0.1 dB (1 sigma)


def test_files_are_those_of_the_readme():
    readme = (FOLDER / "README.md").read_text(encoding="utf-8")
    stated = re.findall(r"^([0-9a-f]{64})  (\S+)$", readme, re.MULTILINE)
    assert {name for _, name in stated} == {
        path.name for path in FOLDER.iterdir() if path.is_file() and path.name != "README.md"
    }
    for digest, name in stated:
        assert hashlib.sha256((FOLDER / name).read_bytes()).hexdigest() == digest
    assert len(list((FOLDER / "licences").iterdir())) == 3


@pytest.mark.parametrize("name", FORMATS)
@pytest.mark.parametrize(
    "capture",
    ["wifi_11a_conducted_20msps.ci16_le", "nbiot_uplink_832mhz_640ksps_cut.sigmf-data"],
)
def test_recordings_survive_every_format_exactly(tmp_path, name, capture):
    """Codes of 16 bits are exact in float32 too, so that whatever is written reads the same."""
    hints = ReadHints(sample_rate_hz=Fraction(20_000_000)) if ".ci16" in capture else ReadHints()
    source = open_recording(FOLDER / capture, hints)
    form = FORMATS.load(name)()
    datatype = pick_datatype(form, None, "output")
    facts = FileFacts(
        sample_rate_hz=source.sample_rate_hz, n_samples=source.n_samples, datatype=datatype
    )
    files = form.files("copy", datatype)
    samples = source.signal.compute(0, source.n_samples)
    with Drafts(tmp_path) as drafts:
        writer = form.writer(tuple(drafts.add(file) for file in files), facts)
        writer.write(encode(samples, datatype)[0])
        writer.finish()
        writer.close()
    rate = source.sample_rate_hz if name in {"raw", "npy"} else None
    copy = open_recording(tmp_path / files[0], ReadHints(sample_rate_hz=rate))
    assert (copy.sample_rate_hz, copy.n_samples) == (source.sample_rate_hz, source.n_samples)
    np.testing.assert_array_equal(copy.signal.compute(0, copy.n_samples), samples)
