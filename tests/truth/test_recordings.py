"""Real recordings: what the program measures against NumPy on the codes.

Sources and licences: tests/files/recordings/README.md. Expected figures are computed here from
the codes, by sorting; those of whole files also stand in that README (three decimals).
"""

from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from wavegen.core.excerpt import excerpt
from wavegen.files.format import ReadHints
from wavegen.files.read import open_recording
from wavegen.production.measure import Subject, measure
from wavegen.production.stimulus import sidecar_of

FOLDER = Path(__file__).resolve().parents[1] / "files" / "recordings"
WIFI = "wifi_11a_conducted_20msps.ci16_le"
NOISE = "rxnoise_440mhz_10ksps.ci16_le"
NBIOT = "nbiot_uplink_832mhz_640ksps_cut.sigmf-data"
CASES = {
    "wifi": (WIFI, 20_000_000, 0, 52_000, -12.994, 9.971),
    "noise": (NOISE, 10_000, 0, 10_000, -36.965, 39.975),
    "noise without its start": (NOISE, 10_000, 100, 10_000, -59.460, 2.671),
    "nb-iot": (NBIOT, 640_000, 0, 78_000, -37.246, 6.695),
}
BIN_DB = 0.0085
"""Width of a bin of the program's histogram: 512 an octave, 10 log10(2) / 512 ... 0.0085 dB."""


@pytest.fixture(scope="module", params=CASES)
def case(request):
    name, rate_hz, first, stop, mean_dbfs, papr_db = CASES[request.param]
    hints = ReadHints(sample_rate_hz=None if name == NBIOT else Fraction(rate_hz))
    recording = open_recording(FOLDER / name, hints)
    assert sidecar_of(recording) is None
    signal = excerpt(recording.signal, first, stop)
    document = measure(Subject(name=name, signal=signal, loops=False))
    rails = np.fromfile(FOLDER / name, "<i2").astype(np.float64).reshape(-1, 2)[first:stop]
    power = (rails**2).sum(axis=1) / 32768**2
    return document, power, (mean_dbfs, papr_db)


def test_mean_and_peak(case):
    document, power, (mean_dbfs, papr_db) = case
    assert document["is"] == "a recording"
    assert document["n_samples"] == power.size
    assert document["n_zeros"] == np.count_nonzero(power == 0)
    assert document["mean_dbfs"] == pytest.approx(10 * np.log10(power.mean()), abs=1e-5)
    assert document["papr_db"] == pytest.approx(10 * np.log10(power.max() / power.mean()), abs=1e-5)
    # As published beside the recordings, to three decimals.
    assert document["mean_dbfs"] == pytest.approx(mean_dbfs, abs=6e-4)
    assert document["papr_db"] == pytest.approx(papr_db, abs=6e-4)


@pytest.mark.parametrize("probability", [0.1, 0.01, 0.001])
def test_levels(case, probability):
    document, power, _ = case
    row = next(row for row in document["levels"] if row["probability"] == probability)
    # The smallest level with CCDF at or below q: as many as q n samples may lie above it.
    n_above = int(np.floor(probability * power.size * (1 + 1e-12)))
    exact = np.sort(power)[power.size - 1 - n_above] / power.mean()
    assert row["level_db"] == pytest.approx(10 * np.log10(exact), abs=BIN_DB)
    assert row["resolved"] == (probability * power.size >= 10)


def test_the_whole_curve(case):
    document, power, _ = case
    level = np.array(document["ccdf"]["level_db"])
    curve = np.array(document["ccdf"]["probability"])
    over_mean = np.sort(10 * np.log10(np.maximum(power, 1e-30) / power.mean()))
    above = 1 - np.searchsorted(over_mean, level + BIN_DB, side="right") / power.size
    below = 1 - np.searchsorted(over_mean, level - BIN_DB, side="right") / power.size
    assert np.all(curve >= above - 1e-12)
    assert np.all(curve <= below + 1e-12)


def test_the_fill_code_alone_lifts_the_mean():
    # tests/files/recordings/README.md: sample 0 of the noise file lifts the mean by 22.5 dB.
    recording = open_recording(FOLDER / NOISE, ReadHints(sample_rate_hz=Fraction(10_000)))
    means = [
        measure(Subject(name="x", signal=excerpt(recording.signal, first, 10_000), loops=False))[
            "mean_dbfs"
        ]
        for first in (0, 100)
    ]
    assert means[0] - means[1] == pytest.approx(22.5, abs=0.05)
